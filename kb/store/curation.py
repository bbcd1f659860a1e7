"""What people keep beside the runs: house rules, acknowledgements, drafts, and the bytes of attached files.

Rules and acknowledgements are part of the record: never edited, rules are retired with the reason. Drafts are
not: they come and go with an entry form. Attachments are kept once per content (SHA-256); a run names them.
File names are reduced to their last part, so that no name can point outside a folder when it is written out.
"""

from __future__ import annotations

import hashlib
import json
import re
from collections.abc import Mapping
from dataclasses import asdict, replace
from pathlib import PurePosixPath, PureWindowsPath
from typing import Any
from uuid import UUID, uuid4

import sqlalchemy as sa

from kb.errors import InvalidRecord, RecordConflict, RecordNotFound, StoreDamaged
from kb.record.json_fields import UNKEEPABLE
from kb.record.run import Attachment, Run
from kb.store import amending, lineage
from kb.store.codes import LETTERS
from kb.store.mapping import Values, table
from kb.store.rows import AcknowledgementRow, AttachmentBlobRow, DraftRow, HouseRuleRow
from kb.store.session import OpenBook, keepable, need
from kb.store.values import Acknowledgement, Draft, HouseRule
from kb.vocabulary import Severity

RULE, ACKNOWLEDGEMENT = table(HouseRuleRow), table(AcknowledgementRow)
DRAFT, BLOB = table(DraftRow), table(AttachmentBlobRow)

LARGEST_ATTACHMENT_BYTES = 50 * 2**20
"""A spectrum as PDF or JCAMP is a few MB; raw data belong elsewhere. A judgement."""


class HouseRules:
    """Liabilities that this group wrote down."""

    def __init__(self, book: OpenBook) -> None:
        self._book = book

    def add(self, rule: HouseRule) -> HouseRule:
        """Keep a rule; return it with its id and moment.

        The id is made of the title and four letters of the content, the same in every book, so that merging
        finds equal rules and never mixes up different ones.

        Raises:
            RecordConflict: the very same rule is in force already.
        """
        need(rule.title, "The rule has no title", "one line")
        need(rule.why, "The rule has no reason", "plain words")
        need(rule.author, "Say who writes the rule", "initials (--as)")
        keepable(*(value for value in asdict(rule).values() if isinstance(value, str)))
        rule = replace(rule, rule_id=rule_id_of(rule), created_at=self._book.clock())
        with self._book.writing() as connection:
            if connection.execute(sa.select(RULE.c.rule_id).where(RULE.c.rule_id == rule.rule_id)).scalar():
                raise RecordConflict(
                    f"That house rule is in the book already: {rule.rule_id}.",
                    "If it is retired, write it anew with what was learned since.",
                    rule.rule_id,
                )
            connection.execute(sa.insert(RULE).values(**rule_values(rule)))
        return rule

    def list(self, with_retired: bool = False) -> tuple[HouseRule, ...]:
        """Return the rules in force, oldest first."""
        statement = sa.select(RULE).order_by(RULE.c.created_at, RULE.c.rule_id)
        if not with_retired:
            statement = statement.where(RULE.c.retired_at.is_(None))
        with self._book.reading() as connection:
            return tuple(rule_of(row) for row in connection.execute(statement).mappings())

    def get(self, rule_id: str) -> HouseRule:
        """Return a rule, retired or not.

        Raises:
            RecordNotFound: there is none of that id.
        """
        with self._book.reading() as connection:
            row = connection.execute(sa.select(RULE).where(RULE.c.rule_id == rule_id)).mappings().first()
        if row is None:
            raise RecordNotFound(f"No house rule is called {rule_id[:60]!r}.", "See `sidepath rule list`.", rule_id)
        return rule_of(row)

    def retire(self, rule_id: str, who: str, why: str) -> HouseRule:
        """Take a rule out of force, with the reason; one that is retired already stays as it was."""
        need(who, "Say who retires the rule", "initials (--as)")
        need(why, "Say why the rule is retired", "a reason (--why)")
        keepable(who, why)
        if self.get(rule_id).is_retired:
            return self.get(rule_id)
        with self._book.writing() as connection:
            connection.execute(
                sa.update(RULE)
                .where(RULE.c.rule_id == rule_id, RULE.c.retired_at.is_(None))
                .values(retired_at=self._book.clock(), retired_by=who, retired_why=why)
            )
        return self.get(rule_id)


class Acknowledgements:
    """Who saw which finding and went on, with the reason."""

    def __init__(self, book: OpenBook) -> None:
        self._book = book

    def add(self, finding_id: str, about: str, who: str, why: str) -> Acknowledgement:
        """Keep an acknowledgement; `about` is a run's UUID or the text of a plan."""
        need(who, "Say who acknowledges it", "initials (--as)")
        need(why, "Say why it is acceptable", "a reason")
        keepable(finding_id, about, who, why)
        made = Acknowledgement(
            finding_id=finding_id,
            about=about,
            who=who,
            why=why,
            at=self._book.clock(),
            acknowledgement_id=uuid4(),
        )
        with self._book.writing() as connection:
            connection.execute(sa.insert(ACKNOWLEDGEMENT).values(**asdict(made)))
        return made

    def list(self, about: str | None = None) -> tuple[Acknowledgement, ...]:
        """Return acknowledgements, oldest first; None = all."""
        statement = sa.select(ACKNOWLEDGEMENT).order_by(ACKNOWLEDGEMENT.c.at)
        if about is not None:
            statement = statement.where(ACKNOWLEDGEMENT.c.about == about)
        with self._book.reading() as connection:
            return tuple(Acknowledgement(**row) for row in connection.execute(statement).mappings())


class Drafts:
    """Entry forms as they were last left; no answer rests on them, so they do not count as changes of the book."""

    def __init__(self, book: OpenBook) -> None:
        self._book = book

    def save(self, draft_id: str, content: Mapping[str, Any]) -> Draft:
        """Keep a draft, in place of the one of that id."""
        keepable(draft_id)
        try:
            text = json.dumps(dict(content))  # ASCII, so that even a broken paste comes back as it was
        except (TypeError, ValueError) as error:
            raise InvalidRecord("The draft holds what JSON cannot.", "Keep text and numbers only.") from error
        kept = Draft(draft_id=draft_id, updated_at=self._book.clock(), content=json.loads(text))
        values = {"draft_id": draft_id, "updated_at": kept.updated_at, "content": text}
        with self._book.writing(is_change=False) as connection:
            connection.execute(sa.delete(DRAFT).where(DRAFT.c.draft_id == draft_id))
            connection.execute(sa.insert(DRAFT).values(**values))
        return kept

    def list(self) -> tuple[Draft, ...]:
        """Return all drafts, the latest first."""
        with self._book.reading() as connection:
            rows = connection.execute(sa.select(DRAFT).order_by(DRAFT.c.updated_at.desc(), DRAFT.c.draft_id)).all()
        return tuple(_draft_of(row) for row in rows)

    def find(self, draft_id: str) -> Draft | None:
        """Return a draft; None where there is none."""
        with self._book.reading() as connection:
            row = connection.execute(sa.select(DRAFT).where(DRAFT.c.draft_id == draft_id)).first()
        return None if row is None else _draft_of(row)

    def discard(self, draft_id: str) -> None:
        """Throw a draft away; silent where there is none."""
        with self._book.writing(is_change=False) as connection:
            connection.execute(sa.delete(DRAFT).where(DRAFT.c.draft_id == draft_id))


class Attachments:
    """Files kept with runs, once per content."""

    def __init__(self, book: OpenBook) -> None:
        self._book = book

    def attach(self, name: str | UUID, file_name: str, content: bytes, who: str, why: str) -> Run:
        """Keep a file with a run, as an amendment; return the run as it stands then.

        Args:
            name: code or UUID of the run.
            file_name: any path; only its last part is kept.
        """
        named = self.put(file_name, content)
        return amending.change(
            self._book,
            name,
            lineage.AMEND,
            lambda run: replace(run, attachments=(*run.attachments, named)),
            who=who,
            why=why,
            expected_revision=None,
        )

    def put(self, file_name: str, content: bytes) -> Attachment:
        """Keep the bytes of a file that no run names yet; return what a run then names."""
        if len(content) > LARGEST_ATTACHMENT_BYTES:
            raise InvalidRecord(
                f"{safe_file_name(file_name)} has {len(content) / 2**20:.0f} MB.",
                f"Attach at most {LARGEST_ATTACHMENT_BYTES // 2**20} MB, or note where the file is.",
                len(content),
            )
        sha256 = hashlib.sha256(content).hexdigest()
        with self._book.writing() as connection:
            if connection.execute(sa.select(BLOB.c.sha256).where(BLOB.c.sha256 == sha256)).scalar() is None:
                connection.execute(sa.insert(BLOB).values(sha256=sha256, content=content))
        return Attachment(name=safe_file_name(file_name), sha256=sha256, size_bytes=len(content))

    def get(self, sha256: str) -> bytes:
        """Return the bytes of a file.

        Raises:
            RecordNotFound: the run came from elsewhere without its files.
            StoreDamaged: the bytes are no longer those that were kept.
        """
        with self._book.reading() as connection:
            content = connection.execute(sa.select(BLOB.c.content).where(BLOB.c.sha256 == sha256)).scalar()
        if content is None:
            raise RecordNotFound(
                "That file is not in this book.", "It may have stayed where the run came from.", sha256
            )
        if hashlib.sha256(content).hexdigest() != sha256:
            raise StoreDamaged("An attached file was damaged in the book.", "Restore a backup.", sha256)
        return content


def safe_file_name(name: str) -> str:
    """Return the last part of a path without control characters; "file" where nothing is left.

    >>> safe_file_name("../../etc/passwd"), safe_file_name("C:\\\\nmr\\\\1.pdf"), safe_file_name("..")
    ('passwd', '1.pdf', 'file')
    """
    last = PurePosixPath(PureWindowsPath(UNKEEPABLE.sub("", name)).name).name
    printable = "".join(c for c in last if c.isprintable()).strip().strip(".")
    return printable[:200] or "file"


def rule_id_of(rule: HouseRule) -> str:
    """Return the id of a rule: title in lower case and four letters of its content."""
    said = lineage.canonical([rule.title, rule.motif, rule.when, str(rule.severity), rule.why, rule.source])
    number = int.from_bytes(hashlib.sha256(said.encode()).digest()[:8])
    letters = ""
    for _ in range(4):
        number, digit = divmod(number, len(LETTERS))
        letters += LETTERS[digit]
    slug = re.sub(r"[^a-z0-9]+", "-", rule.title.lower()).strip("-")[:40].strip("-")
    return f"{slug or 'rule'}-{letters}"


def rule_values(rule: HouseRule) -> Values:
    """Return the columns of `house_rule`."""
    values = asdict(rule)
    when = values.pop("when")
    return {**values, "when_text": when, "severity": str(rule.severity)}


def rule_of(row: sa.RowMapping) -> HouseRule:
    """Return the rule of a row."""
    values = dict(row)
    when = values.pop("when_text")
    return HouseRule(**{**values, "when": when, "severity": Severity(values["severity"])})


def _draft_of(row: Any) -> Draft:
    try:
        content = json.loads(row.content)
    except ValueError as error:
        raise StoreDamaged("A draft was damaged in the book.", "Discard it.", row.draft_id) from error
    return Draft(draft_id=row.draft_id, updated_at=row.updated_at, content=content)
