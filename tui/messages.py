"""Messages that cross widgets and screens: small facts in the past tense.

Answers of workers carry the ticket of their question, so that stale ones are dropped. Plain dataclasses
would share Textual's message state; these are ordinary message classes with typed fields.
"""

from __future__ import annotations

from typing import Any

from textual.message import Message

from kb.chem.facts import Reading
from kb.chem.layout import SchemeDrawing
from kb.errors import SidepathError
from kb.record.assessment import Assessment


class JobFailed(Message):
    """A worker could not answer; `kind` names the job, `error` says why in plain words."""

    def __init__(self, kind: str, ticket: int, error: SidepathError) -> None:
        super().__init__()
        self.kind = kind
        self.ticket = ticket
        self.error = error


class JobAnswered(Message):
    """A worker answered; `kind` names the job, `value` is what it found."""

    def __init__(self, kind: str, ticket: int, value: Any) -> None:
        super().__init__()
        self.kind = kind
        self.ticket = ticket
        self.value = value


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


class SchemeRead(Message):
    """A scheme was read and laid out."""

    def __init__(self, ticket: int, reading: Reading, drawing: SchemeDrawing) -> None:
        super().__init__()
        self.ticket = ticket
        self.reading = reading
        self.drawing = drawing


class PlanChecked(Message):
    """A plan was checked."""

    def __init__(self, ticket: int, assessment: Assessment) -> None:
        super().__init__()
        self.ticket = ticket
        self.assessment = assessment


class RunStored(Message):
    """A run was added, amended or withdrawn; lists that show runs are out of date."""

    def __init__(self, code: str) -> None:
        super().__init__()
        self.code = code


class RunAsked(Message):
    """Somebody wants to see a run."""

    def __init__(self, code: str) -> None:
        super().__init__()
        self.code = code
