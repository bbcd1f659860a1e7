"""A route with what-ifs: which lines were typed over the file's, and the route that they make.

It owns the names of the edits and how they apply, in this order: another amount wanted, other conditions of a step
(checked anew), another yield (which then stands, whatever the conditions say), whether a poor yield matters. The file
is never touched. One bad line spoils nothing else: it comes back as an error under its name.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace

from kb.errors import SidepathError
from kb.record.plan import Plan
from kb.route.imagined import with_forgiven, with_step, with_target, with_yield
from kb.route.routefile import FORGIVEN, parse_yield
from kb.route.sequence import Route, Step
from tui.condition_text import read_conditions, write_conditions
from tui.jobs import EditLog
from tui.ports import BookPort, Imagined

TARGET = "|wanted"
"""Name of the edit of the amount wanted; those of steps are made by `edit_name`."""

CONDITIONS = ("reagent", "base", "acid", "additive", "solvent", "temperature", "time", "concentration")
MATTERS = "matters"
"""Word of the edit that says why a poor yield does not matter."""
REASONS: tuple[str, ...] = ("", *FORGIVEN.values())
"""What MATTERS can hold: "" = a poor yield matters."""


def edit_name(step: str, field_name: str) -> str:
    """Return the name of an edit: what a line of a step is called among all lines."""
    return f"{step}|{field_name}"


def lines_of(step: Step) -> dict[str, str]:
    """Return the lines of a step as the file has them; the yield is empty, for it is shown as a hint."""
    if step.plan is None:
        return dict.fromkeys(("yield", *CONDITIONS), "")
    texts = write_conditions(step.plan.conditions).as_dict()
    return {"yield": "", **{name: texts[name] for name in CONDITIONS}}


def next_reason(step: Step) -> str:
    """Return the reason that follows the one a step has, so that one key walks through all of them."""
    held = step.forgiven[0] if step.forgiven else ""
    return REASONS[(REASONS.index(held) + 1) % len(REASONS)] if held in REASONS else ""


def wanted_in_file(route: Route | None) -> str:
    """Return the amount wanted as the file would say it; "" where it says none."""
    if route is None or route.target_mmol is None:
        return ""
    if route.target_molar_mass is not None:
        return f"{route.target_mmol * route.target_molar_mass / 1000:.4g} g"
    return f"{route.target_mmol:.4g} mmol"


class Edits:
    """What was typed over a route, with undo; only what differs from the file is an edit."""

    def __init__(self) -> None:
        self.texts: dict[str, str] = {}
        self._log = EditLog({})

    def note(self, name: str, text: str, in_file: str) -> None:
        """Note what a line holds now; where it says what the file says it is no edit any more."""
        self.texts = {key: value for key, value in self.texts.items() if key != name}
        if text.strip() != in_file.strip():
            self.texts[name] = text
        self._log.note(name, self.texts)

    def of_step(self, step: str) -> dict[str, str]:
        """Return the edits of a step by field."""
        fields = ("yield", *CONDITIONS, MATTERS)
        return {f: self.texts[edit_name(step, f)] for f in fields if edit_name(step, f) in self.texts}

    def forget_step(self, step: str) -> None:
        """Take a step back to what the file says."""
        own = {edit_name(step, field) for field in self.of_step(step)}
        self.texts = {name: text for name, text in self.texts.items() if name not in own}
        self._log.note("*", self.texts)

    def undo(self) -> bool:
        """Take the last edit back; False where there is none."""
        return self._take(self._log.undo())

    def redo(self) -> bool:
        """Do the edit again; False where there is none."""
        return self._take(self._log.redo())

    def _take(self, texts: dict[str, str] | None) -> bool:
        if texts is not None:
            self.texts = texts
        return texts is not None


def imagine(
    route: Route, edits: Mapping[str, str], book: BookPort, recheck: Callable[[Step, Plan], Step]
) -> Imagined:
    """Apply the edits to a route and reckon it; called from workers.

    Args:
        edits: texts by the names of TARGET and `edit_name`.
        recheck: looks a step up with another plan.
    """
    from kb.route.ledger import reckon  # loads NumPy, which the screens' own process does without

    errors: dict[str, SidepathError] = {}
    if TARGET in edits:
        try:
            route = with_target(route, edits[TARGET])
        except SidepathError as error:
            errors[TARGET] = error
    for step in route.steps:
        for change in (_conditions, _yield, _reason):
            try:
                route = change(route, step.name, edits, book, recheck, errors)
            except SidepathError as error:
                errors[edit_name(step.name, _FIELD_OF[change.__name__])] = error
    return Imagined(ledger=reckon(route), errors=errors)


_FIELD_OF = {"_conditions": "solvent", "_yield": "yield", "_reason": MATTERS}
"""Where an error is shown that belongs to no line of its own."""

_Recheck = Callable[[Step, Plan], Step]
_Errors = dict[str, SidepathError]


def _conditions(
    route: Route, name: str, edits: Mapping[str, str], book: BookPort, recheck: _Recheck, errors: _Errors
) -> Route:
    step = route.step(name)
    typed = {f: edits[edit_name(name, f)] for f in CONDITIONS if edit_name(name, f) in edits}
    if not typed or step.plan is None:
        return route
    conditions, bad = read_conditions(replace(write_conditions(step.plan.conditions), **typed), book)
    errors.update({edit_name(name, f): error for f, error in bad.items()})
    plan = replace(step.plan, conditions=conditions)
    return route if bad or plan == step.plan else with_step(route, recheck(step, plan))


def _yield(
    route: Route, name: str, edits: Mapping[str, str], book: BookPort, recheck: _Recheck, errors: _Errors
) -> Route:
    text = edits.get(edit_name(name, "yield"), "").strip()
    return with_yield(route, name, parse_yield(text, "It")) if text else route


def _reason(
    route: Route, name: str, edits: Mapping[str, str], book: BookPort, recheck: _Recheck, errors: _Errors
) -> Route:
    reason = edits.get(edit_name(name, MATTERS))
    return route if reason is None else with_forgiven(route, name, (reason,) if reason else ())
