"""The appendix of DEVELOPERS.md that lists every rule id, written anew by `python tests/docs/rule_ids.py`.

It is generated since people quote ids in notes and house rules: a list kept by hand would go stale the first time that
somebody adds a liability. `test_docs.py` compares.
"""

from __future__ import annotations

import sys
import tomllib
from importlib import resources
from pathlib import Path

ROOT = Path(__file__).parents[2]
BEGIN, END = "<!-- rule ids: begin -->", "<!-- rule ids: end -->"
WORKED = (
    *("hazard-organic-azide", "hazard-gas-tert-butyl", "hazard-pressure", "hazard-peroxide-former-a"),
    *("hazard-peroxide-former-b", "hazard-low-boiling-solvent"),
)
"""Cautions that are worked out in `kb/assess/caution_checks.py` and stand in no table."""


def appendix() -> str:
    """Return the text between the marks."""
    from kb.assess.caution_table import load_cautions

    lines = [""]
    folder = resources.files("kb") / "data" / "liabilities"
    for path in sorted(folder.iterdir(), key=lambda p: p.name):
        if path.name.endswith(".toml"):
            entries = tomllib.loads(path.read_text(encoding="utf-8")).get("liability", [])
            lines += [f"`{path.name}` ({len(entries)}):", *_filled(entry["id"] for entry in entries), ""]
    cautions = [rule.rule_id for rule in load_cautions().rules]
    lines += [f"`cautions.toml` ({len(cautions)}):", *_filled(cautions), ""]
    lines += [f"worked out in `caution_checks.py` ({len(WORKED)}):", *_filled(WORKED), ""]
    return "\n".join(lines)


def _filled(ids: object) -> list[str]:
    import textwrap

    assert hasattr(ids, "__iter__")
    return textwrap.wrap(", ".join(f"`{i}`" for i in ids), 118, break_long_words=False, break_on_hyphens=False)


def main() -> None:
    """Write the appendix into DEVELOPERS.md."""
    page = ROOT / "DEVELOPERS.md"
    text = page.read_text(encoding="utf-8")
    head, _, rest = text.partition(BEGIN)
    _, _, tail = rest.partition(END)
    page.write_text(f"{head}{BEGIN}\n{appendix()}\n{END}{tail}", encoding="utf-8")


if __name__ == "__main__":
    sys.path.insert(0, str(ROOT))
    main()
