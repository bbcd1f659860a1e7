"""Runs drawn from what a table carries, and a sink that keeps runs in memory, for the tests of this folder."""

from __future__ import annotations

import dataclasses
import datetime as dt
from collections.abc import Iterable
from typing import Any

from hypothesis import strategies as st

from kb.exchange.lookups import materials_in, solvents_in
from kb.quantity import parse_duration, parse_temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.record.run import Run
from kb.vocabulary import Cause, Fate, Method, Role, Verdict

SCHEMES = (
    "CC(Br)CCc1ccccc1.[Na+].[N-]=[N+]=[N-]>>CC(N=[N+]=[N-])CCc1ccccc1",
    "C[C@H](Cl)c1ccccc1.CC(=O)[O-].[K+]>CN(C)C=O>CC(=O)O[C@@H](C)c1ccccc1",
    "CC(C)(C)OC(=O)N1CCC(OC(C)(C)C)CC1>>CC(C)(C)OC1CCNCC1",
    "[CH3:1][CH2:2][Br:3]>>",
)
PRODUCTS = ("C=CCCc1ccccc1", "C/C=C/Cc1ccccc1", "OC1CCNCC1", "CC(O)CCc1ccccc1")
MODES = ("elimination", "group-loss", "no-reaction", "emulsion")

_words = st.text(st.characters(blacklist_categories=("Cs", "Cc", "Cn", "Zl", "Zp")), min_size=1, max_size=25).map(
    lambda text: " ".join(text.split())
)
phrases = _words.filter(lambda text: bool(text) and text.casefold() not in _nothing())
"""Text that says something; one line, no outer blanks."""
notes = st.text(
    st.characters(blacklist_categories=("Cs", "Cc", "Cn"), whitelist_characters="\n\t"), max_size=60
).filter(lambda text: not text or bool(text.strip()))
"""Text with line ends and tabs, but without control characters, which a workbook cannot hold."""


def _nothing() -> frozenset[str]:
    from kb.exchange.cells import NOT_RECORDED

    return NOT_RECORDED


def numbers(top: float) -> st.SearchStrategy[float | None]:
    """Draw a recorded number up to `top` with the digits people write, or None."""
    return st.none() | st.integers(0, int(top * 1000)).map(lambda n: n / 1000)


_known = st.sampled_from(("NaN3", "K2CO3", "KOtBu", "2,6-lutidine", "18-crown-6", "HCl", "Pd(PPh3)4"))
_invented = st.sampled_from(
    ("batch 7; wet", 'the "old" bottle', "x + y", "5 mmol flask salt", "A, 3 M thing", "=cmd", "n=2")
)


@st.composite
def components(draw: st.DrawFn) -> Component:
    """Draw a component that a cell can carry: any name; a structure where the catalogue or the cell gives it."""
    role = draw(st.sampled_from((Role.REAGENT, Role.BASE, Role.ACID, Role.ADDITIVE)))
    name = draw(_known | _invented | phrases)
    smiles = draw(st.none() | st.sampled_from(("CCO", "[Na+].[I-]")))
    found = materials_in(f'"{name.replace(chr(34), chr(34) * 2)}"' + (f" {{{smiles}}}" if smiles else ""), role)[0]
    kind = draw(st.sampled_from(("equiv", "amount_mmol", "mass_mg", "volume_ml", "loading_mol_pct", "conc_molar")))
    return dataclasses.replace(found, **{kind: draw(numbers(20))})


@st.composite
def solvents(draw: st.DrawFn) -> tuple[SolventPart, ...]:
    """Draw solvents that a cell can carry."""
    names = draw(
        st.lists(st.sampled_from(("DMF", "water", "EtOH", "1,4-dioxane", "unheard of")), unique=True, max_size=3)
    )
    have_parts = draw(st.booleans())
    return tuple(
        dataclasses.replace(solvents_in(name)[0], parts=float(n + 1) if have_parts else None)
        for n, name in enumerate(names)
    )


@st.composite
def products(draw: st.DrawFn) -> tuple[ProductSeen, ...]:
    """Draw products that two cells can carry: structures first, then at most one rest for each other fate."""
    method = draw(st.none() | st.sampled_from(Method))
    shares = st.integers(0, 1000).map(lambda n: n / 1000)
    drawn = [
        ProductSeen(fate=draw(st.sampled_from(Fate)), smiles=smiles, share=draw(shares), method=method)
        for smiles in draw(st.lists(st.sampled_from(PRODUCTS), unique=True, max_size=2))
    ]
    others = [f for f in Fate if f not in {p.fate for p in drawn}]
    rests = [
        ProductSeen(fate=fate, share=draw(shares), method=method)
        for fate in draw(st.lists(st.sampled_from(others), unique=True, max_size=3))
    ]
    return tuple(drawn + rests)


@st.composite
def carried_runs(draw: st.DrawFn) -> Run:
    """Draw a run whose every field a table carries."""
    modes = draw(st.lists(st.sampled_from(MODES), unique=True, max_size=2))
    cause = draw(st.none() | st.sampled_from(Cause))
    motif = draw(st.none() | st.sampled_from(("[CX4]OC(C)(C)C", "[OX2H][CX4;H0]")))
    temperature = draw(st.none() | st.sampled_from(("60C", "rt", "0C to rt", "-78 °C", "reflux", "333 K")))
    time = draw(st.none() | st.sampled_from(("4 h", "30 min", "overnight", "2 d")))
    found = sorted(draw(st.lists(components(), max_size=3)), key=lambda c: list(Role).index(c.role))
    return Run(
        scheme=draw(st.sampled_from(SCHEMES)),
        conditions=Conditions(
            components=tuple(found),
            solvents=draw(solvents()),
            temperature=parse_temperature(temperature) if temperature else None,
            time=parse_duration(time) if time else None,
            conc_molar=draw(numbers(5)),
            scale_mmol=draw(numbers(500)),
            atmosphere=draw(st.none() | phrases),
            vessel=draw(st.none() | phrases),
            workup=draw(st.none() | phrases),
        ),
        outcome=Outcome(
            products=draw(products()),
            isolated_yield_pct=draw(numbers(110)),
            assay_yield_pct=draw(numbers(100)),
            conversion_pct=draw(numbers(100)),
            ee_pct=draw(numbers(100)),
            dr=draw(st.none() | phrases),
            failures=tuple(Failure(mode=m, motif=motif if not n else None, cause=cause) for n, m in enumerate(modes)),
        ),
        verdict=draw(st.none() | st.sampled_from(Verdict)),
        note=draw(notes),
        by=draw(st.none() | phrases),
        date=draw(st.none() | st.dates(dt.date(1990, 1, 1), dt.date(2024, 1, 1))),
        reference=draw(st.none() | phrases),
        project=draw(st.none() | phrases),
        series=draw(st.none() | phrases),
        run_id=draw(st.uuids(version=4)),
        withdrawn_why=draw(st.none() | phrases),
    )


class KeptInMemory:
    """A sink that keeps runs in a dictionary, as a store would by UUID."""

    def __init__(self) -> None:
        self.runs: dict[Any, Run] = {}
        self.batches: list[int] = []
        self.stored = self.duplicate = 0

    def add_many(self, many: Iterable[Run], who: str, progress: Any = None) -> KeptInMemory:
        """Keep new runs; return a report."""
        given = list(many)
        fresh = {run.run_id: run for run in given if run.run_id not in self.runs}
        self.runs |= fresh
        self.batches.append(len(given))
        report = KeptInMemory()
        report.stored, report.duplicate = len(fresh), len(given) - len(fresh)
        return report

    def get_many(self, run_ids: Iterable[Any]) -> tuple[Run, ...]:
        """Return the runs that are there."""
        return tuple(self.runs[i] for i in run_ids if i in self.runs)
