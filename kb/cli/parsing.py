"""Running a command through the parser, and what the parser says turned into our words."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any

import typer

from kb.cli import exit_codes
from kb.cli.session import Misused

# Typer carries its own copy of the library under it, or an installed one, by version; these are its bases either way.
_UsageError: Any = typer.BadParameter.__bases__[0]
_CommandError: Any = _UsageError.__bases__[0]

_PARSER_WORDS = (
    (r"Value error, |^Invalid value: ", ""),
    (r"Input should be a valid integer.*", "it is no whole number"),
    (r"Input should be a valid number.*", "it is no number"),
    (r"Input should be ", "give a number "),
    (r" ?\(Possible options?: ([^)]*)\)", r". Did you mean \1?"),
)
"""What the parser under Typer says, and what we say."""


def run_parsed(argv: Sequence[str]) -> int:
    """Parse the words, run their command and return its exit status.

    Args:
        argv: global options in front.

    Raises:
        Misused: the words are no command, or not as the command wants them.
        KeyboardInterrupt: stopped at a prompt.
    """
    from kb.cli.root import app

    try:
        command = typer.main.get_command(app)
        result = command.main(args=list(argv), prog_name="sidepath", standalone_mode=False)
        return result if isinstance(result, int) else exit_codes.DONE
    except typer.Abort:
        raise KeyboardInterrupt from None
    except typer.Exit as leaving:
        return int(leaving.exit_code)
    except _CommandError as error:
        context = getattr(error, "ctx", None)
        where = context.command_path if context else "sidepath"
        raise Misused(_usage_words(error), f"See `{where} --help`.") from error


def _usage_words(error: Any) -> str:
    """Return what the parser says, as a sentence."""
    said = str(error.format_message())
    for theirs, ours in _PARSER_WORDS:
        said = re.sub(theirs, ours, said)
    said = said[:1].upper() + said[1:]
    return said if said.endswith((".", "?", "!")) else f"{said}."
