"""`rule add`, `rule list`, `rule test`, `rule retire`: the group's own liabilities."""

from __future__ import annotations

from typing import Annotated, Any, Optional

import typer

from kb.cli.render import counted, severity_word, wrapped
from kb.cli.session import current_session
from kb.errors import InvalidRecord
from kb.vocabulary import Severity

Word = Optional[str]  # noqa: UP045 - typer reads the annotations at run time
MotifFlag = Annotated[Word, typer.Option("--motif", metavar="SMARTS", help="What must be in the molecule.")]
WhenFlag = Annotated[str, typer.Option("--when", help="Condition, e.g. 'acidity >= strong and temperature_c >= 40'.")]


LONGEST_TITLE = 200
"""Longest title of a rule [characters]: it is one line of a finding."""


def register(app: typer.Typer) -> None:
    """Add the group of commands of this file."""
    rules = typer.Typer(rich_markup_mode=None, help="House rules: liabilities that this group wrote down.")
    rules.command("add")(add)
    rules.command("list")(list_rules)
    rules.command("test")(test)
    rules.command("retire")(retire)
    app.add_typer(rules, name="rule")


def add(
    title: Annotated[str, typer.Argument(help="The rule in one line.")],
    when: WhenFlag,
    why: Annotated[str, typer.Option("--why", help="The reason, in plain words; shown with each warning.")],
    motif: MotifFlag = None,
    severity: Annotated[Severity, typer.Option("--severity", help="How much it matters.")] = Severity.CAUTION,
    source: Annotated[str, typer.Option("--source", help="Runs or reference behind it.")] = "",
) -> None:
    """Write a rule down; it is tried on the whole book first and the outcome is shown."""
    from kb.book import house_rule

    session = current_session()
    if len(title) > LONGEST_TITLE:
        hint = f"Keep it to {LONGEST_TITLE}, and say the rest in --why."
        raise InvalidRecord(f"The title has {len(title):,} characters.", hint, title)
    rule = house_rule(title, motif, when, severity, why, source, session.initials)
    with session.opened() as book:
        trial = book.try_rule(rule)
        rule = book.add_rule(rule)
    text = "\n".join([*wrapped(f"Rule {rule.rule_id} added."), _trial_text(trial)])
    session.answer(_trial_dict(rule.rule_id, trial), text)


def list_rules() -> None:
    """List the rules, retired ones marked."""
    session = current_session()
    with session.opened(read_only=True) as book:
        rules = book.rules()
    lines: list[str] = []
    for rule in rules:
        state = f" (retired: {rule.retired_why})" if rule.is_retired else ""
        lines += wrapped(f"{rule.rule_id}: {rule.title}{state}", 10, first=f"  {severity_word(rule.severity)} ")
        lines += wrapped(f"when {rule.when}" + (f"; motif {rule.motif}" if rule.motif else ""), 10)
        lines += wrapped(rule.why, 10)
        if rule.source or rule.author:
            lines += wrapped("; ".join(filter(None, (rule.source, f"by {rule.author}" if rule.author else ""))), 10)
    data = [
        {
            "id": r.rule_id,
            "title": r.title,
            "motif": r.motif,
            "when": r.when,
            "severity": str(r.severity),
            "why": r.why,
            "by": r.author,
            "source": r.source,
            "retired_why": r.retired_why,
        }
        for r in rules
    ]
    session.answer(data, "\n".join(lines) or "No house rules yet.")


def test(
    name: Annotated[Word, typer.Argument(help="A rule of the book; or give --when and --motif.")] = None,
    when: Annotated[Word, typer.Option("--when", help="Condition of a rule not yet in the book.")] = None,
    motif: MotifFlag = None,
) -> None:
    """Try a rule on every run: failures it warns of, false alarms."""
    from kb.book import house_rule

    session = current_session()
    if (name is None) == (when is None):
        raise typer.BadParameter("Name a rule, or give --when (and --motif) of a new one.")
    with session.opened(read_only=True) as book:
        if name is not None:
            rule = book.rule(name)
        else:
            rule = house_rule("trial", motif, when or "", Severity.CAUTION, "", "", "trial")
        trial = book.try_rule(rule)
    session.answer(_trial_dict(name or "trial", trial), _trial_text(trial))


def retire(
    name: Annotated[str, typer.Argument(help="A rule of the book.")],
    why: Annotated[str, typer.Option("--why", help="Reason, kept with the rule.")],
) -> None:
    """Retire a rule; it is kept with the reason but warns no more."""
    session = current_session()
    with session.opened() as book:
        book.retire_rule(name, why=why, who=session.initials)
    session.answer({"id": name, "retired_why": why}, "\n".join(wrapped(f"Rule {name} retired.")))


def _trial_dict(name: str, trial: Any) -> dict[str, Any]:
    return {
        "id": name,
        "hits": list(trial.hits),
        "false_alarms": list(trial.false_alarms),
        "undecided": list(trial.undecided),
        "failures_in_book": trial.failures_in_book,
    }


def _trial_text(trial: Any) -> str:
    lines = wrapped(
        f"On this book it warns of {len(trial.hits)} of {counted(trial.failures_in_book, 'failure')}, "
        f"with {counted(len(trial.false_alarms), 'false alarm')} and {len(trial.undecided)} that cannot be told."
    )
    if trial.hits:
        lines += wrapped("Failures: " + ", ".join(trial.hits[:20]), 2)
    if trial.false_alarms:
        lines += wrapped("False alarms: " + ", ".join(trial.false_alarms[:20]), 2)
    return "\n".join(lines)
