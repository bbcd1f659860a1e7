"""The tour in README.md is real: every command of a `console` block is run, and its output is compared to the letter.

Blocks run from top to bottom in one folder with the demo book. Only what depends on the machine or the day is blanked:
milliseconds, paths, today's date. A line of "..." stands for any number of lines.
"""

from __future__ import annotations

import datetime as dt
import re
import shlex
from pathlib import Path

import pytest

from kb.cli.entry import run

README = Path(__file__).parents[2] / "README.md"


def blocks() -> list[tuple[str, str]]:
    """Return (command, expected output) pairs of the console blocks, in order."""
    found = []
    for block in re.findall(r"```console\n(.*?)```", README.read_text(encoding="utf-8"), re.S):
        for part in re.split(r"^\$ ", block, flags=re.M)[1:]:
            command, _, output = part.partition("\n")
            while command.endswith("\\"):
                more, _, output = output.partition("\n")
                command = command[:-1] + more.strip()
            found.append((command, output))
    return found


def blanked(text: str) -> str:
    """Return output without what depends on the machine or the day."""
    text = re.sub(r"\d+ ms\b", "# ms", text.replace(str(dt.date.today()), "TODAY"))
    return "\n".join(line.rstrip() for line in text.strip().splitlines())


def fits(expected: str, got: str) -> bool:
    """Return whether the output is as printed, "..." standing for any lines."""
    pattern = re.escape(blanked(expected)).replace(re.escape("..."), r"(?s:.*)")
    return re.fullmatch(pattern, blanked(got)) is not None


def test_the_tour_prints_what_it_shows(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("COLUMNS", "80")
    pairs = blocks()
    assert len(pairs) >= 5
    for command, expected in pairs:
        words = shlex.split(command)
        assert words[0] == "sidepath", command
        run(words[1:])
        got = capsys.readouterr().out
        assert fits(expected, got), f"{command}\n--- README\n{expected}\n--- now\n{got}"
