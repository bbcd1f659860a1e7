"""How every command is parsed: a value given but empty is refused, and Ctrl-C becomes an error of the family.

An empty value comes from an unset variable in a script (`--with "$BASE"`); left alone it would silently drop a base
from a check, or turn a search into "everything". It also lets the list of commands say the whole first sentence of
each.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from typer import Typer
from typer.core import TyperCommand

from kb.errors import Cancelled, InvalidRecord

MAY_BE_EMPTY = frozenset({"note"})
"""Parameters for which an empty text has a meaning of its own."""


class StrictCommand(TyperCommand):
    """A command whose parameters may be left out but not be empty."""

    def parse_args(self, ctx: Any, args: list[str]) -> list[str]:
        """Parse, then refuse empty texts.

        Raises:
            InvalidRecord: a parameter was given an empty text; the sentence names it.
        """
        rest = super().parse_args(ctx, args)
        if ctx.resilient_parsing:
            return rest
        for parameter in self.params:
            name = str(parameter.name)
            if name not in MAY_BE_EMPTY and any(not text.strip() for text in _texts(ctx.params.get(name))):
                is_option = parameter.param_type_name == "option"
                shown = max(parameter.opts, key=len) if is_option else name.upper()
                hint = "Give it a value." if parameter.required else "Give it a value, or leave it out."
                raise InvalidRecord(f"{shown} is empty.", hint, "")
        return rest

    def invoke(self, ctx: Any) -> Any:
        """Run the command; Ctrl-C raises Cancelled."""
        try:
            return super().invoke(ctx)
        except KeyboardInterrupt:
            raise Cancelled("Stopped.", "What was finished before is kept.") from None


def make_strict(app: Typer) -> None:
    """Let every command of an application and of its groups be parsed this way."""
    for command in app.registered_commands:
        command.cls = StrictCommand
        if command.short_help is None and command.callback is not None:
            command.short_help = (command.callback.__doc__ or "").strip().split(".\n")[0].split(". ")[0].rstrip(".")
    for group in app.registered_groups:
        if group.typer_instance is not None:
            make_strict(group.typer_instance)


def _texts(value: Any) -> Iterator[str]:
    for item in value if isinstance(value, list | tuple) else (value,):
        if isinstance(item, str):
            yield item
