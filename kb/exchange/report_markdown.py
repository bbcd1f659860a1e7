"""A page as Markdown: the same blocks as the HTML, drawings told in words.

It owns escaping. What a person typed can be no markup: every character that CommonMark gives a meaning is escaped,
angle brackets and ampersands become entities, and a note stands line by line in a quote. Control characters were made
visible.
"""

from __future__ import annotations

import re
from collections.abc import Iterator

from kb.exchange.report_blocks import NO_PERMISSION, Block, Facts, Figure, Items, Page, Row, Section, Table, Warn, Words
from kb.plain import plain

_INLINE = re.compile(r"([\\`*_\[\]|~@]|(?<=:)/(?=/)|(?<=www)\.)")
_AT_START = re.compile(r"^(\d*)([#+\-=.)])")
_ENTITY = {"&": "&amp;", "<": "&lt;", ">": "&gt;"}
_SHAPE = {"serious": "■ serious", "caution": "▲ caution", "note": "● note"}


def page_markdown(page: Page) -> str:
    """Return a page as CommonMark with tables."""
    lines = [f"# {_safe(page.title)}", "", f"*{_safe(page.kind)}*", ""]
    if page.lead:
        lines += [_safe(page.lead), ""]
    for section in page.sections:
        lines += _section(section, 2)
    lines += ["---", "", _safe(page.source), ""]
    lines += [NO_PERMISSION, ""]
    return "\n".join(lines)


def _section(section: Section, level: int) -> Iterator[str]:
    yield f"{'#' * level} {_safe(section.heading)}"
    yield ""
    for block in section.blocks:
        yield from _block(block, level + 1)
    for part in section.parts:
        yield from _section(part, level + 1)


def _block(block: Block, level: int) -> Iterator[str]:
    if isinstance(block, Words):
        lines = plain(block.text, keep_lines=True).split("\n")
        yield from (f"> {_safe(line)}  " for line in lines) if block.tone == "quote" else [_safe(block.text)]
    elif isinstance(block, Facts):
        yield from (f"- {_safe(name)}: {_safe(value)}" for name, value in block.pairs)
    elif isinstance(block, Items):
        yield from (f"- {_safe(text)}" for text in block.texts)
    elif isinstance(block, Table):
        yield from [_safe(block.caption), ""]
        yield "| " + " | ".join(_safe(cell) for cell in block.header) + " |"
        yield "|" + "|".join("---:" if i in block.figures else "---" for i in range(len(block.header))) + "|"
        yield from ("| " + " | ".join(_safe(cell) for cell in row) + " |" for row in block.rows)
    elif isinstance(block, Figure):
        yield _figure(block)
    elif isinstance(block, Row):
        yield " ".join(_safe(part) if isinstance(part, str) else _figure(part) for part in block.figures)
    else:
        yield from _warn(block, level)
        return
    yield ""


def _warn(block: Warn, level: int) -> Iterator[str]:
    yield f"{'#' * level} {_SHAPE.get(block.severity, '')}: {_safe(block.title)}"
    yield ""
    for inner in block.blocks:
        yield from _block(inner, level + 1)


def _figure(figure: Figure) -> str:
    return f"[{_safe(figure.alternative)}]"


def _safe(text: str) -> str:
    """Return one line of text that Markdown takes as text."""
    one_line = " ".join(plain(text).split())
    escaped = _AT_START.sub(r"\1\\\2", _INLINE.sub(r"\\\1", one_line))
    return re.sub("[&<>]", lambda found: _ENTITY[found[0]], escaped)
