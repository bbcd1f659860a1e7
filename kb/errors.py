"""The error family: everything Sidepath refuses, and what to do next.

It owns no messages of its own: whoever raises names the value and the place, and gives a hint.

    SidepathError
    ├── ChemistryError (ValueError)
    │   ├── StructureError        text that is no structure we can use
    │   └── QueryError            SMARTS or criteria that cannot be searched
    ├── QuantityError (ValueError)   a temperature, time or amount that cannot be read
    ├── NameUnknown (LookupError)    a material the catalogue does not hold
    ├── RecordError
    │   ├── RecordNotFound (LookupError)
    │   ├── RecordConflict        somebody else changed it first
    │   └── InvalidRecord (ValueError)
    ├── StoreError
    │   ├── StoreMissing          no book there
    │   ├── StoreExists           a book is there already
    │   ├── StoreBusy             another writer held on too long
    │   ├── StoreDamaged          not a book, or a broken one
    │   ├── StoreRefused          no permission, disk full, read-only
    │   ├── SchemaTooNew          the book was made by a later program
    │   ├── SchemaBehind          the book wants `sidepath migrate`
    │   └── IndexStale            derived facts were made by another recipe
    ├── ImportFileError           the file as a whole cannot be read
    ├── SettingsError
    └── Cancelled                 the user stopped a long job

Arguments are positional so that every class survives pickling (process pools).
"""

from __future__ import annotations


class SidepathError(Exception):
    """Base of the family.

    Args:
        message: one plain sentence naming the value and the place.
        hint: one plain sentence saying what to do next; may be empty.
        value: the offending value as given, or None.
    """

    code = "error"

    def __init__(self, message: str, hint: str = "", value: object = None) -> None:
        super().__init__(message, hint, value)
        self.message = message
        self.hint = hint
        self.value = value

    def __str__(self) -> str:
        return f"{self.message} {self.hint}".strip()

    def as_dict(self) -> dict[str, str]:
        """Return the error as the contract's JSON object."""
        return {"code": self.code, "message": self.message, "hint": self.hint}


class ChemistryError(SidepathError, ValueError):
    """The chemistry of an input cannot be used."""

    code = "chemistry"


class StructureError(ChemistryError):
    """Raised when text or a file is no structure that we can use."""

    code = "structure"


class QueryError(ChemistryError):
    """Raised when a SMARTS or a set of criteria cannot be searched."""

    code = "query"


class QuantityError(SidepathError, ValueError):
    """Raised when a temperature, time, amount or ratio cannot be read."""

    code = "quantity"


class NameUnknown(SidepathError, LookupError):
    """Raised when no material of that name is in the catalogue; the hint offers the nearest."""

    code = "name-unknown"


class RecordError(SidepathError):
    """A record cannot be found, changed or stored."""

    code = "record"


class RecordNotFound(RecordError, LookupError):
    """Raised when no run answers to a code or UUID."""

    code = "not-found"


class RecordConflict(RecordError):
    """Raised when a record changed since it was read, or two books disagree."""

    code = "conflict"


class InvalidRecord(RecordError, ValueError):
    """Raised when a record breaks a rule of the record floor."""

    code = "invalid-record"


class StoreError(SidepathError):
    """The book itself is in trouble."""

    code = "store"


class StoreMissing(StoreError):
    """Raised when there is no book at the place named."""

    code = "book-missing"


class StoreExists(StoreError):
    """Raised when a new book would overwrite something."""

    code = "book-exists"


class StoreBusy(StoreError):
    """Raised when another writer held the book longer than the waiting time."""

    code = "book-busy"


class StoreDamaged(StoreError):
    """Raised when the file is no book, or is broken."""

    code = "book-damaged"


class StoreRefused(StoreError):
    """Raised when the system refuses: no permission, disk full, read-only."""

    code = "book-refused"


class SchemaTooNew(StoreError):
    """Raised when a later program made the book."""

    code = "book-too-new"


class SchemaBehind(StoreError):
    """Raised when the book needs `sidepath migrate` first."""

    code = "book-behind"


class IndexStale(StoreError):
    """Raised when derived facts were made by another recipe and must be rebuilt."""

    code = "index-stale"


class ImportFileError(SidepathError):
    """Raised when a file as a whole cannot be read; a bad row is a rejection, not an error."""

    code = "import-file"


class SettingsError(SidepathError):
    """Raised when a setting is unknown or has an impossible value."""

    code = "settings"


class Cancelled(SidepathError):
    """Raised when the user stopped a long job."""

    code = "cancelled"
