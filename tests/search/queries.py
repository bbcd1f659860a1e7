"""Queries for testing screens and for the benchmarks: over five hundred, by kind.

They are written out of what chemists ask at a reacting sp3 carbon and about protecting groups (common practice), and of
every feature of SMARTS that a screen could trip over. They assert nothing: RDKit's own match is the oracle.
"""

from __future__ import annotations

from pathlib import Path

HOME = Path(__file__).resolve().parents[1] / "data" / "search" / "queries.txt"


def _read() -> tuple[tuple[str, str], ...]:
    kind = ""
    found: list[tuple[str, str]] = []
    for line in HOME.read_text(encoding="utf-8").splitlines():
        if line.startswith("## "):
            kind = line[3:]
        elif line:
            found.append((kind, line))
    return tuple(found)


ALL = _read()
"""(kind, SMARTS): centre, protecting, ring, list, negation, recursive, charge, stereo, open."""
