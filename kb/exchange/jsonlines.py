"""JSON Lines in and out: one run a line, lossless, in the portable form of `kb.record.portable`.

It owns the framing (lines, encoding, bounds) and the dressing of a rejected line; the form of a run is the record's. A
line that is no run is refused with its line number and reading goes on. A run without `run_id` gets one from its
content, so reading a file twice doubles nothing. Values that JSON does not know (NaN, Infinity) are refused.
"""

from __future__ import annotations

import dataclasses
import json
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

from kb.errors import InvalidRecord, SidepathError
from kb.exchange.rows import content_id
from kb.exchange.text_in import LineTooLong, TextLines
from kb.record.portable import run_from_dict, run_to_dict
from kb.record.run import Run

REJECTED = "sidepath_rejected"
"""Key that a rejects file adds to a line, with the reason; passed over when the mended line is read again."""


class JsonLines:
    """A JSON Lines file; iterating gives (line number, Run or error, line as it stands)."""

    def __init__(self, path: Path) -> None:
        self._lines = TextLines(path)

    def __iter__(self) -> Iterator[tuple[int, Run | SidepathError, str]]:
        with self._lines as lines:
            while True:
                try:
                    text = next(lines)
                except StopIteration:
                    return
                except LineTooLong as error:
                    yield lines.line, error, ""
                    continue
                if text.strip():
                    yield lines.line, _read(text), text

    @property
    def done_share(self) -> float:
        """Return the part of the file that was read, 0..1."""
        return self._lines.done_bytes / max(self._lines.size_bytes, 1)


def run_to_line(run: Run) -> str:
    """Return the run as one line of JSON, without its line end; plain ASCII, so that no encoding can spoil it."""
    return json.dumps(run_to_dict(run), ensure_ascii=True, allow_nan=False, separators=(",", ":"))


def run_from_line(text: str) -> Run:
    """Return the run of one line.

    Raises:
        InvalidRecord: the line is no JSON object, or not the portable form of a run.
    """
    data = _object(text)
    if isinstance(data.get(REJECTED), dict) and set(data) == {REJECTED, "text"}:
        data = _object(str(data["text"]))
    data.pop(REJECTED, None)
    run = run_from_dict(data)
    return run if data.get("run_id") else dataclasses.replace(run, run_id=content_id(data))


def rejected_line(text: str, line: int, reason: str) -> str:
    """Return the line for a rejects file: the same object with the reason, or the text itself wrapped in one."""
    note = {"line": line, "reason": reason}
    try:
        data = _object(text)
    except InvalidRecord:
        data = {"text": text.rstrip("\r\n")}
    data.pop(REJECTED, None)
    return json.dumps({REJECTED: note, **data}, ensure_ascii=True)


def write_json_lines(runs: Iterable[Run], path: Path) -> int:
    """Write runs, one a line, UTF-8; return how many."""
    written = 0
    with path.open("w", encoding="utf-8", newline="\n") as file:
        for run in runs:
            file.write(run_to_line(run) + "\n")
            written += 1
    return written


def _read(text: str) -> Run | SidepathError:
    try:
        return run_from_line(text)
    except SidepathError as error:
        return error


def _object(text: str) -> dict[str, Any]:
    try:
        data = json.loads(text, parse_constant=_no_constant)
    except InvalidRecord:
        raise
    except (ValueError, RecursionError) as error:
        raise InvalidRecord(
            f"The line is no JSON ({type(error).__name__}).", "Each line holds one run as {...}.", text[:60]
        ) from error
    if not isinstance(data, dict):
        raise InvalidRecord("The line is JSON, but no object.", "Each line holds one run as {...}.", text[:60])
    return data


def _no_constant(word: str) -> None:
    raise InvalidRecord(f"{word} is no number.", "Write null where nothing was recorded.", word)
