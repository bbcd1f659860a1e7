"""How a value shows itself in a notebook, without knowing how pages are made.

A notebook asks a value for `_repr_html_`. Pages are made far above the floors where runs, readings, assessments, audits
and routes live, so the values only ask whoever has taught this module; `kb.book` does when a book is opened. Until then
they answer None, and the notebook falls back to plain text. This keeps imports pointing down: nothing here imports
anything.
"""

from __future__ import annotations

from collections.abc import Callable

_TEACHER: list[Callable[[object], str]] = []


def show_with(render: Callable[[object], str]) -> None:
    """Let values show themselves by `render`, which takes one and returns HTML; the last teacher counts."""
    _TEACHER[:] = [render]


class ShowsItself:
    """Base of values that a notebook shows as a page."""

    __slots__ = ()

    def _repr_html_(self) -> str | None:
        """Return HTML for a notebook; None until someone has said how."""
        return _TEACHER[0](self) if _TEACHER else None
