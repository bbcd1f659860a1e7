"""Where things are: the user's book, cache and settings, and the folders that are shipped with the program.

It works out paths and creates nothing; whoever writes makes the folder. `migrations/` and `seed_demo/` lie
beside `kb/` in a checkout and in an editable install, and inside the package, under `kb/_shipped/`, in an
installed wheel; an editable install has no such copy, so both places are looked at, the package's own first.
"""

from __future__ import annotations

from pathlib import Path

import platformdirs

from kb.errors import SidepathError

APPLICATION = "sidepath"
PACKAGE = Path(__file__).resolve().parent
SHIPPED = ("migrations", "seed_demo")


def shipped(name: str) -> Path:
    """Return a folder that travels with the program.

    Args:
        name: one of SHIPPED.

    Raises:
        SidepathError: the installation lacks it.
    """
    if name not in SHIPPED:
        raise ValueError(f"{name!r} is not among the shipped folders {SHIPPED}")
    for place in (PACKAGE / "_shipped" / name, PACKAGE.parent / name):
        if place.is_dir():
            return place
    raise SidepathError(
        f"The installation lacks its folder {name!r}.",
        "Install the program again.",
        str(PACKAGE.parent / name),
    )


def default_book() -> Path:
    """Return where the user's own book is kept unless they say otherwise."""
    return platformdirs.user_data_path(APPLICATION, appauthor=False) / "book.sidepath"


def demo_book() -> Path:
    """Return where the demo book is kept: in the cache, since it can be built again."""
    return platformdirs.user_cache_path(APPLICATION, appauthor=False) / "demo.sidepath"


def replays_folder() -> Path:
    """Return where the terminal interface keeps replays: in the cache, since they can be run again."""
    return platformdirs.user_cache_path(APPLICATION, appauthor=False) / "replays"


def kept_folder() -> Path:
    """Return where the program keeps what it worked out between two runs (`kb/kept.py`)."""
    return platformdirs.user_cache_path(APPLICATION, appauthor=False) / "kept"


def settings_file() -> Path:
    """Return where the user's settings are."""
    return platformdirs.user_config_path(APPLICATION, appauthor=False) / "settings.toml"


def mappings_folder() -> Path:
    """Return where mappings of headings to fields are saved by name: beside the settings."""
    return settings_file().parent / "mappings"


def log_file() -> Path:
    """Return where the terminal interface writes its log."""
    return platformdirs.user_log_path(APPLICATION, appauthor=False) / "sidepath.log"


def recent_routes_file() -> Path:
    """Return where the route files that were opened lately are listed."""
    return platformdirs.user_state_path(APPLICATION, appauthor=False) / "recent_routes.json"
