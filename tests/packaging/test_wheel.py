"""The same program from a checkout, an editable install and a wheel: what travels with it is found and works.

The wheel is built in this process with the build backend itself, unpacked, and asked in a process that sees nothing of
the checkout. `.ci/run` installs it for real.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]


@pytest.fixture(scope="module")
def unpacked(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a folder with the wheel's content."""
    hatchling = pytest.importorskip("hatchling.builders.wheel")
    folder = tmp_path_factory.mktemp("wheel")
    (wheel,) = hatchling.WheelBuilder(str(ROOT)).build(directory=str(folder), versions=["standard"])
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(folder / "site")
    return folder / "site"


def _asked(site: Path, code: str, cwd: Path) -> str:
    environment = {k: v for k, v in os.environ.items() if k != "PYTHONPATH"} | {"PYTHONPATH": str(site)}
    answer = subprocess.run(
        [sys.executable, "-c", code], env=environment, cwd=cwd, capture_output=True, text=True, timeout=120, check=False
    )
    assert answer.returncode == 0, answer.stderr
    return answer.stdout


def test_a_wheel_finds_what_travels_with_it(unpacked: Path, tmp_path: Path) -> None:
    code = (
        "import kb, json; from kb import paths;"
        "print(json.dumps([kb.__file__, *(str(paths.shipped(n)) for n in paths.SHIPPED)]))"
    )
    places = [Path(p) for p in json.loads(_asked(unpacked, code, tmp_path))]
    assert places == [unpacked / "kb" / "__init__.py", *(unpacked / "kb" / "_shipped" / n for n in _shipped())]


def test_a_wheel_builds_the_demo_and_checks_its_step(unpacked: Path, tmp_path: Path) -> None:
    book = tmp_path / "demo.sidepath"
    code = f"import sys; from kb.cli.entry import run; sys.exit(run(['--book', {str(book)!r}, '--json', 'demo']))"
    said = json.loads(_asked(unpacked, code, tmp_path))
    assert said["findings"][0]["severity"] == "serious"
    assert book.is_file()
    verified = _asked(unpacked, code.replace("'demo'", "'runs', '--limit', '1'"), tmp_path)
    assert json.loads(verified)["total"] >= 200


def test_a_wheel_holds_every_file_of_the_tree(unpacked: Path) -> None:
    for package in ("kb", "tui"):
        missing = {p for p in _files(package) if not (unpacked / p).is_file()}
        assert not missing, sorted(missing)[:5]
    for name in _shipped():
        missing = {p for p in _files(name) if not (unpacked / "kb" / "_shipped" / p).is_file()}
        assert not missing, sorted(missing)[:5]


def test_a_checkout_finds_what_lies_beside_it(tmp_path: Path) -> None:
    code = "import json; from kb import paths; print(json.dumps([str(paths.shipped(n)) for n in paths.SHIPPED]))"
    assert [Path(p) for p in json.loads(_asked(ROOT, code, tmp_path))] == [ROOT / n for n in _shipped()]


def test_an_editable_install_is_the_checkout(unpacked: Path, tmp_path: Path) -> None:
    site = tmp_path / "site"
    site.mkdir()
    (site / "_sidepath.pth").write_text(f"{ROOT}\n")  # what an editable install of this backend leaves behind
    code = (
        f"import site; site.addsitedir({str(site)!r});"
        "import json; from kb import paths; print(json.dumps([str(paths.shipped(n)) for n in paths.SHIPPED]))"
    )
    assert [Path(p) for p in json.loads(_asked(tmp_path, code, tmp_path))] == [ROOT / n for n in _shipped()]


def test_the_version_and_the_door_of_the_wheel(unpacked: Path) -> None:
    (info,) = unpacked.glob("sidepath-*.dist-info")
    assert "sidepath = kb.cli.entry:main" in (info / "entry_points.txt").read_text()
    assert (info / "licenses" / "LICENSE").is_file()


def _files(folder: str) -> set[Path]:
    """Return the files of a folder of the checkout, as git would keep them."""
    kept = (p for p in (ROOT / folder).rglob("*") if p.is_file() and p.suffix != ".pyc")
    return {p.relative_to(ROOT) for p in kept}


def _shipped() -> tuple[str, ...]:
    from kb.paths import SHIPPED

    return SHIPPED
