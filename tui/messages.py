"""Messages that cross widgets and screens: small facts in the past tense."""

from __future__ import annotations

from textual.message import Message


class JobProgressed(Message):
    """A long worker got further; a burst collapses to the newest."""

    def __init__(self, kind: str, done: int, total: int | None, note: str) -> None:
        super().__init__()
        self.kind = kind
        self.done = done
        self.total = total
        self.note = note

    def can_replace(self, message: Message) -> bool:
        """Let a newer report of the same job stand for this one."""
        return isinstance(message, JobProgressed) and message.kind == self.kind


class RunStored(Message):
    """A run was added, amended or withdrawn; what counts or lists runs is out of date."""

    def __init__(self, code: str) -> None:
        super().__init__()
        self.code = code
