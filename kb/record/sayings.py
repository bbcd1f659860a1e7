"""What is said of evidence and of what an estimate rests on, in the same words wherever they are shown.

It owns wording only; the command line, the terminal interface and pages lay it out, and each makes it safe for its own
medium. Shares are told in whole percent.
"""

from __future__ import annotations

from kb.record.finding import Evidence, Interval
from kb.vocabulary import Basis, FindingKind

BASIS_WORDS: dict[Basis, str] = {
    Basis.RECORD: "this book",
    Basis.PUBLISHED: "published rates, no run of this book",
    Basis.BOTH: "this book and published rates",
    Basis.NONE: "nothing",
}
"""What figures rest on."""

NO_RUNS = "No run of this book bears on it."


def say_counts(evidence: Evidence, kind: FindingKind = FindingKind.LIABILITY) -> str:
    """Return what the runs of a book say of a motif: "lost in 3, survived in 2; chance 59 % (35 to 82)"; "" = no runs.

    A resemblance counts runs that failed and came through, all else groups that were lost and survived.
    """
    if not evidence.lost and not evidence.survived:
        return ""
    bad, good = ("failed", "came through") if kind is FindingKind.RESEMBLANCE else ("lost", "survived")
    said = f"{bad} in {evidence.lost}, {good} in {evidence.survived}"
    if evidence.chance is not None:
        said += f"; chance {say_share(evidence.chance)}"
    return f"{said}; {evidence.note}" if evidence.note else said


def say_share(share: Interval) -> str:
    """Return a share with its interval: "59 % (35 to 82)"; a trace is "<1 %"."""
    mean = "<1" if 0 < share.mean < 0.005 else f"{100 * share.mean:.0f}"
    return f"{mean}\N{NO-BREAK SPACE}% ({100 * share.low:.0f} to {100 * share.high:.0f})"
