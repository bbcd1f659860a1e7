"""Did a motif come through a run, and what that does to a rule's severity."""

from __future__ import annotations

import pytest
from rdkit import Chem
from tables_by_hand import facts, table_of, view_of

from kb.assess.estimate import loss_chance
from kb.assess.evidence import count_evidence, weighed_severity, word_evidence
from kb.assess.evidence_motif import finder_of, motif_came_through
from kb.assess.table import one_row
from kb.materials.profile import ConditionProfile
from kb.record.finding import Evidence
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.record.run import Run
from kb.vocabulary import Fate, Severity, Verdict

TBU_ETHER = finder_of("[CX4][OX2]C([CH3])([CH3])[CH3]")
SUBSTRATE = "CC(C)(C)OCCCNC(=O)OC(C)(C)C"
KEPT, GONE = "CC(C)(C)OCCCN", "OCCCN"


def run(*, stated: str = KEPT, verdict: Verdict | None = None, **outcome: object) -> Run:
    return Run(scheme=f"{SUBSTRATE}>>{stated}", outcome=Outcome(**outcome), verdict=verdict)  # type: ignore[arg-type]


def seen(smiles: str, share: float, fate: Fate = Fate.GROUP_LOSS) -> ProductSeen:
    return ProductSeen(fate=fate, smiles=smiles, share=share)


@pytest.mark.parametrize(
    ("record", "came_through", "why"),
    [
        (run(products=(seen(KEPT, 0.95),)), True, "the product holds it"),
        (run(products=(seen(KEPT, 0.6), seen(GONE, 0.4))), False, "two fifths lost it"),
        (run(products=(seen(KEPT, 0.97), seen(GONE, 0.03))), True, "a trace is no loss"),
        (run(verdict=Verdict.WORKED), True, "the stated product holds it and the run worked"),
        (run(stated=GONE, verdict=Verdict.WORKED), False, "a wanted loss is a loss"),
        (run(), None, "nothing says how it went"),
        (
            run(failures=(Failure(mode="group-loss", motif="OC(C)(C)C"),), verdict=Verdict.FAILED),
            False,
            "the failure names it",
        ),
    ],
)
def test_coming_through(record: Run, came_through: bool | None, why: str) -> None:
    assert motif_came_through(record, TBU_ETHER, Chem.MolFromSmiles) is came_through, why


def test_counts_run_codes_and_the_temperature_that_divides_them() -> None:
    rows = [(facts(temperature_c=t), {}, None, "worked") for t in (50.0, 55.0, 0.0)]
    records = [
        run(products=(seen(GONE, 0.9),)),
        run(products=(seen(GONE, 0.5),)),
        run(products=(seen(KEPT, 0.9),)),
    ]
    view = view_of(table_of(*rows), [ConditionProfile()] * 3, [()] * 3, records)
    lost, survived = count_evidence(view, range(3), TBU_ETHER)
    evidence = word_evidence(view, lost, survived, one_row(facts(temperature_c=60.0)))
    assert (evidence.lost, evidence.survived) == (2, 1)
    assert evidence.runs == ("R-1", "R-2", "R-3")
    assert "survived at 0 °C and below" in evidence.note
    assert "with the losses" in evidence.note


@pytest.mark.parametrize(
    ("lost", "survived", "expected"),
    [
        (8, 0, Severity.SERIOUS),
        (0, 9, Severity.NOTE),
        (0, 1, Severity.CAUTION),
        (0, 3, Severity.CAUTION),
        (0, 4, Severity.NOTE),
        (3, 3, Severity.CAUTION),
    ],
)
def test_clear_evidence_moves_a_caution_by_one_step(lost: int, survived: int, expected: Severity) -> None:
    evidence = Evidence(lost=lost, survived=survived, chance=loss_chance(lost, survived))
    assert weighed_severity(Severity.CAUTION, evidence) is expected
