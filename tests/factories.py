"""Runs and books for tests: `from tests.factories import a_run, a_book, runs`.

    a_run(note="oiled out")          one run, plausible, with the fields given changed
    a_book(tmp_path)                 a new empty store in a file under tmp_path, without chemistry
    a_book(books)                    the same on either engine (see `tests/engines.py`)
    a_book(tmp_path, **CHEMISTRY)    the same with stand-ins for derive, dissect and encode (no RDKit needed)
    runs()                           hypothesis strategy: any run that a book can keep
    ticking_clock()                  moments one minute apart, from a fixed one

The stand-ins answer from the text of the scheme, so their answers are checkable and say nothing about chemistry.
"""

from __future__ import annotations

import datetime as dt
import hashlib
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any
from uuid import uuid4

from hypothesis import strategies as st

from kb.quantity import Duration, Temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.derived import DerivedFacts
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.record.run import Attachment, Run
from kb.store.store import Store
from kb.vocabulary import Cause, Fate, Method, Role, Verdict
from tests.engines import Books, Files

START = dt.datetime(2024, 5, 17, 9, 30, tzinfo=dt.UTC)


def ticking_clock(start: dt.datetime = START, step_s: float = 60.0) -> Callable[[], dt.datetime]:
    """Return a clock that goes forward by `step_s` [s] whenever it is read."""
    moments = iter(range(10**9))
    return lambda: start + dt.timedelta(seconds=step_s * next(moments))


def a_run(**changes: Any) -> Run:
    """Return a plausible displacement, with the fields given changed; every call has its own UUID."""
    run = Run(
        scheme="CC(C)CCBr.[N-]=[N+]=[N-]>>CC(C)CCN=[N+]=[N-]",
        conditions=Conditions(
            components=(
                Component(role=Role.REAGENT, name="NaN3", smiles="[N-]=[N+]=[N-].[Na+]", equiv=1.5),
                Component(role=Role.BASE, name="K2CO3", equiv=2.0),
            ),
            solvents=(SolventPart(name="DMF", smiles="CN(C)C=O", parts=1.0),),
            temperature=Temperature(text="60 °C", start_c=60.0, end_c=60.0),
            time=Duration(text="overnight", h=16.0),
            conc_molar=0.2,
            scale_mmol=5.0,
            atmosphere="N2",
        ),
        outcome=Outcome(
            products=(
                ProductSeen(fate=Fate.SUBSTITUTION, smiles="CC(C)CCN=[N+]=[N-]", share=0.93, method=Method.NMR),
                ProductSeen(fate=Fate.ELIMINATION, smiles="CC(C)C=C", share=0.07, method=Method.NMR, protons=2),
            ),
            isolated_yield_pct=81.0,
        ),
        verdict=Verdict.WORKED,
        note="clean by NMR",
        by="MK",
        date=dt.date(2024, 5, 16),
        reference="MK-2-117",
        project="azides",
        run_id=uuid4(),
    )
    return replace(run, **changes)


@dataclass(frozen=True)
class StandInBlobs:
    """Blobs that a stand-in encoder makes: digests of the text."""

    mol_binary: bytes
    augmented: bytes
    pattern: bytes
    morgan: bytes


def stand_in_derive(run: Run) -> DerivedFacts:
    """Return facts that follow from the text of the scheme alone."""
    digest = hashlib.sha256(run.scheme.encode()).digest()
    temperature = run.conditions.temperature
    return DerivedFacts(
        run_id=run.run_id,
        recipe="stand-in/1",
        confidence="matched",
        fate="substitution",
        carbon_class="primary",
        leaving_group="bromide",
        substrate=run.scheme.split(">")[0].split(".")[0],
        centre_bits=digest,
        beta_hydrogens=len(run.scheme) % 7,
        temperature_c=temperature.high_c if temperature else None,
        protic=None,
    )


def stand_in_dissect(run: Run) -> list[tuple[str, int, str]]:
    """Return the dot-separated parts of the scheme: the first is the substrate, those on the right are products."""
    left, _, right = run.scheme.partition(">>")
    parts = [("substrate" if n == 0 else "reagent", n, s) for n, s in enumerate(left.split(".")) if s]
    return parts + [("product", n, s) for n, s in enumerate(right.split(".")) if s]


def stand_in_encode(smiles: str) -> StandInBlobs:
    """Return digests of the text."""
    digest = hashlib.sha256(smiles.encode()).digest()
    return StandInBlobs(mol_binary=smiles.encode(), augmented=digest * 4, pattern=digest * 8, morgan=digest)


CHEMISTRY: dict[str, Any] = {
    "derive": stand_in_derive,
    "dissect": stand_in_dissect,
    "encode": stand_in_encode,
    "recipe": "stand-in/1",
}


def a_book(place: Path | Books, name: str = "book.sidepath", **options: Any) -> Store:
    """Return a new empty store; close it, or use it as a context manager."""
    place = Files(place) if isinstance(place, Path) else place
    return place.make(name, **{"clock": ticking_clock(), **options})


texts = st.text(st.characters(blacklist_categories=("Cs",), blacklist_characters="\x00"), max_size=30)
names = texts.filter(lambda text: bool(text.strip()))
amounts = st.none() | st.floats(0, 1e6) | st.integers(0, 1000)
shares = st.none() | st.floats(0, 1)
moments = st.datetimes(dt.datetime(1990, 1, 1), dt.datetime(2100, 1, 1), timezones=st.just(dt.UTC))


@st.composite
def runs(draw: st.DrawFn, with_store_fields: bool = True) -> Run:
    """Draw any run that a book can keep.

    Args:
        with_store_fields: also draw code, moment, revision and withdrawal, which the store gives otherwise.
    """
    components = st.builds(
        Component,
        role=st.sampled_from(Role),
        name=names,
        smiles=st.none() | texts,
        equiv=amounts,
        amount_mmol=amounts,
        mass_mg=amounts,
        volume_ml=amounts,
        conc_molar=amounts,
        loading_mol_pct=amounts,
    )
    temperatures = st.floats(-273, 1000)
    conditions = st.builds(
        Conditions,
        components=st.lists(components, max_size=3).map(tuple),
        solvents=st.lists(st.builds(SolventPart, name=names, smiles=st.none() | texts, parts=amounts), max_size=3).map(
            tuple
        ),
        temperature=st.none()
        | st.builds(
            Temperature,
            text=texts,
            start_c=st.none() | temperatures,
            end_c=st.none() | temperatures,
            between_c=st.lists(temperatures, max_size=2).map(tuple),
            is_reflux=st.booleans(),
        ),
        time=st.none() | st.builds(Duration, text=texts, h=st.none() | st.floats(0, 1e4)),
        conc_molar=amounts,
        scale_mmol=amounts,
        atmosphere=st.none() | texts,
        vessel=st.none() | texts,
        workup=st.none() | texts,
    )
    outcome = st.builds(
        Outcome,
        products=st.lists(
            st.builds(
                ProductSeen,
                fate=st.sampled_from(Fate),
                smiles=st.none() | texts,
                share=shares,
                share_low=shares,
                share_high=shares,
                method=st.none() | st.sampled_from(Method),
                protons=st.none() | st.integers(0, 99),
            ),
            max_size=3,
        ).map(tuple),
        isolated_yield_pct=st.none() | st.floats(0, 200),
        assay_yield_pct=st.none() | st.floats(0, 200),
        conversion_pct=st.none() | st.floats(0, 100),
        ee_pct=st.none() | st.floats(0, 100),
        dr=st.none() | texts,
        failures=st.lists(
            st.builds(Failure, mode=texts, motif=st.none() | texts, cause=st.none() | st.sampled_from(Cause)),
            max_size=2,
        ).map(tuple),
    )
    attachment = st.builds(
        Attachment,
        name=names,
        sha256=st.text("0123456789abcdef", min_size=64, max_size=64),
        size_bytes=st.integers(0, 2**40),
    )
    given: dict[str, Any] = {
        "scheme": draw(names),
        "conditions": draw(conditions),
        "outcome": draw(outcome),
        "verdict": draw(st.none() | st.sampled_from(Verdict)),
        "note": draw(texts),
        "by": draw(st.none() | texts),
        "date": draw(st.none() | st.dates()),
        "reference": draw(st.none() | texts),
        "project": draw(st.none() | texts),
        "series": draw(st.none() | texts),
        "run_id": draw(st.uuids()),
        "attachments": draw(st.lists(attachment, max_size=2).map(tuple)),
    }
    if with_store_fields:
        given |= {
            "code": draw(st.none() | st.integers(0, 99999).map(lambda n: f"R-{n:04d}")),
            "recorded_at": draw(st.none() | moments),
            "revision": draw(st.integers(1, 1000)),
            "withdrawn_why": draw(st.none() | names),
        }
    return Run(**given)
