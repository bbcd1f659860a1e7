"""Quantities as chemists write them: text to degC, h, mmol, equiv, M and back, the text kept beside.

It refuses nonsense with the reason and guesses nothing: "reflux" has no number until a solvent gives one.
Conventions stand in the file of each quantity; all of them are common practice and marked so.
"""

from __future__ import annotations

from kb.quantity.amounts import (
    Amount,
    format_amount,
    format_concentration,
    format_equiv,
    parse_amount,
    parse_amount_mmol,
    parse_concentration,
    parse_equiv,
    parse_loading_mol_pct,
    parse_percent,
)
from kb.quantity.durations import OVERNIGHT_H, WEEKEND_H, Duration, format_duration, parse_duration
from kb.quantity.numbers import format_number, parse_number
from kb.quantity.temperatures import ROOM_TEMPERATURE_C, Temperature, format_temperature, parse_temperature

__all__ = [
    "OVERNIGHT_H",
    "ROOM_TEMPERATURE_C",
    "WEEKEND_H",
    "Amount",
    "Duration",
    "Temperature",
    "format_amount",
    "format_concentration",
    "format_duration",
    "format_equiv",
    "format_number",
    "format_temperature",
    "parse_amount",
    "parse_amount_mmol",
    "parse_concentration",
    "parse_duration",
    "parse_equiv",
    "parse_loading_mol_pct",
    "parse_number",
    "parse_percent",
    "parse_temperature",
]
