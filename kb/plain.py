"""Chemists' text made safe to show on a terminal: control characters, escapes and direction marks become visible.

It changes nothing that is stored. Everything that a front end prints of a note, a name or a file passes through here.
"""

from __future__ import annotations

import unicodedata

_KEPT = {"\n", "\t"}
_REPLACEMENT = "\N{REPLACEMENT CHARACTER}"


def plain(text: str, *, keep_lines: bool = False) -> str:
    """Return text that can act on no terminal.

    Args:
        text: anything.
        keep_lines: keep newlines and tabs; otherwise they become one space.

    Returns:
        The text with every other control (Cc), format (Cf: bidi and zero-width marks), surrogate (Cs) and private
        character (Co) replaced by U+FFFD.

    >>> plain("a\\x1b[31mred\\u202e")
    'a\ufffd[31mred\ufffd'
    """
    shown = []
    for character in text:
        if character in _KEPT:
            shown.append(character if keep_lines else " ")
        elif unicodedata.category(character) in ("Cc", "Cf", "Cs", "Co"):
            shown.append(_REPLACEMENT)
        else:
            shown.append(character)
    return "".join(shown)


def shortened(text: str, width: int) -> str:
    """Return text cut to a width in characters, with an ellipsis where something was cut."""
    return text if len(text) <= width else text[: max(width - 1, 0)] + "…"
