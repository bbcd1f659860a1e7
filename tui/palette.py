"""The command palette: every action of the screen in view and of the application, by its description.

The list comes from the bindings themselves, so an action cannot be missing; screens add the few that have
no key.
"""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial
from typing import Any

from textual.command import DiscoveryHit, Hit, Hits, Provider
from textual.content import Content
from textual.types import IgnoreReturnCallbackType


class ActionProvider(Provider):
    """Commands of the screen below the palette."""

    def _actions(self) -> Iterator[tuple[str, str, IgnoreReturnCallbackType]]:
        """Yield (title, help, callback) of everything that can be done now."""
        seen: set[str] = set()
        for active in self.screen.active_bindings.values():
            binding = active.binding
            if not binding.description or not active.enabled or binding.action in seen:
                continue
            if not (binding.show or binding.tooltip):
                continue
            seen.add(binding.action)
            yield binding.description, binding.tooltip, partial(self._run, binding.action, active.node)
        extra: Any = getattr(self.screen, "palette_actions", None)
        if extra is not None:
            for title, words, action in extra():
                yield title, words, partial(self._run, action, self.screen)

    async def _run(self, action: str, node: Any) -> None:
        await self.app.run_action(action, default_namespace=node)

    async def discover(self) -> Hits:
        """List everything."""
        for title, words, callback in self._actions():
            yield DiscoveryHit(title, callback, help=words)

    async def search(self, query: str) -> Hits:
        """List what fits the words."""
        matcher = self.matcher(query)
        for title, words, callback in self._actions():
            if (score := matcher.match(title)) > 0:
                yield Hit(score, matcher.highlight(title), callback, help=words)
            elif (score := matcher.match(words)) > 0:
                yield Hit(score * 0.8, Content(title), callback, help=words)
