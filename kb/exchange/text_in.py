"""Bytes of a text file to lines, whatever wrote them: encoding found, lines bounded, memory constant.

It owns encodings and line lengths only. A byte-order mark is obeyed; without one a file is UTF-8 if all of it is, else
UTF-16 if it looks it, else Windows-1252 (what spreadsheets on European Windows write), and which of them is said. It
refuses binary files. A line longer than LONGEST_LINE is skipped to its end and raised as `LineTooLong`, after which
reading goes on: one bad line must not cost the rest, nor the memory of the machine.
"""

from __future__ import annotations

import codecs
import io
from collections.abc import Iterator
from pathlib import Path
from types import TracebackType
from typing import BinaryIO, Self, TextIO

from kb.errors import ImportFileError, SidepathError

LONGEST_LINE = 2_000_000
"""Longest line that is read [characters]; a run with 400 products fits a hundred times over."""

_BLOCK = 1 << 20
_MARKS = (
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF32_LE, "utf-32"),
    (codecs.BOM_UTF32_BE, "utf-32"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)


class LineTooLong(SidepathError):
    """Raised for one line that is longer than LONGEST_LINE; reading goes on behind it."""

    code = "line-too-long"


class TextLines:
    """The lines of one file, with their endings, and where reading stands.

    Attributes:
        encoding: what the file was found to be.
        line: number of the line last given, from 1.
        size_bytes: size of the file.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        self.line = 0
        try:
            self.size_bytes = path.stat().st_size
            self.encoding = find_encoding(path)
            self._raw: BinaryIO = path.open("rb")
        except OSError as error:
            raise unreadable(path, error) from error
        self._text: TextIO = io.TextIOWrapper(self._raw, encoding=self.encoding, errors="replace", newline="")

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._text.close()

    def __iter__(self) -> Iterator[str]:
        return self

    def __next__(self) -> str:
        text = self._text.readline(LONGEST_LINE)
        if not text:
            raise StopIteration
        self.line += 1
        if len(text) == LONGEST_LINE and text[-1] not in "\r\n":
            while rest := self._text.readline(_BLOCK):
                if rest[-1] in "\r\n":
                    break
            raise LineTooLong(
                f"Line {self.line} of {self.path.name} is longer than {LONGEST_LINE:,} characters.",
                "Is it a text file with one run a line? A quotation mark may be missing.",
                self.line,
            )
        return text

    @property
    def done_bytes(self) -> int:
        """Return how far into the file reading is (a block ahead at most)."""
        return min(self._raw.tell(), self.size_bytes)


def find_encoding(path: Path) -> str:
    """Return the name of the codec that reads the whole file; the file is read once, a block at a time.

    Raises:
        ImportFileError: the file is binary, or none of the codecs reads it.
    """
    with path.open("rb") as file:
        start = file.read(4096)
        if not start:
            raise ImportFileError(f"{path.name} is empty.", "Give a file with a heading row and runs.", path.name)
        for mark, name in _MARKS:
            if start.startswith(mark):
                return name
        if start.startswith((b"PK\x03\x04", b"\xd0\xcf\x11\xe0", b"%PDF", b"\x1f\x8b", b"SQLite format 3")):
            raise ImportFileError(
                f"{path.name} is no text file.",
                "Say what it is with its ending: .xlsx for a workbook; an old .xls must be saved as .xlsx first.",
                path.name,
            )
        zeros = start.count(0)
        if zeros > len(start) // 4:
            return "utf-16-le" if start[1::2].count(0) > start[0::2].count(0) else "utf-16-be"
        decoder = codecs.getincrementaldecoder("utf-8")()
        try:
            block = start
            while block:
                decoder.decode(block)
                block = file.read(_BLOCK)
            decoder.decode(b"", final=True)
        except UnicodeDecodeError:
            return "cp1252"
    return "utf-8"


def unreadable(path: Path, error: OSError) -> ImportFileError:
    """Return the refusal for a file that the system does not hand out."""
    if isinstance(error, FileNotFoundError):
        return ImportFileError(f"There is no file {path}.", "Check the name and the folder.", str(path))
    if isinstance(error, IsADirectoryError):
        return ImportFileError(f"{path} is a folder.", "Name a file in it.", str(path))
    if isinstance(error, PermissionError):
        return ImportFileError(f"{path} may not be read by you.", "Ask its owner, or copy it.", str(path))
    return ImportFileError(
        f"{path} cannot be read: {error.strerror}.", "Copy it to a local disk and try again.", str(path)
    )
