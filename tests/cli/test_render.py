"""Looks shared by all commands: width, colour beside words, tables, progress."""

from __future__ import annotations

import io
import sys

import pytest

from kb.cli import render
from kb.cli.session import BarOnStderr, json_line
from kb.errors import Cancelled
from kb.vocabulary import Severity


class Terminal(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self) -> bool:
        return True


def test_severity_is_a_word_first_and_a_colour_second(monkeypatch: pytest.MonkeyPatch) -> None:
    assert render.severity_word(Severity.SERIOUS) == "SERIOUS"
    monkeypatch.setattr(sys, "stdout", Terminal())
    assert "SERIOUS" in render.severity_word(Severity.SERIOUS) and "\x1b[" in render.severity_word(Severity.SERIOUS)
    monkeypatch.setenv("NO_COLOR", "1")
    assert render.severity_word(Severity.SERIOUS) == "SERIOUS"
    assert "\x1b" not in render.heading("Expect")


@pytest.mark.parametrize(
    ("columns", "width"), [("200", 80), ("60", 60), ("5", 40), ("0", 80), ("-3", 80), ("many", 80), ("", 80)]
)
def test_lines_are_as_wide_as_the_terminal_between_40_and_80(
    monkeypatch: pytest.MonkeyPatch, columns: str, width: int
) -> None:
    monkeypatch.setenv("COLUMNS", columns)
    assert render.width() == width
    assert all(len(line) <= width for line in render.wrapped("word " * 60 + "x" * 300, 10, first="  label   "))
    assert all(len(line) <= width for line in render.table([("R-1", "x" * 300)], ("run", "what"), (7, 60)))


def test_wrapped_keeps_lines_and_drops_nothing() -> None:
    lines = render.wrapped("one\ntwo three\n\nfour", 4, first="  -")
    assert lines == ["  -one", "    two three", "    ", "    four"]
    assert "".join("".join(render.wrapped("abc " * 100)).split()) == "abc" * 100


def test_text_beyond_the_limit_is_cut_and_counted() -> None:
    shown = "\n".join(render.wrapped("x" * 50_000))
    assert "50,000 characters in all" in shown and len(shown) < 22_000


@pytest.mark.parametrize(
    ("share", "said"), [(0, "0 %"), (0.001, "<1 %"), (0.004, "<1 %"), (0.006, "1 %"), (0.5, "50 %"), (1, "100 %")]
)
def test_a_trace_is_not_nothing(share: float, said: str) -> None:
    assert render.percent(share).replace("\N{NO-BREAK SPACE}", " ") == said


def test_counted_knows_one_from_many() -> None:
    assert [render.counted(n, "run") for n in (0, 1, 2, 1200)] == ["0 runs", "1 run", "2 runs", "1,200 runs"]


def test_json_is_tame_and_loses_nothing() -> None:
    import json

    value = {"note": "a\x9b\u202e\u2028\U000e0001\ud800é🙂\n"}
    line = json_line(value)
    assert json.loads(line) == value
    assert not {"\x9b", "\u202e", "\u2028"} & set(line) and "é🙂" in line


def test_progress_draws_one_line_on_a_terminal_only(monkeypatch: pytest.MonkeyPatch) -> None:
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    with BarOnStderr("Reading", shown=True) as bar:
        bar._last = -1.0
        bar.advance(5, 10, "\x1b[31mrows")
        bar.advance(10, 10)
    said = terminal.getvalue()
    assert "Reading: 5 of 10" in said and "\x1b[31m" not in said and said.endswith("\n")
    silent = Terminal()
    monkeypatch.setattr(sys, "stderr", silent)
    with BarOnStderr("Reading", shown=False) as bar:
        bar.advance(10, 10)
    assert silent.getvalue() == ""


def test_the_first_ctrl_c_asks_the_second_one_stops() -> None:
    with BarOnStderr("Reading", shown=False) as bar:
        assert not bar.cancelled()
        bar._ask_to_stop(2, None)
        assert bar.cancelled()
        with pytest.raises(KeyboardInterrupt):
            bar._ask_to_stop(2, None)
        with pytest.raises(Cancelled):
            bar.check_stopped()
