"""The program's door: hoists the global options, runs the command, turns errors into sentences and exit codes.

Nothing heavy is imported here: neither RDKit nor Textual loads before a command needs it (tested in a subprocess).
Without a command on a terminal it opens the terminal interface.
"""

from __future__ import annotations

import gc
import os
import sys
from collections.abc import Sequence
from pathlib import Path

from kb import kept
from kb.cli import exit_codes, quick
from kb.cli.session import STDOUT, Misused, ReaderGone, complain, json_line, write_line
from kb.errors import SidepathError

_FLAGS = {"--json", "--quiet", "--verbose", "-q", "-v"}
_WITH_VALUE = {"--book", "--as"}
_FREE_TEXT = {"--note", "--why", "--ref", "--words", "--title", "--instead", "--source", "--project"}
"""Options of commands whose value may be any words, even those of a global option."""
COLLECT_AFTER = 100_000
"""Objects between two garbage collections: loading RDKit and SQLAlchemy makes many that live as long as the program,
and looking through them again and again takes a twentieth of the time of a check."""
ONE_THREAD = ("OPENBLAS_NUM_THREADS", "1")
"""Starting threads for linear algebra, of which there is next to none here, takes half the time that NumPy loads."""
_DISK_FULL = (28, 122)
"""ENOSPC and EDQUOT."""


def main(argv: Sequence[str] | None = None) -> None:
    """Run the program and exit with the contract's status.

    Args:
        argv: arguments without the program's name; None = sys.argv.
    """
    gc.set_threshold(COLLECT_AFTER, 50, 50)
    kept.allow()
    os.environ.setdefault(*ONE_THREAD)
    _settle_streams()
    code = run(sys.argv[1:] if argv is None else list(argv))
    try:
        sys.stdout.flush()
    except OSError as error:
        code = _after_failed_output(error, code)
    if argv is None and quick.has_answered():
        sys.stderr.flush()
        os._exit(code)  # nothing is left open; taking RDKit and NumPy down piece by piece takes a tenth of the check
    sys.exit(code)


def run(argv: Sequence[str]) -> int:
    """Run one command and return its exit status; never raises."""
    front, rest = _parted(argv)
    as_json, is_verbose = "--json" in front, bool({"--verbose", "-v"} & set(front))
    try:
        status = quick.run_quickly(front, rest)
        if status is not None:
            return status
        from kb.cli.parsing import run_parsed  # here, so that Ctrl-C while it loads is met below

        return run_parsed(front + rest)
    except SidepathError as error:
        _complain(error.as_dict(), as_json)
        return exit_codes.exit_code_of(error)
    except KeyboardInterrupt:
        _complain({"code": "cancelled", "message": "Stopped.", "hint": ""}, as_json)
        return exit_codes.INTERRUPTED
    except SystemExit as leaving:
        return leaving.code if isinstance(leaving.code, int) else exit_codes.DONE
    except Misused as error:
        _complain({"code": "usage", "message": error.message, "hint": error.hint}, as_json)
        return exit_codes.USAGE
    except (ReaderGone, BrokenPipeError):
        return _after_failed_output(BrokenPipeError(), exit_codes.DONE)
    except OSError as error:
        if error.filename == STDOUT:
            return _after_failed_output(error, exit_codes.REFUSED)
        is_full = error.errno in _DISK_FULL
        message = f"{error.strerror or error}{f': {error.filename}' if error.filename else ''}."
        hint = "Make room." if is_full else "Check the path and the permissions."
        _complain({"code": "system", "message": message, "hint": hint}, as_json)
        return exit_codes.BOOK_TROUBLE if is_full else exit_codes.REFUSED
    except Exception as error:  # noqa: BLE001 - the last door: a fault of ours must not fall on a chemist as a traceback
        return _own_fault(error, as_json, is_verbose)


def hoist_globals(argv: Sequence[str]) -> list[str]:
    """Move the global options in front of the command, so that they may stand before or after it.

    What follows `--`, and a value that follows an option of a command, is left where it is: a global option is only
    taken where it stands as a word of its own.

    >>> hoist_globals(["check", "CCBr", "--json", "--book", "b.db"])
    ['--json', '--book', 'b.db', 'check', 'CCBr']
    """
    front, rest = _parted(argv)
    return front + rest


def _parted(argv: Sequence[str]) -> tuple[list[str], list[str]]:
    """Return the global options, and the rest."""
    front: list[str] = []
    rest: list[str] = []
    words = iter(argv)
    for word in words:
        if word == "--":
            rest += [word, *words]
        elif word in _FREE_TEXT:
            rest += [word, *([value] if (value := next(words, None)) is not None else [])]
        elif word in _FLAGS or any(word.startswith(f"{option}=") for option in _WITH_VALUE):
            front.append(word)
        elif word in _WITH_VALUE:
            front += [word, *([value] if (value := next(words, None)) is not None else [])]
        else:
            rest.append(word)
    return front, rest


def _settle_streams() -> None:
    """Give the streams that a caller closed somewhere to go, and let the others take any character."""
    for name, mode in (("stdin", "r"), ("stdout", "w"), ("stderr", "w")):
        stream = getattr(sys, name)
        if stream is None:
            setattr(sys, name, Path(os.devnull).open(mode, encoding="utf-8"))  # noqa: SIM115 - for the whole run
        elif mode == "w" and hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")  # a note may hold what this terminal's encoding does not


def _complain(error: dict[str, str], as_json: bool) -> None:
    """Say an error: plain sentences on stderr, with --json also an object on stdout."""
    if as_json:
        write_line(sys.stdout, json_line({"error": error}))
    complain(error)


def _after_failed_output(error: OSError, code: int) -> int:
    """Settle a stdout that takes no more: a closed pipe is no failure of ours, a full disk is."""
    sink = os.open(os.devnull, os.O_WRONLY)
    try:
        os.dup2(sink, sys.stdout.fileno())  # or Python complains once more when it flushes at exit
    except (OSError, ValueError):
        pass  # stdout is no file of its own
    finally:
        os.close(sink)
    if isinstance(error, BrokenPipeError):
        return code
    complain({"message": f"The answer could not be written: {error.strerror or error}.", "hint": "Make room."})
    return exit_codes.BOOK_TROUBLE if error.errno in _DISK_FULL else exit_codes.REFUSED


def _own_fault(error: Exception, as_json: bool, is_verbose: bool) -> int:
    """Say that the program itself failed, with a traceback only where --verbose asks for it."""
    if is_verbose:
        import traceback

        traceback.print_exception(error)
    message = f"Sidepath itself failed ({type(error).__name__}: {error})."
    hint = "It is not what you typed. Tell whoever keeps Sidepath the command and what it says with --verbose."
    _complain({"code": "fault", "message": message, "hint": hint}, as_json)
    return exit_codes.REFUSED
