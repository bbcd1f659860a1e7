"""The short way into `check`: plain words read without the parser.

Loading Typer and building all commands takes a third as long as a whole check. Here only what cannot be misread is
taken: options of `check` that are known, each with a value that is not empty, one scheme, the global options. Anything
else (help, a mistake, an unusual spelling) is None, and the parser does it, so that there is one place that words
refusals. A test compares these options with those that the parser knows.
"""

from __future__ import annotations

import re
import sys
from collections.abc import Callable, Sequence
from typing import Any

from kb.errors import Cancelled
from kb.vocabulary import Severity

MANY = {
    "--with": "reagents",
    "--base": "bases",
    "--acid": "acids",
    "--add": "additives",
    "--solvent": "solvents",
}
"""Options that may be repeated, and what they are called among the words of a plan."""
ONE = {
    "--temp": "temperature",
    "--time": "time",
    "--conc": "concentration",
    "--scale": "scale",
    "--atmosphere": "atmosphere",
}
_FLAGS = {"--json": "as_json", "--quiet": "quiet", "-q": "quiet", "--verbose": "verbose", "-v": "verbose"}
_GLOBAL = {"--book": "book", "--as": "who"}
_MOST_PRECEDENTS = 200


def run_quickly(front: Sequence[str], rest: Sequence[str]) -> int | None:
    """Run a check and return its exit status; None where the words are for the parser.

    Args:
        front: the global options.
        rest: all other words, the command first.
    """
    if not rest or rest[0] != "check":
        return None
    options = _global_options(front)
    asked = _asked(rest[1:])
    if options is None or asked is None:
        return None
    from kb.cli.checking import answer_check
    from kb.cli.session import Session, set_session

    session = Session(**options)
    set_session(session)
    try:
        return answer_check(session, **asked)
    except KeyboardInterrupt:
        raise Cancelled("Stopped.", "What was finished before is kept.") from None


def has_answered() -> bool:
    """Return whether a check was answered in this process without loading the store, which may have more to close."""
    return "kb.cli.checking" in sys.modules and "sqlalchemy" not in sys.modules


def _global_options(front: Sequence[str]) -> dict[str, Any] | None:
    found: dict[str, Any] = {}
    words = iter(front)
    for word in words:
        if word in _FLAGS:
            found[_FLAGS[word]] = True
            continue
        name, equals, value = word.partition("=")
        value = value if equals else next(words, "")
        if name not in _GLOBAL or _GLOBAL[name] in found or not value.strip() or value.startswith("-"):
            return None
        found[_GLOBAL[name]] = value
    return found


def _asked(words: Sequence[str]) -> dict[str, Any] | None:
    """Return the arguments of `answer_check`, or None."""
    conditions: dict[str, Any] = {}
    asked: dict[str, Any] = {"words": conditions}
    rest = iter(words)
    for word in rest:
        if not word.startswith("-"):
            if "scheme" in asked or not word.strip():
                return None
            asked["scheme"] = word
            continue
        name, equals, value = word.partition("=")
        value = value if equals else next(rest, "")
        if not value.strip() or (value.startswith("-") and not re.match(r"-\d", value)):
            return None
        if name in MANY:
            conditions.setdefault(MANY[name], []).append(value)
        elif name in ONE and ONE[name] not in conditions:
            conditions[ONE[name]] = value
        elif name in OWN and (field := OWN[name][0]) not in asked and (read := OWN[name][1](value)) is not None:
            asked[field] = read
        else:
            return None
    return asked if "scheme" in asked else None


def _count(text: str) -> int | None:
    return int(text) if re.fullmatch(r"[0-9]{1,3}", text) and int(text) <= _MOST_PRECEDENTS else None


def _severity(text: str) -> Severity | None:
    return Severity(text) if text in set(map(str, Severity)) else None


def _as_it_is(text: str) -> str | None:
    return text


OWN: dict[str, tuple[str, Callable[[str], Any]]] = {
    "--top": ("top", _count),
    "--fail-on": ("fail_on", _severity),
    "--at-date": ("at_date", _as_it_is),
    "--acknowledge": ("acknowledge", _as_it_is),
    "--because": ("because", _as_it_is),
}
"""Options of `check` itself: the argument of `answer_check`, and how a value is read; None = leave it to the parser."""
