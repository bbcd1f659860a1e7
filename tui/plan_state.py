"""A plan as it stands in the form, and as it goes to the book: pure conversion, drafts included."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from kb.errors import SidepathError
from kb.record.assessment import Assessment
from kb.record.plan import Plan
from kb.record.run import Run
from tui.condition_text import ConditionTexts, read_conditions, write_conditions
from tui.ports import BookPort

PLAN_DRAFT = "plan"
"""Key under which the planning form is kept."""


@dataclass(frozen=True, slots=True, kw_only=True)
class PlanRead:
    """A form read: the plan without its bad fields, and what is wrong with those."""

    plan: Plan
    errors: Mapping[str, SidepathError] = field(default_factory=dict)


def read_plan(state: Mapping[str, str], book: BookPort) -> PlanRead:
    """Read the lines of a form; the scheme must not be empty.

    Names are resolved by the book, so this may be slow: call it from a worker.
    """
    conditions, errors = read_conditions(ConditionTexts.from_dict(dict(state)), book)
    project = state.get("project", "").strip() or None
    return PlanRead(plan=Plan(scheme=state["scheme"].strip(), conditions=conditions, project=project), errors=errors)


def check_state(state: Mapping[str, str], book: BookPort) -> tuple[PlanRead, Assessment | None]:
    """Read a form and check its plan; None where the scheme cannot be read. Slow: call it from a worker."""
    read = read_plan({**state, "scheme": book.scheme_text(state["scheme"].strip())}, book)
    if not book.read_scheme(read.plan.scheme).ok:
        return read, None
    return read, book.check(read.plan)


def state_of_plan(plan: Plan) -> dict[str, str]:
    """Return the lines that would be typed for a plan."""
    return {"scheme": plan.scheme, **write_conditions(plan.conditions).as_dict(), "project": plan.project or ""}


def state_of_run(run: Run) -> dict[str, str]:
    """Return the lines that would be typed for a run, to plan it again."""
    return state_of_plan(run.plan)


def what_if_temperatures(plan: Plan) -> tuple[float, ...]:
    """Return the temperatures worth asking about [degC]: nine round the planned one, within -78 to 180.

    Empty where the plan has no number for its temperature.
    """
    temperature = plan.conditions.temperature
    middle = temperature.high_c if temperature else None
    if middle is None:
        return ()
    steps = [middle + 15.0 * i for i in range(-4, 5)]
    return tuple(t for t in steps if -78.0 <= t <= 180.0) or (middle,)
