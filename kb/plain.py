"""Chemists' text made safe to show on a terminal: control characters, escapes and direction marks become visible.

It changes nothing that is stored. Everything that a front end prints of a note, a name or a file passes through here.
"""

from __future__ import annotations

import unicodedata

_KEPT = {"\n", "\t"}
_REPLACEMENT = "\N{REPLACEMENT CHARACTER}"
_ACTING = frozenset({"Cc", "Cf", "Cs", "Co", "Zl", "Zp"})
"""Unicode categories that may act on a terminal: controls, formats (bidi and zero-width marks), surrogates, private
characters, and the line and paragraph separators."""


class _Shown(dict[int, str]):
    """Translation table that works each character out once, so that long notes pass at the speed of `str.translate`."""

    def __init__(self, *, keep_lines: bool) -> None:
        super().__init__()
        self._keep_lines = keep_lines

    def __missing__(self, code: int) -> str:
        character = chr(code)
        if character in _KEPT:
            shown = character if self._keep_lines else " "
        else:
            shown = _REPLACEMENT if unicodedata.category(character) in _ACTING else character
        self[code] = shown
        return shown


_ONE_LINE = _Shown(keep_lines=False)
_LINES = _Shown(keep_lines=True)


class _Escaped(dict[int, str]):
    """As `_Shown`, with JSON's own escapes, which lose nothing."""

    def __missing__(self, code: int) -> str:
        character = chr(code)
        shown = character
        if character != "\n" and unicodedata.category(character) in _ACTING:
            units = character.encode("utf-16-be", "surrogatepass").hex()
            shown = "".join(f"\\u{units[i : i + 4]}" for i in range(0, len(units), 4))
        self[code] = shown
        return shown


_JSON = _Escaped()


def plain(text: str, *, keep_lines: bool = False) -> str:
    """Return text that can act on no terminal.

    Args:
        text: anything.
        keep_lines: keep newlines and tabs; otherwise they become one space.

    Returns:
        The text with every other control (Cc), format (Cf: bidi and zero-width marks), surrogate (Cs), private
        character (Co) and line separator (Zl, Zp) replaced by U+FFFD.

    >>> plain("a\\x1b[31mred\\u202e")
    'a\ufffd[31mred\ufffd'
    """
    return text if text.isprintable() else text.translate(_LINES if keep_lines else _ONE_LINE)


def plain_json(text: str) -> str:
    """Return JSON text in which acting characters are written as JSON escapes: the same value, safe on a terminal.

    >>> plain_json('"\\u202e"')
    '"\\\\u202e"'
    """
    return text if text.isprintable() else text.translate(_JSON)


def shortened(text: str, width: int) -> str:
    """Return text cut to a width in characters, with an ellipsis where something was cut."""
    return text if len(text) <= width else text[: max(width - 1, 0)] + "…"


def quoted(value: object, most: int = 60) -> str:
    """Return a value as Python writes it in ASCII, cut to `most` characters: for naming what somebody gave.

    >>> quoted("caf\u00e9")
    "'caf\\\\xe9'"
    """
    text = ascii(value)
    return text if len(text) <= most else text[: most - 3] + "..."


def counted(number: int, thing: str, things: str = "") -> str:
    """Return "1 run", "2 runs", "1,200 runs"."""
    return f"{number:,} {thing if number == 1 else things or thing + 's'}"


def excerpt(text: str, limit: int) -> str:
    """Return text, or its beginning with a remark on how long the whole is [characters].

    >>> excerpt("CCCCCCCC", 4)
    'CCCC… (8 characters in all)'
    """
    return text if len(text) <= limit else f"{text[:limit]}… ({len(text):,} characters in all)"
