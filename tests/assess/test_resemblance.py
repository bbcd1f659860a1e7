"""Where a plan looks like a recorded failure. Runs are invented; what counts as more forcing is common practice."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from tables_by_hand import facts, table_of, view_of

from kb.assess.precedent import compare
from kb.assess.record_view import RecordView
from kb.assess.resemblance import MOST_WITNESSES, find_resemblances
from kb.assess.resemblance_motifs import WIDENED
from kb.assess.table import one_row
from kb.materials.profile import ConditionProfile
from kb.record.finding import Finding
from kb.record.outcome import Outcome, ProductSeen
from kb.record.run import Run
from kb.vocabulary import Fate, FindingKind, Severity, Verdict

KNOWN: dict[str, Any] = {"has_unknown_reagent": False, "has_unknown_solvent": False, "lewis_acid": "none"}


def acid(temperature_c: float | None) -> ConditionProfile:
    return ConditionProfile(acidity="strong", temperature_c=temperature_c, **KNOWN)


def base(temperature_c: float | None) -> ConditionProfile:
    return ConditionProfile(acidity="none", base_pkah=10.0, temperature_c=temperature_c, **KNOWN)


class Record:
    """Runs being gathered for a view."""

    def __init__(self) -> None:
        self.rows: list[Any] = []
        self.profiles: list[ConditionProfile] = []
        self.failures: list[tuple[tuple[str, str | None], ...]] = []
        self.runs: list[Run] = []

    def add(
        self,
        profile: ConditionProfile,
        *modes: tuple[str, str | None],
        verdict: str | None = None,
        scheme: str = "CCC(C)Br>>CCC(C)N",
        products: tuple[ProductSeen, ...] = (),
        **own: Any,
    ) -> Record:
        word = verdict or ("failed" if modes else "worked")
        own = {"substrate": scheme.split(">")[0], "temperature_c": profile.temperature_c} | own
        self.rows.append((facts(**own), {}, None, word))
        self.profiles.append(profile)
        self.failures.append(modes)
        code = f"R-{len(self.rows)}"
        self.runs.append(Run(scheme=scheme, outcome=Outcome(products=products), verdict=Verdict(word), code=code))
        return self

    @property
    def view(self) -> RecordView:
        return view_of(table_of(*self.rows), self.profiles, self.failures, self.runs)


def resemblances(
    view: RecordView,
    profile: ConditionProfile,
    fragments: tuple[str, ...] = ("CCC(C)Br",),
    centre: tuple[int, int] | None = (0, 2),
    products: tuple[str, ...] = (),
    skip: tuple[frozenset[int], ...] = (),
    **plan: Any,
) -> tuple[Finding, ...]:
    row = one_row(facts(**({"temperature_c": profile.temperature_c} | plan)))
    parts, similarity = compare(row, view.table)
    return find_resemblances(view, row, parts, similarity, profile, fragments, centre, skip, products)


def test_an_empty_record_resembles_nothing() -> None:
    assert resemblances(view_of(table_of(), [], [], []), base(60)) == ()


def test_failures_at_the_centre_are_told_once_with_those_that_came_through() -> None:
    record = Record().add(base(60), ("elimination", None)).add(base(70), ("elimination", None)).add(base(65))
    (finding,) = resemblances(record.view, base(80))
    assert finding.kind is FindingKind.RESEMBLANCE
    assert (finding.component, finding.atoms) == (0, (2,))
    assert finding.evidence is not None
    assert (finding.evidence.lost, finding.evidence.survived) == (2, 1)
    assert finding.evidence.runs == ("R-2", "R-1", "R-3")  # losses first, most alike first


def test_what_was_a_failure_for_another_aim_is_none_for_this_plan() -> None:
    record = Record().add(base(60), ("elimination", None)).add(base(70), ("elimination", None)).add(base(65))
    assert resemblances(record.view, base(80), fate="substitution")
    assert not resemblances(record.view, base(80), fate="elimination")


def test_runs_with_another_aim_do_not_speak_for_the_plan() -> None:
    record = Record().add(base(60), ("no-reaction", None)).add(base(70), ("no-reaction", None))
    record.add(base(60), fate="elimination")
    (finding,) = resemblances(record.view, base(40), fate="substitution")
    assert finding.evidence is not None
    assert set(finding.evidence.runs) == {"R-1", "R-2"}


@pytest.mark.parametrize(
    ("mode", "failed_at", "planned_at", "is_told", "why"),
    [
        ("elimination", 60.0, 60.0, True, "as forcing"),
        ("elimination", 60.0, 55.0, True, "within the margin"),
        ("elimination", 60.0, 20.0, False, "much milder than what failed"),
        ("no-reaction", 60.0, 20.0, True, "nothing happened hotter: nothing will happen here"),
        ("no-reaction", 20.0, 80.0, False, "nothing happened at 20 degC says little of 80"),
        ("emulsion", 60.0, 60.0, False, "a bad work-up is not in the plan"),
    ],
)
def test_only_failures_under_conditions_that_hold_for_the_plan(
    mode: str, failed_at: float, planned_at: float, is_told: bool, why: str
) -> None:
    record = Record().add(base(failed_at), (mode, None)).add(base(failed_at), (mode, None))
    assert bool(resemblances(record.view, base(planned_at))) is is_told, why


def test_another_kind_of_centre_is_no_likeness() -> None:
    record = Record().add(base(60), ("elimination", None), carbon_class="tertiary", centre_bits=bytes([170] * 32))
    assert resemblances(record.view, base(60)) == ()


def test_rare_failures_are_not_worth_a_line() -> None:
    record = Record().add(base(60), ("elimination", None))
    for _ in range(12):
        record.add(base(60))
    assert resemblances(record.view, base(60)) == ()


def test_frequent_failures_are_serious_and_a_lone_one_is_not() -> None:
    often, once = Record(), Record().add(base(60), ("elimination", None))
    for _ in range(5):
        often.add(base(60), ("elimination", None))
    assert resemblances(often.view, base(60))[0].severity is Severity.SERIOUS
    assert resemblances(once.view, base(60))[0].severity is Severity.CAUTION


def test_where_the_temperature_is_not_given_nothing_is_certain() -> None:
    record = Record()
    for _ in range(5):
        record.add(base(60), ("elimination", None))
    (finding,) = resemblances(record.view, base(None))
    assert finding.is_uncertain
    assert finding.severity is Severity.CAUTION
    assert "Cannot tell" in finding.why


def test_a_failure_without_a_mode_counts_as_a_kind_of_its_own() -> None:
    record = Record().add(base(60), verdict="failed").add(base(60), verdict="failed")
    (finding,) = resemblances(record.view, base(60))
    assert "mode not named" in finding.title


ETHER, ALCOHOL = "CC(C)(C)OCCCNC(=O)OC(C)(C)C", "OCCCN"
KEPT = "CC(C)(C)OCCCN"
PLAN = "CC(C)(C)OC1CCN(C(=O)OC(C)(C)C)CC1"


def lost(smiles: str = ALCOHOL) -> tuple[ProductSeen, ...]:
    return (ProductSeen(fate=Fate.GROUP_LOSS, smiles=smiles, share=0.9),)


def kept() -> tuple[ProductSeen, ...]:
    return (ProductSeen(fate=Fate.GROUP_LOSS, smiles=KEPT, share=0.95),)


def test_a_stated_motif_fires_where_the_plan_holds_it_and_draws_its_atoms() -> None:
    record = Record().add(acid(50), ("group-loss", "[CX4]OC(C)(C)C"), scheme=f"{ETHER}>>{KEPT}", products=lost())
    (finding,) = resemblances(record.view, acid(60), (PLAN,), None)
    assert finding.component == 0
    assert len(finding.atoms) == 6
    assert resemblances(record.view, acid(60), ("COC1CCNCC1",), None) == ()


def test_a_motif_that_nobody_stated_is_worked_out_from_what_was_found() -> None:
    record = Record().add(acid(50), ("group-loss", None), scheme="CC(C)(C)OCCCc1ccccc1", products=lost("OCCCc1ccccc1"))
    (finding,) = resemblances(record.view, acid(60), (PLAN,), None)
    carbons = [a for a in finding.atoms if a < 4]
    assert len(carbons) == 4
    assert resemblances(record.view, acid(60), ("CCCOC1CCNCC1",), None) == ()


def test_survivors_make_the_motif_as_particular_as_it_must_be() -> None:
    # Phenyl tert-butyl ethers were lost where alkyl ones came through: an alkyl ether is then no likeness.
    record = Record().add(acid(50), ("group-loss", None), scheme="CC(C)(C)Oc1ccccc1C", products=lost("Oc1ccccc1C"))
    plain = resemblances(record.view, acid(60), ("CC(C)(C)OCCC",), None)
    record.add(acid(60), scheme="CC(C)(C)OCCCC>>CC(C)(C)OCCCC", fate="substitution")
    informed = resemblances(record.view, acid(60), ("CC(C)(C)OCCC",), None)
    assert plain
    assert not informed
    assert resemblances(record.view, acid(60), ("CC(C)(C)Oc1ccccc1",), None)


def test_milder_survivors_say_nothing_for_the_motif() -> None:
    record = Record().add(acid(50), ("group-loss", None), scheme="CC(C)(C)Oc1ccccc1C", products=lost("Oc1ccccc1C"))
    record.add(acid(0), scheme="CC(C)(C)OCCCC>>CC(C)(C)OCCCC", fate="substitution")
    assert resemblances(record.view, acid(60), ("CC(C)(C)OCCC",), None)


def test_a_loss_that_is_wanted_is_no_resemblance() -> None:
    record = Record().add(acid(50), ("group-loss", "[CX4]OC(C)(C)C"), scheme=f"{ETHER}>>{KEPT}", products=lost())
    assert resemblances(record.view, acid(60), (PLAN,), None, ("OC1CCN(C(=O)OC(C)(C)C)CC1",)) == ()


def test_what_a_liability_already_said_is_not_said_twice() -> None:
    record = Record().add(acid(50), ("group-loss", "[CX4]OC(C)(C)C"), scheme=f"{ETHER}>>{KEPT}", products=lost())
    assert resemblances(record.view, acid(60), (PLAN,), None, (), (frozenset(range(6)),)) == ()


def test_survivors_of_the_motif_stand_beside_the_losses() -> None:
    record = Record().add(acid(50), ("group-loss", "[CX4]OC(C)(C)C"), scheme=f"{ETHER}>>{KEPT}", products=lost())
    record.add(acid(60), scheme=f"{ETHER}>>{KEPT}", products=kept())
    record.add(acid(0), scheme=f"{ETHER}>>{KEPT}", products=kept())
    (finding,) = resemblances(record.view, acid(60), (PLAN,), None)
    assert finding.evidence is not None
    assert finding.evidence.runs == ("R-1", "R-2")  # the third was so mild that it says nothing


def test_however_many_runs_a_bounded_number_is_looked_at(monkeypatch: pytest.MonkeyPatch) -> None:
    record = Record()
    for place in range(30):
        chain = "C" * (place + 2)
        record.add(acid(50), ("group-loss", None), scheme=f"CC(C)(C)O{chain}", products=lost(f"O{chain}"))
    for _ in range(120):
        record.add(acid(60), scheme=f"{ETHER}>>{KEPT}", products=kept())
    view = record.view
    searched: list[str] = []
    monkeypatch.setattr(view, "rows_with_motif", _noting(view.rows_with_motif, searched))
    found = resemblances(view, acid(60), (PLAN,), None)
    assert all(f.evidence and f.evidence.survived <= MOST_WITNESSES for f in found)
    assert len(searched) <= 3 * WIDENED + len(found) + 1


def _noting(search: Any, searched: list[str]) -> Any:
    def note(smarts: str) -> np.ndarray:
        searched.append(smarts)
        return np.asarray(search(smarts))

    return note
