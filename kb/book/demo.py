"""The demo book: built once from the invented tables, kept where asked or in the user's cache."""

from __future__ import annotations

import contextlib
import glob
import importlib.util
import sys
import tomllib
from pathlib import Path
from types import ModuleType
from typing import TYPE_CHECKING

from kb import paths
from kb.errors import Cancelled, RecordNotFound, SchemaBehind, StoreExists, StoreRefused
from kb.logs import tame_rdkit
from kb.progress import Progress
from kb.record.plan import Plan

if TYPE_CHECKING:
    from kb.book.facade import Book

def build_demo(book: str | None, progress: Progress) -> tuple[Path, bool]:
    """Return the demo book's place, building it where none is.

    Args:
        book: where to keep it; None = the user's cache. A book of an earlier program is brought up to date.
        progress: told while it builds.

    Returns:
        The path, and True when it was built now.

    Raises:
        StoreExists: there is a book that is not the demo's; it is left alone.
        StoreRefused: the place is a server's, or cannot be written.
        Cancelled: stopped while building; nothing is left behind.
    """
    if book is not None and "://" in book and not book.startswith("sqlite:///"):
        raise StoreRefused("The demo book is a file.", "Give --book a path.", book)
    target = Path(book.removeprefix("sqlite:///")).expanduser() if book else paths.demo_book()
    from kb.store.copying import put_in_place

    tame_rdkit()
    half_built = target.with_name(target.name + ".building")
    try:
        if target.exists():
            _bring_up_to_date(target, progress)
            return target, False
        if book is None:
            target.parent.mkdir(parents=True, exist_ok=True)
        _build(half_built, progress)
        put_in_place(half_built, target)
    except OSError as error:
        why = error.strerror or str(error)
        raise StoreRefused(f"The demo book cannot be made at {target}: {why}.", "Give --book PATH.", target) from error
    finally:
        _remove(half_built)
    return target, True


def _remove(half_built: Path) -> None:
    """Remove what a build that was stopped left behind, its log included; what cannot be removed stays."""
    with contextlib.suppress(OSError):
        for left_over in half_built.parent.glob(glob.escape(half_built.name) + "*"):
            left_over.unlink(missing_ok=True)


def _build(place: Path, progress: Progress) -> None:
    from kb.book.facade import open_book

    place.unlink(missing_ok=True)
    with open_book(place, create=True) as new:
        if _builder().build(new.store, progress).stopped:
            raise Cancelled("Stopped while the demo book was being built.", "Run the demo again.")


def _bring_up_to_date(place: Path, progress: Progress) -> None:
    """Refuse a book that is somebody's own; migrate and rebuild a demo book that an earlier program made."""
    from kb.book.facade import open_book
    from kb.book.keeping import migrate_book

    try:
        book = open_book(place)
    except SchemaBehind:
        migrate_book(str(place), progress)
        book = open_book(place)
    except StoreRefused:
        book = open_book(place, read_only=True)
    with book:
        if not _is_demo(book):
            raise StoreExists(f"{place} is a record book, but not the demo's.", "Give the demo another --book.", place)
        if not book.is_read_only:
            book.store.rebuild(progress)


def _is_demo(book: Book) -> bool:
    """Return True where the first entry of the first run was made by the builder."""
    first = book.page(limit=1, sort="code", withdrawn=True, descending=False).items
    return bool(first) and book.history(str(first[0].run_id))[0].who == _builder().WHO


def demo_plan() -> Plan:
    """Return the planned step that the demo checks."""
    from kb.book.plan_words import plan_from_words

    text = (paths.shipped("seed_demo") / "planned_step.toml").read_text(encoding="utf-8")
    return plan_from_words(tomllib.loads(text))


def demo_route(book: Book) -> Path:
    """Return the file of the demo's route.

    Raises:
        RecordNotFound: the book is not the demo's; the codes in the file would name other runs.
    """
    if not _is_demo(book):
        raise RecordNotFound(
            "The example rests on runs of the demo book, and another book is open.",
            "Open the demo with Ctrl+O, or a route file of your own.",
        )
    return paths.shipped("seed_demo") / "route.toml"


def _builder() -> ModuleType:
    """Load `seed_demo/build.py`, which is shipped beside the tables and is no package."""
    place = paths.shipped("seed_demo") / "build.py"
    spec = importlib.util.spec_from_file_location("sidepath_seed_demo_build", place)
    if spec is None or spec.loader is None:
        raise FileNotFoundError(place)
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module
    spec.loader.exec_module(module)
    return module
