"""The demo book: built once from the invented tables, kept where asked or in the user's cache."""

from __future__ import annotations

import importlib.util
import sys
import tomllib
from pathlib import Path
from types import ModuleType

from kb import paths
from kb.logs import tame_rdkit
from kb.progress import Progress
from kb.record.plan import Plan


def build_demo(book: str | None, progress: Progress) -> tuple[Path, bool]:
    """Return the demo book's place, building it where none is.

    Args:
        book: where to keep it; None = the user's cache.
        progress: told while it builds.

    Returns:
        The path, and True when it was built now.
    """
    from kb.book.facade import open_book

    target = Path(book).expanduser() if book else paths.demo_book()
    if target.exists():
        return target, False
    target.parent.mkdir(parents=True, exist_ok=True)
    tame_rdkit()
    half_built = target.with_name(target.name + ".building")
    half_built.unlink(missing_ok=True)
    try:
        with open_book(half_built, create=True) as new:
            _builder().build(new.store, progress)
        half_built.rename(target)
    finally:
        for left_over in target.parent.glob(half_built.name + "*"):
            left_over.unlink(missing_ok=True)
    return target, True


def demo_plan() -> Plan:
    """Return the planned step that the demo checks."""
    from kb.book.plan_words import plan_from_words

    text = (paths.shipped("seed_demo") / "planned_step.toml").read_text(encoding="utf-8")
    return plan_from_words(tomllib.loads(text))


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
