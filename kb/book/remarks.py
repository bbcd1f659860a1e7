"""What is said of a run just recorded: how its scheme was read, and what does not add up or is missing.

Remarks refuse nothing; the run is kept as it was written.
"""

from __future__ import annotations

from kb.record.finding import Finding
from kb.record.outcome import Outcome
from kb.record.run import Run
from kb.vocabulary import FindingKind, Severity


def remarks_on(run: Run, wanted_code: str | None = None) -> tuple[Finding, ...]:
    """Return findings about the data of a run, most telling first.

    Args:
        run: as it is kept.
        wanted_code: the code that it brought along; None = none.
    """
    from kb.assess.data_findings import find_outcome_findings
    from kb.book.words import read_scheme

    findings = list(find_outcome_findings(run.outcome))
    reading = read_scheme(run.scheme)
    if reading.centre is None and not reading.fate:
        findings.append(
            _remark(
                "data:not-read",
                "The scheme was not understood",
                f"{reading.reason} The run is kept, but cannot serve as a precedent.",
            )
        )
    if run.outcome == Outcome() and run.verdict is None:
        findings.append(
            _remark(
                "data:no-outcome",
                "No outcome is recorded",
                f"Add it when it is known: sidepath amend {run.code or 'CODE'} --why '...' --set yield=...",
            )
        )
    if wanted_code is not None and not _is_code_of(run, wanted_code):
        shown = ascii(wanted_code)[1:-1][:20]
        findings.append(
            _remark("data:other-code", "Another code", f"{shown} is taken or is no code; the run is {run.code} here.")
        )
    return tuple(findings)


def _is_code_of(run: Run, text: str) -> bool:
    from kb.store.codes import parse_code

    return run.code is not None and parse_code(text) == parse_code(run.code)


def reading_words(run: Run) -> str:
    """Return what a scheme was read as, in words; "" where it was not understood."""
    from kb.book.words import read_scheme

    reading = read_scheme(run.scheme)
    centre = reading.centre
    if centre is None:
        return str(reading.fate or "")
    words = [str(centre.carbon_class), *map(str, centre.flags)]
    if centre.leaving_group:
        words.append(f"loses {centre.leaving_group}")
    return f"{reading.fate or 'no product drawn'} at {', '.join(words)}"


def _remark(rule_id: str, title: str, why: str) -> Finding:
    return Finding(
        rule_id=rule_id,
        kind=FindingKind.DATA,
        severity=Severity.NOTE,
        title=title,
        why=why,
        source="common practice",
    )
