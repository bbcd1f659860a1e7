"""The record as a whole, asked through an open book: recurring failures, replay, coverage, and a route's estimates.

It owns the wiring of `kb.audit` and `kb.route` to a book: where runs and rules come from, how a replay is spread over
processes and kept in a file. It judges nothing. Everything here only reads, but `adopt_proposal`, which writes one
house rule.
"""

from __future__ import annotations

import datetime as dt
import json
import os
from collections.abc import Generator, Sequence
from contextlib import closing
from dataclasses import replace
from hashlib import sha256
from pathlib import Path
from typing import TYPE_CHECKING

from kb.errors import InvalidRecord
from kb.logs import tame_rdkit
from kb.progress import Progress, Silent
from kb.record.plan import Plan

if TYPE_CHECKING:
    from kb.audit.calibration import Calibration
    from kb.audit.coverage import Coverage
    from kb.audit.hindsight import DatedRecord
    from kb.audit.recurrence_values import Circumstance, Proposal, Recurrence
    from kb.audit.replay import Hindsight, Replayer
    from kb.audit.replay_report import ReplayReport
    from kb.audit.tally import Tally
    from kb.book.asked import AskedBook
    from kb.store.values import HouseRule

_PART = 100
"""Runs handed to a process at a time."""
_WORTH_PROCESSES = 300
"""Runs from which a replay is spread over all cores; starting a process costs as much as checking some 60 runs."""


def find_recurring_failures(
    book: AskedBook, since: dt.date | None = None, progress: Progress | None = None
) -> Recurrence:
    """Find what keeps going wrong; see `kb.audit.recurrence`.

    Args:
        since: count failures from this day on.

    Raises:
        Cancelled: the user stopped it.
    """
    tame_rdkit()
    from kb.audit.recurrence import find_recurring

    prepare = book.finder().prepare_motifs
    return find_recurring(book.view(), _circumstances(book), book.rules(), since, progress, prepare)


def adopt_proposal(book: AskedBook, proposal: Proposal, *, who: str) -> HouseRule:
    """Adopt a proposed house rule and return it with its id; it is signed by whoever adopts it."""
    return book.add_rule(replace(proposal.rule, author=who))


def measure_book_coverage(
    book: AskedBook, planned: Sequence[Plan] = (), experiments: int = 3, progress: Progress | None = None
) -> Coverage:
    """Measure what the record covers, and which experiments would teach most; see `kb.audit.coverage`."""
    tame_rdkit()
    from kb.audit.coverage import measure_coverage

    return measure_coverage(book.view(), planned, experiments, progress)


def replay_book(
    book: AskedBook,
    since: dt.date | None = None,
    progress: Progress | None = None,
    processes: int = 1,
    keep: Path | None = None,
) -> ReplayReport:
    """Check each run against what stood in the book that morning; see `kb.audit.replay`.

    Args:
        since: replay only runs from this day on; earlier ones still serve as the record.
        processes: how many work side by side; each reads the book for itself.
        keep: file to keep results in as they come; a stopped replay is taken up from it.

    Returns:
        The report; `stopped` where progress asked to stop.

    Raises:
        InvalidRecord: the file was kept for another state of the book.
    """
    tame_rdkit()
    from kb.audit.replay import Replayer, places_left
    from kb.audit.replay_report import report_replay

    progress = progress or Silent()
    dated = _dated(book)
    kept = _kept(keep, _state_of(dated, book)) if keep is not None else []
    first = since.toordinal() if since else 0
    wanted = [p for p in range(len(dated)) if dated.dates[p] >= first]
    names = {dated.table.codes[p] for p in wanted}
    found = [one for one in kept if one.run in names]
    chosen = set(wanted)
    left = [p for p in places_left(dated, kept) if p in chosen]
    where = book.store.book.address.for_opening
    parts = _replay_parts(where, left, processes) if processes > 1 else _one_by_one(Replayer(dated), left)
    with closing(parts):
        progress.advance(len(found), len(wanted), "runs checked")
        for part in parts:
            found += part
            if keep is not None:
                _append(keep, part)
            progress.advance(len(found), len(wanted), "runs checked")
            if progress.cancelled():
                break
    return report_replay(found, dated.undated, stopped=len(found) < len(wanted))


def processes_for(book: AskedBook) -> int:
    """Return how many processes a replay of a book is worth: one for each core, one alone for few runs.

    Only a program whose main module may be imported again should ask for several.
    """
    return (os.cpu_count() or 1) if book.count() >= _WORTH_PROCESSES else 1


def tally_book(book: AskedBook, progress: Progress | None = None) -> Tally:
    """Count the failures of a book by quarter, mode and class, with the codes behind every count."""
    tame_rdkit()
    from kb.audit.tally import tally_failures

    tally = tally_failures(book.view())
    if progress is not None:
        progress.advance(1, 1, "failures counted")
    return tally


def calibrate_book(book: AskedBook, with_substrate: bool = False, progress: Progress | None = None) -> Calibration:
    """Measure how well the estimates of a book hold, each run expected from the others; see `kb.audit.calibration`.

    Args:
        with_substrate: leave out every run of the substrate with the run.
    """
    tame_rdkit()
    import numpy as np

    from kb.audit.calibration import calibrate
    from kb.audit.likeness import SubstrateLikeness

    view = book.view()
    likeness = SubstrateLikeness(view, np.arange(len(view.table)))
    return calibrate(
        view, lambda substrate, codes: likeness.to_first(substrate, len(codes)), progress, with_substrate=with_substrate
    )


def _dated(book: AskedBook) -> DatedRecord:
    from kb.audit.hindsight import DatedRecord

    return DatedRecord(book.view(), book.rules())


def _one_by_one(replayer: Replayer, places: list[int]) -> Generator[list[Hindsight], None, None]:
    replayer.read_ahead(places)
    for place in places:
        yield [replayer.check(place)]


def _replay_parts(address: str, places: list[int], processes: int) -> Generator[list[Hindsight], None, None]:
    """Yield results as processes finish their parts; leaving early drops what has not begun."""
    from concurrent.futures import ProcessPoolExecutor, as_completed
    from multiprocessing import get_context

    parts = [places[start : start + _PART] for start in range(0, len(places), _PART)]
    pool = ProcessPoolExecutor(processes, get_context("spawn"), _open_in_process, (address,))
    try:
        for future in as_completed([pool.submit(_check_in_process, part) for part in parts]):
            yield future.result()
    finally:
        pool.shutdown(cancel_futures=True)


_REPLAYER: list[Replayer] = []


def _open_in_process(address: str) -> None:
    from kb.book.lifeline import end_with_parent, keep_to_one_core

    end_with_parent()
    keep_to_one_core()
    from kb.audit.replay import Replayer
    from kb.book import open_book

    tame_rdkit()
    _REPLAYER.append(Replayer(_dated(open_book(address, read_only=True))))


def _check_in_process(places: list[int]) -> list[Hindsight]:
    return _REPLAYER[0].walk(places)


def _circumstances(book: AskedBook) -> dict[str, Circumstance]:
    from kb.audit.recurrence_values import Circumstance
    from kb.store.circumstances import circumstances_of_failed

    return {
        code: Circumstance(project=project, scale_mmol=scale)
        for code, (project, scale) in circumstances_of_failed(book.store).items()
    }


def _state_of(dated: DatedRecord, book: AskedBook) -> str:
    """Return a digest of everything a replay rests on, so that kept results are used for no other book."""
    table = dated.table
    digest = sha256()
    for text in (*table.codes, *(repr(pairs) for pairs in dated.failures), *table.substrate, *map(repr, book.rules())):
        digest.update(text.encode("utf-8", "surrogatepass") + b"\0")
    for name in ("verdict", "fate"):
        digest.update(table.words[name].tobytes())
    for column in (table.shares, table.yield_pct, *table.numbers.values()):
        digest.update(column.tobytes())
    digest.update(dated.dates.tobytes())
    return digest.hexdigest()


def _kept(path: Path, state: str) -> list[Hindsight]:
    """Read kept results, or begin the file; a half-written last line is dropped."""
    from kb.audit.replay import hindsight_from_dict

    if not path.exists() or not path.stat().st_size:
        path.write_text(json.dumps({"sidepath_replay": 1, "state": state}) + "\n", encoding="utf-8")
        return []
    whole, _, cut = path.read_text(encoding="utf-8", errors="replace").rpartition("\n")
    try:
        head, *lines = [json.loads(line) for line in whole.split("\n")]
        known = isinstance(head, dict) and head.get("state") == state
    except ValueError:
        known, lines = False, []
    if not known:
        raise InvalidRecord(
            f"{path.name} holds no replay of this book as it stands.", "Name another file, or delete it.", str(path)
        )
    if cut:
        path.write_text(whole + "\n", encoding="utf-8")
    return [hindsight_from_dict(line) for line in lines]


def _append(path: Path, part: Sequence[Hindsight]) -> None:
    with path.open("a", encoding="utf-8") as file:
        file.writelines(json.dumps(one.as_dict(), ensure_ascii=False) + "\n" for one in part)
