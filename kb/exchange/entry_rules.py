"""What a whole run must keep to when somebody hands it in, typed or in a file: one set of rules for every way in.

The record itself (`kb.record`) takes any text for a scheme; here it must be a structure, the day one on which somebody
could have worked, the temperature possible, failure modes spelt as on the list and motifs searchable. It refuses and
never mends. Copies of a whole book (merge, backup, restore) are safekeeping, not entry, and pass by.
"""

from __future__ import annotations

import datetime as dt

from kb.errors import InvalidRecord, QueryError
from kb.exchange.lookups import check_scheme, checked_motif
from kb.record.failure_modes import parse_failure_mode
from kb.record.run import Run

EARLIEST_RUN = dt.date(1900, 1, 1)
"""Runs dated before this are taken for slips of the keyboard."""

_ABSOLUTE_ZERO_C = -273.15


def check_entry(run: Run, today: dt.date | None = None) -> Run:
    """Return a run that may be entered.

    Args:
        run: as it was read.
        today: None = the local day.

    Raises:
        StructureError: the scheme cannot be read. InvalidRecord: another rule is broken; the sentence says which.
    """
    check_scheme(run.scheme)
    if run.date is not None:
        check_run_date(run.date, today)
    temperature = run.conditions.temperature
    if temperature is not None:
        for value in (temperature.start_c, temperature.end_c, *temperature.between_c):
            if value is not None and value < _ABSOLUTE_ZERO_C:
                raise InvalidRecord(
                    f"The temperature {value:g} °C is below absolute zero.", "Check the sign and the unit.", value
                )
    for failure in run.outcome.failures:
        if parse_failure_mode(failure.mode) != failure.mode:
            raise InvalidRecord(
                f"Failure mode {failure.mode!r} is not spelt as on the list.",
                f"Write {parse_failure_mode(failure.mode)}.",
                failure.mode,
            )
        if failure.motif is not None:
            check_motif(failure.motif)
    return run


def check_motif(motif: str) -> str:
    """Return a motif that is SMARTS and can be searched for.

    Raises:
        InvalidRecord: it is none.
    """
    try:
        return checked_motif(motif)
    except QueryError as error:
        raise InvalidRecord(f"The motif cannot be used. {error.message}", error.hint, motif) from error


def check_run_date(day: dt.date, today: dt.date | None = None) -> dt.date:
    """Return the day, refused before 1900 and after tomorrow (it may be tomorrow already where the run was made)."""
    today = today or dt.date.today()
    if not EARLIEST_RUN <= day <= today + dt.timedelta(days=1):
        when = "in the future" if day > today else "before 1900"
        raise InvalidRecord(f"{day.isoformat()} lies {when}.", "Check the year.", day)
    return day
