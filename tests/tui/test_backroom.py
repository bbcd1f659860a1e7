"""The back room: the same answers as the desk's own, errors as they were raised, jobs stopped, a dead room replaced."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from kb.errors import Cancelled, NameUnknown, QuantityError, QueryError, SidepathError
from kb.record.plan import Plan
from kb.vocabulary import Role
from tests.tui.fake_book import MESYLATE, a_run
from tui import backroom
from tui.backroom import BackRoom, BackRoomFault, NoBackRoom
from tui.desk import Desk, load_chemistry
from tui.drawings import draw_elsewhere, draw_here, scheme_drawing
from tui.far_desk import FarDesk
from tui.jobs import ThreadProgress, working_for
from tui.ports import FindQuery, RunQuery


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory) -> str:
    from kb.book import open_book

    load_chemistry()
    made = tmp_path_factory.mktemp("room") / "group.sidepath"
    with open_book(made, create=True) as book:
        for number in range(1, 8):
            book.add(replace(a_run(number), code=None, note=f"emulsion {number}"), "JM")
    return str(made)


@pytest.fixture(scope="module")
def desk(place: str) -> Iterator[FarDesk]:
    made = FarDesk(place)
    yield made
    made.close()


@pytest.fixture(autouse=True)
def drawings_stay_here() -> Iterator[None]:
    yield
    draw_elsewhere(None)
    scheme_drawing.cache_clear()


def test_the_back_room_answers_as_the_desk_itself(desk: FarDesk, place: str) -> None:
    here = Desk(place, read_only=True)
    plan = Plan(scheme=MESYLATE, conditions=a_run().conditions)
    assert desk.room is not None and desk.room.pid is not None
    assert desk.check(plan) == here.check(plan)
    assert desk.what_if(plan, (20.0, 80.0)) == here.what_if(plan, (20.0, 80.0))
    assert desk.page(RunQuery()) == here.page(RunQuery())
    assert desk.page(RunQuery(words="emulsion")).total == 7
    found, same = desk.find(FindQuery(words="emulsion")), here.find(FindQuery(words="emulsion"))
    assert replace(found, elapsed_ms=0.0) == replace(same, elapsed_ms=0.0)
    assert desk.read_scheme("CCC(C)Br") == here.read_scheme("CCC(C)Br")
    assert desk.scheme_text("1-bromobutane") == here.scheme_text("1-bromobutane")
    assert desk.resolve_component("NaN3=1.5", Role.REAGENT) == here.resolve_component("NaN3=1.5", Role.REAGENT)
    assert desk.resolve_solvent("THF:4") == here.resolve_solvent("THF:4")
    assert desk.lookup("potassium tert", "reagent") == here.lookup("potassium tert", "reagent")
    assert desk.remarks(a_run()) == here.remarks(a_run())
    draw_elsewhere(lambda text: desk.room.ask("reading", "scheme_drawing", text) if desk.room else draw_here(text))
    assert scheme_drawing(MESYLATE) == draw_here(MESYLATE)
    here.close()


def test_what_is_recorded_here_is_seen_there(place: str) -> None:
    desk = FarDesk(place)
    before = desk.page(RunQuery()).total
    run = desk.add(replace(a_run(8), code=None), "JM")
    assert desk.page(RunQuery()).total == before + 1
    desk.withdraw(run.code or "", "only tried", "JM")
    assert desk.page(RunQuery()).total == before
    desk.close()


def test_errors_come_as_they_were_raised(desk: FarDesk) -> None:
    with pytest.raises(QuantityError, match="is not a number"):
        desk.find(FindQuery(similar="CCO", at_least="half"))
    with pytest.raises(QueryError):
        desk.find(FindQuery(substructure="not a pattern"))
    with pytest.raises(NameUnknown) as caught:
        desk.resolve_solvent("dimethylformamidde")
    assert caught.value.hint
    assert desk.room is not None
    with pytest.raises(BackRoomFault, match="is not done here"):
        desk.room.ask("checking", "close")
    with pytest.raises(BackRoomFault, match="TypeError"):
        desk.room.ask("checking", "check", "no plan", 1, 2, 3)
    assert desk.scheme_text("CBr") == "CBr", "the lane lives on"


def test_a_job_that_was_stopped_before_it_began_is_not_begun(desk: FarDesk) -> None:
    progress = ThreadProgress(lambda *_: None)
    progress.cancel()
    with working_for(progress), pytest.raises(Cancelled):
        desk.check(Plan(scheme=MESYLATE))


def test_what_a_stopped_job_found_is_drawn_all_the_same(place: str) -> None:
    desk = FarDesk(place)
    progress = ThreadProgress(lambda *_: None)
    progress.cancel()
    with working_for(progress):
        assert scheme_drawing("CCCCCCBr").left[0].drawing is not None
    desk.close()


class StoppedLater:
    """Progress that is stopped as soon as the question is on its way; notes what it was told."""

    def __init__(self, looks: int) -> None:
        self.looks = looks
        self.told: list[str] = []

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        self.told.append(note)

    def cancelled(self) -> bool:
        self.looks -= 1
        return self.looks < 0


def test_a_job_is_stopped_on_the_way(desk: FarDesk) -> None:
    temperatures = tuple(float(t) for t in range(3000))
    with working_for(StoppedLater(1)), pytest.raises(Cancelled):
        desk.what_if(Plan(scheme=MESYLATE, conditions=a_run().conditions), temperatures)
    assert desk.check(Plan(scheme=MESYLATE)).reading.ok, "the next question is answered"


def test_a_job_that_does_not_listen_is_left_alone(desk: FarDesk, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(backroom, "GRACE_S", -1.0)
    monkeypatch.setattr(backroom, "LOOK_S", 0.0)
    temperatures = tuple(float(t) for t in range(3000))
    with working_for(StoppedLater(1)), pytest.raises(Cancelled):
        desk.what_if(Plan(scheme=MESYLATE, conditions=a_run().conditions), temperatures)
    monkeypatch.undo()
    assert desk.check(Plan(scheme=MESYLATE)).reading.ok


def test_progress_comes_back(place: str) -> None:
    desk = FarDesk(place)
    progress = StoppedLater(10**9)
    with working_for(progress):
        desk.check(Plan(scheme=MESYLATE))
        desk.find(FindQuery(substructure="CO"))
    assert "reading the runs" in progress.told
    assert "structures read" in progress.told
    desk.close()


def test_a_killed_room_is_told_in_a_sentence_and_starts_anew(place: str) -> None:
    desk = FarDesk(place)
    desk.scheme_text("CBr")
    assert desk.room is not None and desk.room.pid is not None
    first = desk.room.pid
    caught: list[BaseException] = []

    def ask() -> None:
        try:
            desk.what_if(Plan(scheme=MESYLATE, conditions=a_run().conditions), tuple(range(0, 150)))
        except SidepathError as error:
            caught.append(error)

    thread = threading.Thread(target=ask)
    thread.start()
    while not desk.room._process._waiting and thread.is_alive():  # type: ignore[union-attr]
        time.sleep(0.001)
    os.kill(first, signal.SIGKILL)
    thread.join()
    assert "stopped from outside" in str(caught[0])
    assert desk.check(Plan(scheme=MESYLATE)).reading.ok
    assert desk.room.pid not in (None, first)
    desk.close()


def test_closing_frees_whoever_waits(place: str) -> None:
    desk = FarDesk(place)
    plan = Plan(scheme=MESYLATE, conditions=a_run().conditions)
    ended = threading.Event()

    def ask() -> None:
        try:
            desk.what_if(plan, tuple(range(0, 150)))
        except SidepathError:
            ended.set()

    threading.Thread(target=ask).start()
    while not desk.room._process._waiting:  # type: ignore[union-attr]
        time.sleep(0.001)
    desk.close()
    assert ended.wait(30)
    with pytest.raises(Cancelled):
        desk.check(plan)


def test_without_a_second_process_the_desk_does_it_all_itself(place: str, monkeypatch: pytest.MonkeyPatch) -> None:
    def refused(*_: Any, **__: Any) -> None:
        raise OSError("no more processes")

    with monkeypatch.context() as patch:
        patch.setattr(subprocess, "Popen", refused)
        desk = FarDesk(place)
    assert desk.room is None
    assert desk.check(Plan(scheme=MESYLATE)).reading.ok
    assert desk.page(RunQuery(limit=1)).runs
    assert scheme_drawing("CCBr").left
    desk.close()


def test_a_room_that_always_dies_is_given_up(place: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(backroom, "START", "raise SystemExit(1)")
    room = BackRoom(place)
    seen = []
    for _ in range(backroom.TRIES):
        with pytest.raises((SidepathError, NoBackRoom)) as caught:
            room.ask("checking", "scheme_text", "CBr")
        seen.append(caught.type)
    with pytest.raises(NoBackRoom):
        room.ask("checking", "scheme_text", "CBr")
    assert seen[0] is SidepathError
    desk = FarDesk(place)
    for _ in range(backroom.TRIES):
        try:
            assert desk.scheme_text("CBr") == "CBr"
        except SidepathError:
            continue
    assert desk.scheme_text("CBr") == "CBr"
    assert desk.room is None
    desk.close()


def test_the_screens_process_loads_no_chemistry(place: str, tmp_path: Path) -> None:
    script = (
        "import sys\n"
        "from tui.opening import DeskOpener\nfrom tui.plan_state import read_plan\n"
        "from tui.drawings import scheme_drawing\n"
        "from tui.ports import FindQuery, RunQuery\n"
        f"desk = DeskOpener().open({place!r})\n"
        "read = read_plan({'scheme': 'CCC(C)Br', 'reagent': 'NaN3=1.5', 'solvent': 'DMF'}, desk)\n"
        "assert not read.errors\n"
        "desk.check(read.plan); desk.page(RunQuery()); desk.find(FindQuery(words='emulsion'))\n"
        "desk.read_scheme('CBr'); scheme_drawing('CBr'); desk.count()\n"
        "print(sorted({'rdkit', 'numpy'} & set(sys.modules)))\ndesk.close()\n"
    )
    ended = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert ended.stdout.strip() == "[]"


def test_the_room_ends_when_the_screens_are_killed(place: str) -> None:
    script = (
        "import time\nfrom tui.far_desk import FarDesk\n"
        f"desk = FarDesk({place!r})\ndesk.scheme_text('CBr')\nprint(desk.room.pid, flush=True)\ntime.sleep(600)\n"
    )
    screens = subprocess.Popen([sys.executable, "-c", script], stdout=subprocess.PIPE, text=True)
    assert screens.stdout is not None
    pid = int(screens.stdout.readline())
    screens.kill()
    screens.wait()
    for _ in range(3000):
        try:
            os.kill(pid, 0)
        except ProcessLookupError:
            break
        if Path(f"/proc/{pid}/stat").exists() and Path(f"/proc/{pid}/stat").read_text().split()[2] == "Z":
            break
        time.sleep(0.01)
    else:
        pytest.fail("the back room outlived the screens")
