"""What every test starts from: no settings, book or initials of whoever runs it, and a home of its own."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import HealthCheck, settings

from tests.engines import books, schemas, server

__all__ = ["books", "schemas", "server"]

settings.register_profile(
    "suite",
    deadline=None,
    max_examples=50,
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.function_scoped_fixture],
)
settings.load_profile("suite")


@pytest.fixture(autouse=True)
def own_home(tmp_path_factory: pytest.TempPathFactory, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Give the test an empty home and drop every SIDEPATH_ variable."""
    import os

    home = tmp_path_factory.mktemp("home")
    for name in [name for name in os.environ if name.startswith("SIDEPATH_")]:
        monkeypatch.delenv(name)
    monkeypatch.setenv("HOME", str(home))
    for variable, folder in (
        ("XDG_DATA_HOME", "data"),
        ("XDG_CACHE_HOME", "cache"),
        ("XDG_CONFIG_HOME", "config"),
        ("XDG_STATE_HOME", "state"),
    ):
        monkeypatch.setenv(variable, str(home / folder))
    return home
