"""The program's door: hoists the global options, runs the command, turns errors into sentences and exit codes.

Nothing heavy is imported here: neither RDKit nor Textual loads before a command needs it (tested in a subprocess).
Without a command on a terminal it opens the terminal interface.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Sequence
from typing import Any

import typer

from kb.cli import exit_codes
from kb.errors import SidepathError
from kb.plain import plain

# Typer carries its own copy of the library under it, or an installed one, by version; these are its bases either way.
_UsageError: Any = typer.BadParameter.__bases__[0]
_CommandError: Any = _UsageError.__bases__[0]

_FLAGS = {"--json", "--quiet", "--verbose", "-q", "-v"}
_WITH_VALUE = {"--book", "--as"}


def main(argv: Sequence[str] | None = None) -> None:
    """Run the program and exit with the contract's status.

    Args:
        argv: arguments without the program's name; None = sys.argv.
    """
    sys.exit(run(sys.argv[1:] if argv is None else list(argv)))


def run(argv: Sequence[str]) -> int:
    """Run one command and return its exit status; never raises what a user caused."""
    from kb.cli.root import app

    arguments = hoist_globals(argv)
    as_json = "--json" in arguments
    command = typer.main.get_command(app)
    try:
        result = command.main(args=arguments, prog_name="sidepath", standalone_mode=False)
        return result if isinstance(result, int) else exit_codes.DONE
    except SidepathError as error:
        _complain(error.as_dict(), as_json)
        return exit_codes.exit_code_of(error)
    except typer.Abort:
        typer.echo("Stopped.", err=True)
        return exit_codes.INTERRUPTED
    except typer.Exit as leaving:
        return leaving.exit_code
    except _UsageError as error:
        where = error.ctx.command_path if error.ctx else "sidepath"
        _complain({"code": "usage", "message": error.format_message(), "hint": f"See `{where} --help`."}, as_json)
        return exit_codes.USAGE
    except _CommandError as error:
        _complain({"code": "usage", "message": error.format_message(), "hint": ""}, as_json)
        return exit_codes.USAGE
    except KeyboardInterrupt:
        typer.echo("Stopped.", err=True)
        return exit_codes.INTERRUPTED
    except BrokenPipeError:
        sys.stderr.close()
        return exit_codes.DONE
    except OSError as error:
        message = f"{error.strerror or error}{f': {error.filename}' if error.filename else ''}."
        _complain({"code": "system", "message": message, "hint": "Check the path and the permissions."}, as_json)
        return exit_codes.BOOK_TROUBLE if error.errno in (28, 122) else exit_codes.REFUSED


def hoist_globals(argv: Sequence[str]) -> list[str]:
    """Move the global options in front of the command, so that they may stand before or after it.

    What follows `--`, and a value that follows an option of a command, is left where it is: a global option is only
    taken where it stands as a word of its own.

    >>> hoist_globals(["check", "CCBr", "--json", "--book", "b.db"])
    ['--json', '--book', 'b.db', 'check', 'CCBr']
    """
    front: list[str] = []
    rest: list[str] = []
    words = iter(argv)
    free_text = {"--note", "--why", "--ref", "--words", "--title", "--instead"}
    for word in words:
        if word == "--":
            rest += [word, *words]
        elif word in free_text:
            rest += [word, *([value] if (value := next(words, None)) is not None else [])]
        elif word in _FLAGS or any(word.startswith(f"{option}=") for option in _WITH_VALUE):
            front.append(word)
        elif word in _WITH_VALUE:
            front += [word, *([value] if (value := next(words, None)) is not None else [])]
        else:
            rest.append(word)
    return front + rest


def _complain(error: dict[str, str], as_json: bool) -> None:
    """Say an error: plain sentences on stderr, with --json also an object on stdout."""
    if as_json:
        typer.echo(json.dumps({"error": error}, ensure_ascii=False))
    sentence = f"{error['message']} {error['hint']}".strip()
    typer.echo(f"sidepath: {plain(sentence)}", err=True)
