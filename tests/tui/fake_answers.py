"""Invented answers of a check for the interface's tests: a reading, an assessment; they stand for nothing."""

from __future__ import annotations

from collections.abc import Sequence

from kb.chem.facts import Centre, NucleophileFact, PossibleFate, Reading
from kb.chem.layout import build_scheme
from kb.record.assessment import Advice, Assessment, Estimate, Precedent
from kb.record.finding import Evidence, Finding, Interval
from kb.record.plan import Plan
from kb.vocabulary import (
    Basis,
    CarbonClass,
    CentreFlag,
    Confidence,
    Fate,
    FindingKind,
    LeavingGroup,
    Severity,
    Verdict,
)
from tests.tui.fake_runs import MESYLATE


def a_reading(text: str) -> Reading:
    """Return what a scheme is read as: the mesylate in full, anything else as a secondary bromide."""
    if build_scheme(text).left[0].drawing is None:
        return Reading(
            scheme=text, ok=False, confidence=Confidence.UNRESOLVED, reason=f"{text!r} is no SMILES."
        )
    if not text.startswith(MESYLATE):
        centre = Centre(
            component=0,
            atom=min(2, len(text) - 1),
            carbon_class=CarbonClass.SECONDARY,
            leaving_group=LeavingGroup.BROMIDE,
            leaving_atom=None,
            beta_hydrogens=5,
        )
        return Reading(
            scheme=text, ok=True, confidence=Confidence.INFERRED, centres=(centre,), substrate=text
        )
    return Reading(
        scheme=text,
        ok=True,
        confidence=Confidence.INFERRED,
        centres=(
            Centre(
                component=0,
                atom=1,
                carbon_class=CarbonClass.SECONDARY,
                leaving_group=LeavingGroup.MESYLATE,
                leaving_atom=2,
                flags=(CentreFlag.ALPHA_HETEROATOM,),
                beta_hydrogens=4,
                is_stereocentre=True,
            ),
        ),
        nucleophile=NucleophileFact(component=1, atom=0, nucleophile_class="azide"),
        possible=(
            PossibleFate(
                fate=Fate.SUBSTITUTION, product="C[C@@H](N=[N+]=[N-])[C@H]1CCCO1", note="azide, inverted"
            ),
            PossibleFate(fate=Fate.ELIMINATION, product="C=C[C@H]1CCCO1", note="loss of MsOH towards CH3"),
            PossibleFate(fate=Fate.ELIMINATION, product="CC=C1CCCO1", note="loss of MsOH towards the ring"),
        ),
        substrate=MESYLATE,
    )


def an_assessment(plan: Plan, codes: Sequence[str]) -> Assessment:
    """Return a check: ethanol is warned of, azide cautioned; runs behind it are the first of `codes`."""
    solvents = {s.name for s in plan.conditions.solvents}
    findings = []
    if "EtOH" in solvents:
        findings.append(
            Finding(
                rule_id="invented-solvolysis",
                kind=FindingKind.LIABILITY,
                severity=Severity.SERIOUS,
                title="the solvent competes as nucleophile",
                why="Ethanol captures the carbon faster than azide at this dilution (invented).",
                component=0,
                atoms=(1, 7, 8),
                evidence=Evidence(
                    lost=2,
                    survived=1,
                    runs=tuple(codes[:3]),
                    chance=Interval(mean=0.7, low=0.4, high=0.9),
                    note="the survivor was below 10 °C",
                ),
                side_product="CCO[C@@H](C)[C@H]1CCCO1",
                do_instead=("a polar aprotic solvent such as DMF",),
                source="invented for the tests",
            )
        )
    if any(c.name == "NaN3" for c in plan.conditions.components):
        findings.append(
            Finding(
                rule_id="invented-azide",
                kind=FindingKind.CAUTION,
                severity=Severity.NOTE,
                title="azide: keep chlorinated solvents out of the work-up",
                why="Geminal diazides are explosive. Local safety rules and qualified people decide.",
                source="invented for the tests",
            )
        )
    mean = 0.45 if "EtOH" in solvents else 0.84
    return Assessment(
        plan=plan,
        reading=a_reading(plan.scheme),
        findings=tuple(findings),
        estimate=Estimate(
            fates=(
                (Fate.SUBSTITUTION, Interval(mean=mean, low=mean - 0.14, high=min(1.0, mean + 0.08))),
                (Fate.ELIMINATION, Interval(mean=1 - mean - 0.04, low=0.02, high=1 - mean + 0.1)),
                (Fate.UNREACTED, Interval(mean=0.04, low=0.0, high=0.12)),
            ),
            yield_pct=Interval(mean=71, low=58, high=82),
            effective_precedents=3.4,
            basis=Basis.BOTH,
        ),
        precedents=tuple(
            Precedent(
                run=code,
                similarity=0.95 - 0.07 * i,
                differs=("bromide, not mesylate", "60 °C"),
                split=((Fate.SUBSTITUTION, 0.9), (Fate.ELIMINATION, 0.1)),
                yield_pct=74,
                verdict=Verdict.WORKED,
            )
            for i, code in enumerate(codes[:5])
        ),
        advice=(
            Advice(
                change="60 °C instead of 80 °C",
                effect=Interval(mean=0.06, low=0.02, high=0.11),
                pairs=5,
                basis=Basis.RECORD,
                why="Matched pairs R-0001 and R-0002, and three more (invented).",
            ),
        ),
    )
