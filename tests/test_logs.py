"""Log lines go where a front end says, and nowhere else; RDKit speaks the same way."""

from __future__ import annotations

import logging
import subprocess
import sys
from pathlib import Path

import pytest

from kb.logs import log_to_file, log_to_stderr


def test_lines_go_to_stderr_while_asked_and_not_after(capsys: pytest.CaptureFixture[str]) -> None:
    logger = logging.getLogger("kb.store.test")
    with log_to_stderr():
        logger.info("3 runs stored")
    logger.info("not shown")
    err = capsys.readouterr().err
    assert "3 runs stored" in err and "not shown" not in err


def test_lines_go_to_a_file_only(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    with log_to_file(tmp_path / "logs" / "sidepath.log"):
        logging.getLogger("tui.test").warning("slow")
        logging.getLogger("kb.test").debug("too fine")
    text = (tmp_path / "logs" / "sidepath.log").read_text()
    assert "slow" in text and "too fine" not in text
    assert capsys.readouterr().err == ""


def test_importing_the_program_adds_no_handler() -> None:
    code = "import kb.logs, kb.store.store, logging; print(logging.getLogger('kb').handlers, logging.root.handlers)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[] []"


def test_rdkit_is_silent_on_stderr_and_heard_in_the_log() -> None:
    code = """
import kb.logs, sys
kb.logs.tame_rdkit()
from rdkit import Chem
Chem.MolFromSmiles("C(C")
print("silent", flush=True)
sys.stderr.write("--\\n"); sys.stderr.flush()
with kb.logs.log_to_stderr():
    Chem.MolFromSmiles("C(C")
"""
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    before, _, after = done.stderr.partition("--\n")
    assert before == ""
    assert "rdkit" in after and "C(C" in after
