"""What is slow to work out and quick to read back, kept in the cache folder between two runs of the program.

A command that ends after one answer would else parse the same tables and turn the same book into the same columns every
time. Nothing here is ever needed: where the folder cannot be used, or what lies there is of another key, damaged, or
somebody else's, the answer is "not kept" and the caller works it out.

The key says what a value was made from. It is completed here with `made_by`: the program's files as they stand, Python
and RDKit, so that a value that another version made is never taken for ours. Values are pickles, which can do anything
when they are read; therefore they are read only from a file that belongs to this user and that nobody else may write.
"""

from __future__ import annotations

import contextlib
import dataclasses
import os
import pickle
import stat
import sys
import zlib
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any, TypeVar, cast

from kb import paths

T = TypeVar("T")

_MAGIC = b"sidepath kept 1\n"
_HEAD = len(_MAGIC) + 8
"""Bytes before the key: the magic line, the length of the key and the CRC-32 of all behind it."""
LARGEST_BYTES = 400 * 2**20
"""A value that takes more room than this is not kept."""


_allowed = False


def allow() -> None:
    """Let values be kept and recalled in this process from here on; the program's door does, a library need not."""
    global _allowed
    _allowed = True


def once(name: str, make: Callable[[], T]) -> T:
    """Return a value that follows from the program's own files alone: the kept one, else made and kept."""
    value = recall(name, "")
    if value is None:
        value = make()
        keep(name, "", value)
    return cast("T", value)


def recall(name: str, key: str) -> Any | None:
    """Return a kept value, or None where there is none of that key.

    Args:
        name: of the value, fit to be a file name.
        key: what it must have been made from.
    """
    if not _allowed:
        return None
    try:
        with _place(name).open("rb") as file:
            if not _is_ours(os.fstat(file.fileno())):
                return None
            packed = file.read()
    except OSError:
        return None
    whole_key = f"{key} {made_by()}".encode()
    end = _HEAD + len(whole_key)
    if packed[: len(_MAGIC)] != _MAGIC or packed[_HEAD:end] != whole_key:
        return None
    length, check = (int.from_bytes(packed[at : at + 4], "little") for at in (len(_MAGIC), len(_MAGIC) + 4))
    if length != len(whole_key) or check != zlib.crc32(memoryview(packed)[_HEAD:]):
        return None
    try:
        return pickle.loads(memoryview(packed)[end:])
    except Exception:  # noqa: BLE001 - a pickle may fail in any way; what cannot be read was not kept
        return None


def keep(name: str, key: str, value: Any) -> bool:
    """Keep a value in place of what had its name before; return whether that was possible."""
    if not _allowed:
        return False
    body = f"{key} {made_by()}".encode()
    length = len(body).to_bytes(4, "little")
    body += pickle.dumps(value, protocol=pickle.HIGHEST_PROTOCOL)
    if len(body) > LARGEST_BYTES:
        return False
    place = _place(name)
    draft = place.with_name(f".{place.name}.{os.getpid()}.new")
    try:
        place.parent.mkdir(parents=True, exist_ok=True, mode=0o700)
        handle = os.open(draft, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o600)
        with os.fdopen(handle, "wb") as file:
            file.write(_MAGIC + length + zlib.crc32(body).to_bytes(4, "little"))
            file.write(body)
        draft.replace(place)
    except OSError:
        with contextlib.suppress(OSError):
            draft.unlink(missing_ok=True)
        return False
    return True


def slim(cls: type[T]) -> type[T]:
    """Let the values of a frozen, slotted dataclass be pickled as plain tuples, which is read back five times as fast.

    They are taken up as they were given away, unchecked: a kept value was checked when it was made.
    """
    names = tuple(field.name for field in dataclasses.fields(cls))  # type: ignore[arg-type]
    setters = tuple(getattr(cls, name).__set__ for name in names)
    _SETTERS[cls] = setters

    def reduce(self: T) -> tuple[Any, ...]:
        return _taken_up, (cls, tuple(getattr(self, name) for name in names))

    cls.__reduce__ = reduce  # type: ignore[assignment]
    return cls


_SETTERS: dict[type, tuple[Any, ...]] = {}


def _taken_up(cls: type[T], values: tuple[Any, ...]) -> T:
    made = object.__new__(cls)
    for setter, value in zip(_SETTERS[cls], values, strict=True):
        setter(made, value)
    return made


@cache
def made_by() -> str:
    """Return what makes values: every file of the package with its size and age, Python, and the RDKit installed."""
    mark = zlib.crc32(b"".join(_standing(str(paths.PACKAGE))))
    return f"{mark:08x} python/{sys.version_info.major}.{sys.version_info.minor} {_rdkit_age()}"


def _standing(folder: str) -> list[bytes]:
    """Return a line for each file of a folder and the folders below it, in order of name."""
    lines: list[bytes] = []
    with os.scandir(folder) as entries:
        for entry in sorted(entries, key=lambda e: e.name):
            if entry.is_dir():
                if entry.name != "__pycache__":
                    lines += _standing(entry.path)
            else:
                told = entry.stat()
                lines.append(f"{entry.path} {told.st_size} {told.st_mtime_ns}\n".encode())
    return lines


def _rdkit_age() -> str:
    """Return where RDKit is and since when, without loading it."""
    for folder in sys.path:
        with contextlib.suppress(OSError):
            told = os.stat(os.path.join(folder, "rdkit", "__init__.py"))  # noqa: PTH116, PTH118 - quicker than Path
            return f"rdkit/{told.st_mtime_ns}"
    return "rdkit/?"


def _place(name: str) -> Path:
    return paths.kept_folder() / f"{name}.kept"


def _is_ours(told: os.stat_result) -> bool:
    """Return whether a file belongs to this user and nobody else may write it; Windows keeps such folders private."""
    if not hasattr(os, "getuid"):
        return True
    return told.st_uid == os.getuid() and not told.st_mode & (stat.S_IWGRP | stat.S_IWOTH)
