"""What the audits of a large book take: processor time and peak memory, each in a process of its own, and their growth.

Run by name (`pytest -m speed -s`); it reports and asserts no time, since machines differ. SIDEPATH_BENCH_AUDIT sets
the largest book (30,000 runs unless told otherwise; making one of 100,000 takes some ten minutes of two cores), and
SIDEPATH_BENCH_REPLAY how many runs of it a replay is timed on.
"""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pytest

from tests.speed.record_set import record_book
from tests.speed.structure_set import wanted

_ASK = """
import json, random, re, sys, time
from kb.book import open_book, find_recurring_failures, measure_book_coverage
from kb.logs import tame_rdkit

class Told:
    times = 0
    def advance(self, done, total, note=""): self.times += 1
    def cancelled(self): return False

question, path, count = sys.argv[1], sys.argv[2], int(sys.argv[3])
told = Told()
began = time.process_time()
with open_book(path, read_only=True) as book:
    if question == "recurring":
        found = find_recurring_failures(book, progress=told)
        what = f"{found.failures} failures, {len(found.clusters)} kinds"
    elif question == "coverage":
        found = measure_book_coverage(book, progress=told)
        what = f"{len(found.cells)} combinations"
    else:
        tame_rdkit()
        from kb.audit.hindsight import DatedRecord
        from kb.audit.replay import Replayer
        dated = DatedRecord(book.view(), book.rules())
        places = sorted(random.Random(1).sample(range(len(dated)), count))
        replayer = Replayer(dated)
        replayer.walk(places[: count // 2], progress=told)  # caches fill
        began = time.process_time()
        replayer.walk(places[count // 2 :], progress=told)
        what = f"{count - count // 2} runs checked"
used = time.process_time() - began
peak = re.search("VmHWM:[^0-9]*([0-9]+)", open("/proc/self/status").read())  # ru_maxrss would count who started us
print(json.dumps({"cpu_s": round(used, 1), "peak_mb": int(peak[1]) // 1024, "reports": told.times, "what": what}))
"""


def _ask(question: str, book: Path, count: int = 0) -> dict[str, object]:
    done = subprocess.run(
        [sys.executable, "-c", _ASK, question, str(book), str(count)], capture_output=True, text=True, check=True
    )
    found: dict[str, object] = json.loads(done.stdout)
    return found


@pytest.fixture
def cache(pytestconfig: pytest.Config) -> Path:
    assert pytestconfig.cache is not None
    return pytestconfig.cache.mkdir("sidepath-bench")


@pytest.mark.speed
@pytest.mark.parametrize("question", ["recurring", "coverage"])
def test_audits_of_growing_books(question: str, cache: Path) -> None:
    largest = wanted("AUDIT", 30_000)
    for runs in (largest // 10, largest // 3, largest):
        answer = _ask(question, record_book(runs, cache))
        print(f"\naudit {question}, {runs} runs: {answer}")
        assert int(str(answer["reports"])) > 2, "no progress was told"


@pytest.mark.speed
def test_a_replay_of_a_sample(cache: Path) -> None:
    for runs in (wanted("AUDIT", 30_000) // 10, wanted("AUDIT", 30_000) * 2 // 3):
        answer = _ask("replay", record_book(runs, cache), wanted("REPLAY", 200))
        print(f"\naudit replay, sampled from {runs} runs: {answer}")
