"""A looked-up material as text: what it is, with units, and where the figures come from."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from kb.cli.render import wrapped
from kb.plain import excerpt, plain

_LABELS = {
    "synonyms": ("also called", ""),
    "smiles": ("SMILES", ""),
    "cas_rn": ("CAS number", ""),
    "kinds": ("used as", ""),
    "bp_c": ("boils at", " °C"),
    "mp_c": ("melts at", " °C"),
    "permittivity_t_c": ("  measured at", " °C"),
    "is_protic": ("protic", ""),
    "et30_kcal_mol": ("E_T(30)", " kcal/mol"),
    "winstein_y": ("Winstein Y", ""),
    "density_g_ml": ("density", " g/mL"),
    "density_t_c": ("  measured at", " °C"),
    "water_miscible": ("mixes with water", ""),
    "pka": ("pKa (water)", ""),
    "pkah": ("pKaH (water)", ""),
    "bulk": ("bulk as base", ""),
    "acidity": ("as acid", ""),
    "lewis": ("as Lewis acid", ""),
    "nucleophile": ("as nucleophile", ""),
    "hydride": ("as hydride donor", ""),
    "swain_scott_n": ("Swain-Scott n", ""),
    "mayr_n": ("Mayr N", ""),
    "mayr_sn": ("Mayr sN", ""),
    "alkoxy": ("alkoxide of", ""),
}
"""Field of an entry to its label and unit; a field that is not here is shown under its own name."""


def render_lookup(found: Mapping[str, Any]) -> str:
    """Return what a name may mean: the entry, or the near names."""
    match = found["match"]
    also = [f"  {plain(o['name'])} is in the table of {o['kind']}s: --kind {o['kind']}" for o in found["also"]]
    if match is None:
        head = [f"No material is called {excerpt(plain(found['query']), 40)!r}.", *also]
        near = ["Near names:", *(_offer(o) for o in found["offers"])] if found["offers"] else []
        return "\n".join([*head, *near])
    lines = [f"{plain(match['name'])} ({match['kind']})"]
    for key, value in match.items():
        if key in ("name", "kind") or value in (None, "", [], (), "none"):
            continue
        label, unit = _LABELS.get(key, (key.replace("_", " "), ""))
        lines += wrapped(_shown(value) + unit, 22, first=f"  {label:<20}")
    return "\n".join([*lines, *also])


def _offer(offer: Mapping[str, Any]) -> str:
    return f"  {plain(offer['name'])} ({offer['kind']}, {offer['score']:.0f} of 100 alike)"


def _shown(value: Any) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, list | tuple):
        return ", ".join(str(v).replace("_", " ") for v in value)
    return f"{value:g}" if isinstance(value, float) else str(value)
