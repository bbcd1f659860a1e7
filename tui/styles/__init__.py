"""Stylesheets: `tokens.tcss` for every screen, one more for each place."""

from __future__ import annotations

from pathlib import Path

HERE = Path(__file__).parent
