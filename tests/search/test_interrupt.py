"""Ctrl-C during a search: RDKit takes the signal for itself, so the program must get it back and lose no hit."""

from __future__ import annotations

import logging
import signal
import threading
from collections.abc import Iterator
from types import FrameType
from typing import Any

import numpy as np
import pytest
from rdkit import Chem

from kb.chem.query import parse_query
from kb.chem.uninterrupted import uninterrupted
from kb.search.matching import Deadline, MoleculeStore

SMILES = ["CCBr", "CCO", "CBr", "c1ccccc1", "BrCCBr"]


class Interrupted:
    """A library whose first search ends like RDKit's does at Ctrl-C: a warning, and some hits missing."""

    def __init__(self, library: Any) -> None:
        self._library = library
        self.calls = 0

    def __getattr__(self, name: str) -> Any:
        return getattr(self._library, name)

    def GetMatches(self, *arguments: Any) -> Any:
        self.calls += 1
        if self.calls == 1:
            logging.getLogger("rdkit").warning("Substructure search was interrupted")
            return [0]
        return self._library.GetMatches(*arguments)


class Stopped:
    """Progress that Ctrl-C cancels."""

    def __init__(self) -> None:
        self.stopped = False

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        """Say nothing."""

    def cancelled(self) -> bool:
        return self.stopped


@pytest.fixture
def store() -> MoleculeStore:
    made = MoleculeStore(threads=1)
    made.append([Chem.MolFromSmiles(smiles).ToBinary() for smiles in SMILES])
    return made


@pytest.fixture
def heard() -> Iterator[list[int]]:
    """The signals that Python's handler got."""
    signals: list[int] = []

    def note(number: int, frame: FrameType | None) -> None:
        signals.append(number)

    before = signal.signal(signal.SIGINT, note)
    yield signals
    signal.signal(signal.SIGINT, before)


def test_an_interrupted_search_is_made_again_and_the_signal_handed_on(store: MoleculeStore, heard: list[int]) -> None:
    library = Interrupted(store._library)
    store._library = library  # type: ignore[assignment]
    found = store.match(parse_query("CBr"), np.arange(5))
    assert found.complete
    assert found.rows.tolist() == [0, 2, 4]
    assert library.calls == 2
    assert heard == [signal.SIGINT]


def test_who_listens_for_ctrl_c_gets_what_was_found_and_hears_that_it_is_not_all(store: MoleculeStore) -> None:
    store._library = Interrupted(store._library)  # type: ignore[assignment]
    progress = Stopped()
    before = signal.signal(signal.SIGINT, lambda number, frame: setattr(progress, "stopped", True))
    try:
        found = store.match(parse_query("CBr"), np.arange(5), deadline=Deadline(None, progress))
    finally:
        signal.signal(signal.SIGINT, before)
    assert not found.complete
    assert found.rows.tolist() == []


def test_without_a_listener_ctrl_c_ends_the_search(store: MoleculeStore) -> None:
    store._library = Interrupted(store._library)  # type: ignore[assignment]
    before = signal.signal(signal.SIGINT, signal.default_int_handler)
    try:
        with pytest.raises(KeyboardInterrupt):
            store.match(parse_query("CBr"), np.arange(5))
    finally:
        signal.signal(signal.SIGINT, before)


def test_a_signal_is_held_back_and_comes_after(heard: list[int]) -> None:
    with uninterrupted():
        signal.pthread_kill(threading.get_ident(), signal.SIGINT)
        assert heard == []
    assert heard == [signal.SIGINT]


def test_other_warnings_are_not_taken_for_an_interruption(heard: list[int]) -> None:
    with uninterrupted() as call:
        logging.getLogger("rdkit").warning("not removing hydrogen atom without neighbors")
    assert not call.was_interrupted
    assert heard == []



def test_ctrl_c_is_heard_after_searches_on_several_threads(heard: list[int]) -> None:
    store = MoleculeStore(threads=2)
    store.append([Chem.MolFromSmiles("CCBr").ToBinary()] * 400)
    assert len(store.match(parse_query("CBr"), np.arange(400)).rows) == 400
    signal.raise_signal(signal.SIGINT)
    assert heard == [signal.SIGINT]


def test_blocks_in_several_threads_leave_the_handler_that_was_there(heard: list[int]) -> None:
    inside, go_on = threading.Event(), threading.Event()

    def other() -> None:
        with uninterrupted():
            inside.set()
            go_on.wait()

    thread = threading.Thread(target=other)
    with uninterrupted():
        thread.start()
        inside.wait()
    go_on.set()
    thread.join()
    signal.raise_signal(signal.SIGINT)
    assert heard == [signal.SIGINT]
