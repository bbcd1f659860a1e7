"""What every test starts from: no settings, book or initials of whoever runs it, and a home of its own."""

from __future__ import annotations

import gc
import os
from pathlib import Path

import pytest
from hypothesis import HealthCheck, settings

from tests.engines import books, schemas, server

__all__ = ["books", "schemas", "server"]

settings.register_profile(
    "suite",
    deadline=None,
    max_examples=50,
    derandomize=True,  # the same examples everywhere; new ones are looked for by name (-m soak)
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.function_scoped_fixture],
)
settings.load_profile("suite")

# A terminal test makes and drops whole screens; looking through all that RDKit and Textual have loaded each time took
# a third of the suite's time.
gc.set_threshold(100_000, 20, 50)


def pytest_xdist_auto_num_workers() -> int:
    """Return one worker more than there are cores: terminal tests wait for the screen a third of their time."""
    return (os.cpu_count() or 1) + 1


@pytest.fixture(autouse=True)
def own_home(tmp_path_factory: pytest.TempPathFactory, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Give the test an empty home and drop every SIDEPATH_ variable."""
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
