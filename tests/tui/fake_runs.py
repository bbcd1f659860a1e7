"""Invented runs and names for the interface's tests; they stand for nothing but themselves."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace
from typing import Any

from kb.quantity import parse_temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.outcome import Outcome, ProductSeen
from kb.record.run import Run
from kb.vocabulary import Fate, Method, Role, Verdict

MESYLATE = "C[C@H](OS(C)(=O)=O)[C@H]1CCCO1"
AZIDE_SCHEME = MESYLATE + ".[N-]=[N+]=[N-].[Na+]>>C[C@@H](N=[N+]=[N-])[C@H]1CCCO1"
NASTY = "[red]not red[/red] \x1b[31mno escape\x1b[0m \u202egnp.exe \u2066x\u2069 🧪 \x07 " + "long " * 2000

NAMES = {
    "NaN3": ("[Na+].[N-]=[N+]=[N-]", "reagent"),
    "NaI": ("[Na+].[I-]", "reagent"),
    "K2CO3": ("[K+].[K+].[O-]C([O-])=O", "reagent"),
    "DMF": ("CN(C)C=O", "solvent"),
    "DMSO": ("CS(C)=O", "solvent"),
    "THF": ("C1CCOC1", "solvent"),
    "water": ("O", "solvent"),
    "EtOH": ("CCO", "solvent"),
}


def a_run(number: int = 1, **changes: Any) -> Run:
    """Return an invented run."""
    run = Run(
        scheme=AZIDE_SCHEME,
        conditions=Conditions(
            components=(Component(role=Role.REAGENT, name="NaN3", equiv=1.5),),
            solvents=(SolventPart(name="DMF"),),
            temperature=parse_temperature(f"{50 + number} C"),
        ),
        outcome=Outcome(
            products=(
                ProductSeen(fate=Fate.SUBSTITUTION, share=0.9, method=Method.NMR),
                ProductSeen(fate=Fate.ELIMINATION, share=0.1, method=Method.NMR),
            ),
            isolated_yield_pct=70.0 + number % 20,
        ),
        verdict=Verdict.WORKED,
        note=f"invented note {number}",
        by="JM",
        date=dt.date(2026, 1, 1) + dt.timedelta(days=number),
        code=f"R-{number:04d}",
    )
    return replace(run, **changes)
