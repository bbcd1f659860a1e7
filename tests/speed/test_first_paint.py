"""First paint: the terminal interface beside a bare Textual application that imports RDKit and opens the same file.

Run by name: `pytest -m speed -n0 -s tests/speed/test_first_paint.py`. Both are started in turn in a pseudo-terminal on
the demo book; the clock runs from the start of the process until its first words show. The
peer does what no program with this chemistry could leave out.
"""

from __future__ import annotations

import statistics
import sys
import time
from pathlib import Path

import pytest

from kb.book import build_demo
from kb.progress import Silent
from tests.speed.test_key_latency import Terminal

TURNS = 9

BARE = """
import sys
import rdkit.Chem
from sqlalchemy import create_engine, text
from textual.app import App
from textual.widgets import Static
with create_engine("sqlite:///" + sys.argv[1]).connect() as book:
    tables = book.execute(text("select count(*) from sqlite_master")).scalar()
class Bare(App):
    def compose(self):
        yield Static(f"painted {tables}")
Bare().run()
"""

OURS = """
import sys
from kb.cli.entry import main
sys.argv = ["sidepath", "--book", sys.argv[1], "--as", "JM", "tui"]
main()
"""


def seconds_to(words: str, program: str, book: Path, folder: Path) -> float:
    began = time.monotonic()
    terminal = Terminal(sys.executable, "-c", program, str(book), folder=folder)
    try:
        shown = terminal.wait_for(words, 60)
        assert shown is not None, f"{words} never showed"
        terminal.rest(1.0, 10)
    finally:
        terminal.close()
    return shown - began


@pytest.mark.speed
def test_the_first_paint_beside_a_bare_application(tmp_path: Path) -> None:
    book, _ = build_demo(str(tmp_path / "demo.sidepath"), Silent())
    bare, ours = [], []
    for _ in range(TURNS):
        bare.append(seconds_to("painted", BARE, Path(book), tmp_path))
        ours.append(seconds_to("Planning", OURS, Path(book), tmp_path))
    ratio = statistics.median(ours) / statistics.median(bare)
    print(
        f"\n  first paint: {1000 * statistics.median(ours):.0f} ms; bare application "
        f"{1000 * statistics.median(bare):.0f} ms; {ratio:.2f} times (medians of {TURNS} turns)"
    )
