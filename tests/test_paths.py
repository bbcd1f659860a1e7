"""The shipped folders are found beside the package and inside it; the user's places follow the platform's rules."""

from __future__ import annotations

from pathlib import Path

import pytest

from kb import paths
from kb.errors import SidepathError


def test_the_shipped_folders_are_found_in_this_tree() -> None:
    assert (paths.shipped("migrations") / "env.py").is_file()
    assert paths.shipped("seed_demo").is_dir()


def test_an_installed_wheel_s_own_copy_comes_first(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    package = tmp_path / "site-packages" / "kb"
    (package / "_shipped" / "migrations").mkdir(parents=True)
    (tmp_path / "site-packages" / "migrations").mkdir()
    monkeypatch.setattr(paths, "PACKAGE", package)
    assert paths.shipped("migrations") == package / "_shipped" / "migrations"


def test_a_checkout_or_editable_install_has_them_beside_the_package(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "migrations").mkdir()
    monkeypatch.setattr(paths, "PACKAGE", tmp_path / "kb")
    assert paths.shipped("migrations") == tmp_path / "migrations"
    with pytest.raises(SidepathError, match="seed_demo"):
        paths.shipped("seed_demo")


def test_only_what_is_shipped_can_be_asked_for() -> None:
    with pytest.raises(ValueError, match="tests"):
        paths.shipped("tests")


def test_the_user_s_places_are_in_their_home_and_nothing_is_made(own_home: Path) -> None:
    places = [paths.default_book(), paths.demo_book(), paths.settings_file(), paths.log_file()]
    assert all(own_home in place.parents for place in places)
    assert len(set(places)) == 4
    assert not any(place.parent.exists() for place in places)
