"""Which route files were opened lately: a short list in the user's own state folder.

A convenience: a list that cannot be read is an empty one, a list that cannot be written is not kept. Newest first.
"""

from __future__ import annotations

import contextlib
import json
from pathlib import Path

from kb import paths

MOST = 8


def recent_routes() -> tuple[str, ...]:
    """Return the files, those that are gone left out."""
    try:
        listed = json.loads(paths.recent_routes_file().read_text(encoding="utf-8"))
    except (OSError, ValueError, RecursionError):
        return ()
    if not isinstance(listed, list):
        return ()
    return tuple(place for place in listed if isinstance(place, str) and "\0" not in place and Path(place).is_file())


def remember_route(place: str) -> None:
    """Put a file at the head of the list."""
    kept = [place, *(other for other in recent_routes() if other != place)][:MOST]
    with contextlib.suppress(OSError):
        file = paths.recent_routes_file()
        file.parent.mkdir(parents=True, exist_ok=True)
        half = file.with_name(file.name + ".new")
        half.write_text(json.dumps(kept, ensure_ascii=False), encoding="utf-8")
        half.replace(file)
