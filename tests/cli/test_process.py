"""What only a process can show: pipes, signals, closed streams, encodings, a full disk, completion."""

from __future__ import annotations

import json
import os
import resource
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).parents[2]
STEP = "CCC(C)Br.[Na+].[N-]=[N+]=[N-]>>CCC(C)N=[N+]=[N-]"


def start(*words: str, **options: Any) -> subprocess.Popen[bytes]:
    """Start the program as a user would."""
    environment = os.environ | {"PYTHONPATH": str(ROOT)} | options.pop("env", {})
    return subprocess.Popen([sys.executable, "-m", "kb", *words], env=environment, **options)


def finish(*words: str, **options: Any) -> tuple[int, str, str]:
    """Run the program to its end; return status, stdout, stderr."""
    pipes = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE, "stdin": subprocess.DEVNULL}
    process = start(*words, **(pipes | options))
    out, err = process.communicate(timeout=60)
    return process.returncode, (out or b"").decode(), (err or b"").decode()


def test_a_reader_that_goes_away_is_no_trouble(tmp_path: Path) -> None:
    table = tmp_path / "steps.csv"
    table.write_text("step\n" + "CCBr\n" * 2000)
    process = start("read", "--batch", str(table), "--column", "step", stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    assert process.stdout is not None and process.stderr is not None
    assert json.loads(process.stdout.readline())["ok"] is True
    process.stdout.close()
    assert process.wait(timeout=60) == 0
    assert process.stderr.read() == b""


def test_a_batch_streams(tmp_path: Path) -> None:
    reading, writing = os.pipe()
    with os.fdopen(writing, "w") as feed:
        process = start(
            *("read", "--batch", f"/dev/fd/{reading}", "--column", "step"),
            stdout=subprocess.PIPE,
            pass_fds=(reading,),
        )
        os.close(reading)
        feed.write("step\nCCBr\n" + "CCI\n" * 3000)  # more than one buffer of the reader, and still open
        feed.flush()
        assert process.stdout is not None
        first = process.stdout.readline()
    assert json.loads(first)["scheme"] == "CCBr"
    process.stdout.read()
    assert process.wait(timeout=60) == 0


def test_ctrl_c_stops_a_batch_after_a_whole_line(tmp_path: Path) -> None:
    table = tmp_path / "steps.csv"
    table.write_text("step\n" + "CCBr\n" * 200_000)
    answer = tmp_path / "answer.jsonl"
    with answer.open("wb") as out:
        process = start("read", "--batch", str(table), "--column", "step", stdout=out, stderr=subprocess.PIPE)
        _wait_for(lambda: answer.stat().st_size > 0)
        process.send_signal(signal.SIGINT)
        _, err = process.communicate(timeout=60)
    assert process.returncode == 130
    assert b"Stopped after" in err and b"Traceback" not in err
    assert all(json.loads(line)["ok"] for line in answer.read_text().splitlines())


def test_ctrl_c_while_the_demo_is_built_leaves_nothing_behind(tmp_path: Path) -> None:
    place = tmp_path / "demo.sidepath"
    process = start("--book", str(place), "demo", stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    _wait_for(lambda: any(tmp_path.iterdir()))
    time.sleep(0.2)
    process.send_signal(signal.SIGINT)
    _, err = process.communicate(timeout=60)
    assert process.returncode == 130
    assert b"Stopped" in err and b"Traceback" not in err
    assert list(tmp_path.iterdir()) == []


def test_ctrl_c_in_an_import_keeps_what_was_stored_and_says_how_to_go_on(tmp_path: Path) -> None:
    book, file = tmp_path / "book.sidepath", tmp_path / "runs.jsonl"
    assert finish("--book", str(book), "new")[0] == 0
    file.write_text("".join(json.dumps({"scheme": f"{'C' * n}Br>>{'C' * n}O"}) + "\n" for n in range(2, 102)))
    process = start("--book", str(book), "import", str(file), "--json", stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    time.sleep(0.7)
    process.send_signal(signal.SIGINT)
    out, err = process.communicate(timeout=60)
    assert b"Traceback" not in err
    if process.returncode != 0:  # a fast machine may be finished
        assert process.returncode == 130
        said = json.loads(out)
        assert said["error"]["code"] == "cancelled" if "error" in said else said["stopped"] is True
    assert finish("--book", str(book), "verify")[0] == 0
    status, again, _ = finish("--book", str(book), "import", str(file), "--json")
    assert status == 0 and json.loads(again)["rejected"] == 0
    assert json.loads(finish("--book", str(book), "runs", "--json")[1])["total"] == 100


@pytest.mark.parametrize("closed", [0, 1, 2])
def test_a_stream_that_is_closed_is_no_trouble(small_book: Path, closed: int) -> None:
    words = ["record", "--from", "-"] if closed == 0 else ["show", "1"] if closed == 1 else ["show", "nonsense"]
    process = subprocess.run(
        ["sh", "-c", f'exec "$@" {closed}>&-', "sh", sys.executable, "-m", "kb", "--book", str(small_book), *words],
        env=os.environ | {"PYTHONPATH": str(ROOT)},
        capture_output=True,
        timeout=60,
        check=False,
    )
    assert process.returncode == (0 if closed == 1 else 1)
    assert b"Traceback" not in process.stderr and b"itself failed" not in process.stderr


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no /dev/full here")
def test_an_answer_that_cannot_be_written_is_said(small_book: Path) -> None:
    with Path("/dev/full").open("wb") as full:
        status, _, err = finish("--book", str(small_book), "runs", stdout=full)
    assert status == 4
    assert "could not be written" in err and "Traceback" not in err


def test_a_terminal_of_another_encoding_still_gets_an_answer(own_book: Path) -> None:
    plain = {"PYTHONIOENCODING": "ascii"}
    status, _, _ = finish("--book", str(own_book), "record", STEP, "--note", "käse 🙂", "--as", "AB", env=plain)
    assert status == 0
    status, out, _ = finish("--book", str(own_book), "show", "4", "--json", env=plain)
    assert status == 0 and json.loads(out)["note"] == "käse 🙂"
    status, out, err = finish("--book", str(own_book), "show", "4", env=plain)
    assert status == 0 and "Traceback" not in err


def test_arguments_that_are_no_text_are_refused(small_book: Path) -> None:
    process = subprocess.run(
        [sys.executable, "-m", "kb", "--book", str(small_book), "record", STEP, "--note", b"\xff\xfe", "--as", "AB"],
        env=os.environ | {"PYTHONPATH": str(ROOT)},
        capture_output=True,
        timeout=60,
        check=False,
    )
    assert process.returncode == 1
    assert b"Traceback" not in process.stderr and b"surrogates" in process.stderr


def test_a_full_disk_ends_with_4_and_leaves_the_book_as_it_was(own_book: Path, tmp_path: Path) -> None:
    def little_room() -> None:
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
        resource.setrlimit(resource.RLIMIT_FSIZE, (10_000, 10_000))

    for words in (
        ("--book", str(own_book), "record", STEP, "--note", "x" * 50_000, "--as", "AB"),
        ("--book", str(tmp_path / "new.sidepath"), "new"),
        ("--book", str(own_book), "backup", str(tmp_path / "copy.bak")),
    ):
        status, _, err = finish(*words, preexec_fn=little_room)
        assert status == 4 and err.startswith("sidepath: ") and "Traceback" not in err
    assert [p.name for p in tmp_path.iterdir() if p.name.startswith(("new", "copy"))] == []
    assert json.loads(finish("--book", str(own_book), "runs", "--json")[1])["total"] == 3


def test_completion_offers_commands_options_and_words() -> None:
    asked = {
        "sidepath che": (1, "check"),
        "sidepath check CCBr --fail-on ": (4, "serious"),
        "sidepath --json check --solv": (3, "--solvent"),
        "sidepath rule ret": (2, "retire"),
    }
    for words, (place, offered) in asked.items():
        completing = {"_SIDEPATH_COMPLETE": "complete_bash", "COMP_WORDS": words, "COMP_CWORD": str(place)}
        assert offered in finish(env=completing)[1].split()
    for shell in ("bash", "zsh", "fish"):
        status, script, _ = finish("--show-completion", shell)
        assert status == 0 and "_SIDEPATH_COMPLETE" in script


def test_without_a_command_and_a_terminal_it_says_what_there_is() -> None:
    status, out, _ = finish()
    assert status == 0 and "Usage: sidepath" in out
    status, _, err = finish("tui")
    assert status == 1 and "no terminal" in err


def _wait_for(happened: Any) -> None:
    """Wait until something has happened; half a minute at most."""
    for _ in range(600):
        if happened():
            return
        time.sleep(0.05)
    raise AssertionError("it never happened")
