"""Which error ends the program with which status: the only place that knows.

0 done · 1 refused · 2 usage · 3 `check --fail-on` reached · 4 book trouble · 130 interrupted
"""

from __future__ import annotations

from kb.errors import Cancelled, SettingsError, SidepathError, StoreError

DONE = 0
REFUSED = 1
USAGE = 2
FAIL_ON = 3
BOOK_TROUBLE = 4
INTERRUPTED = 130


def exit_code_of(error: SidepathError) -> int:
    """Return the exit status for an error of the family."""
    if isinstance(error, StoreError):
        return BOOK_TROUBLE
    if isinstance(error, Cancelled):
        return INTERRUPTED
    return USAGE if isinstance(error, SettingsError) else REFUSED
