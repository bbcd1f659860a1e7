"""Route files opened lately: newest first, a few, and never a reason to fail."""

from __future__ import annotations

from pathlib import Path

import pytest

from kb import paths
from kb.book import recent


@pytest.fixture
def listed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Keep the list in a folder of the test."""
    place = tmp_path / "state" / "recent_routes.json"
    monkeypatch.setattr(paths, "recent_routes_file", lambda: place)
    return place


def test_the_newest_come_first_each_once_and_those_that_are_gone_not_at_all(tmp_path: Path, listed: Path) -> None:
    places = [tmp_path / f"{n}.toml" for n in range(recent.MOST + 3)]
    for place in places:
        place.touch()
        recent.remember_route(str(place))
    assert recent.recent_routes() == tuple(str(p) for p in places[::-1][: recent.MOST])
    recent.remember_route(str(places[-3]))
    assert recent.recent_routes()[0] == str(places[-3])
    places[-3].unlink()
    assert str(places[-3]) not in recent.recent_routes()


@pytest.mark.parametrize("content", [b"", b"{", b"\xff", b'{"a": 1}', b'[1, null, "a\\u0000b"]', b"[" * 9999])
def test_a_list_that_cannot_be_read_is_empty(listed: Path, content: bytes) -> None:
    listed.parent.mkdir()
    listed.write_bytes(content)
    assert recent.recent_routes() == ()


def test_a_list_that_cannot_be_written_is_not_kept(tmp_path: Path, listed: Path) -> None:
    listed.parent.write_text("a file where the folder should be")
    (tmp_path / "a.toml").touch()
    recent.remember_route(str(tmp_path / "a.toml"))
    assert recent.recent_routes() == ()
