"""Cells that no spreadsheet program takes for a formula, and the way back.

A cell that starts with one of `= + - @` (or their full-width forms), after blanks or not, may be run when a file is
opened; so may what stands behind a delimiter inside a cell, in a program set to another delimiter. Such places get one
apostrophe in front, which every program shows or hides but none runs; reading takes it off again, so nothing changes on
a round trip. Plain numbers are left alone.

Source of the list of characters: common practice (the OWASP note on CSV injection), stated from memory.
"""

from __future__ import annotations

import re

_STARTERS = "=+\\-@\uff1d\uff0b\uff0d\uff20"
_GUARD = re.compile(rf"(^|[;,|\t\r\n])(\s*)('*)(?=[{_STARTERS}])")
_UNGUARD = re.compile(rf"(^|[;,|\t\r\n])(\s*)'('*)(?=[{_STARTERS}])")
_NUMBER = re.compile(r"[+-]?\d+(?:[.,]\d+)?")


def guarded(text: str) -> str:
    """Return the cell with an apostrophe wherever a formula could start.

    >>> guarded("=1+1"), guarded("-78"), guarded("0C to rt")
    ("'=1+1", '-78', '0C to rt')
    """
    if _NUMBER.fullmatch(text):
        return text
    return _GUARD.sub(r"\1\2\3'", text)


def unguarded(text: str) -> str:
    """Return the cell as it was before `guarded`."""
    return _UNGUARD.sub(r"\1\2\3", text) if "'" in text else text
