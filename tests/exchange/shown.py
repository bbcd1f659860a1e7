"""Things to make pages of, hostile ones included: `from exchange.shown import HOSTILE, hostile_run, things_of`."""

from __future__ import annotations

import dataclasses
import datetime as dt
from typing import Any

from kb.book import Book, demo_plan, read_scheme
from kb.book.routes import resolve_route
from kb.book.whole import calibrate_book, find_recurring_failures, measure_book_coverage, replay_book
from kb.record.component import Component
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.record.run import Attachment, Run
from kb.route.ledger import reckon
from kb.route.routefile import draft_route
from kb.vocabulary import Fate, Role, Verdict

HOSTILE = (
    "<script>alert(1)</script><img src=x onerror=alert(1)>\"'><svg onload=alert(1)>"
    "</style><iframe src=//evil.example></iframe>{{ 7*7 }} [x](javascript:alert(1)) ![y](http://evil.example/z.png)"
    ' `code` <!-- --> \x1b[31mred\u202egnp.exe\x00 =HYPERLINK("http://evil.example")\n# not a heading\n- no item'
).replace("\x00", "")
ROUTE: dict[str, Any] = {
    "title": "Amine",
    "target": "2 g",
    "product": "NCCc1ccccc1",
    "money": "EUR",
    "material": {"bromide": {"smiles": "BrCCc1ccccc1", "price_per_g": 0.4}},
    "step": [
        {"name": "azide", "from": "bromide", "run": "R-0042", "product": "[N-]=[N+]=NCCc1ccccc1"},
        {"name": "amine", "yield": "8 (4 to 13)", "cheap_input": True},
        {"name": "salt", "yield": 91},
    ],
}


def things_of(book: Book) -> dict[str, object]:
    """Return one of each kind of thing that has a page, from a demo book."""
    return {
        "run": book.get("R-0040"),
        "reading": read_scheme(demo_plan().scheme),
        "assessment": book.check(demo_plan()),
        "recurring": find_recurring_failures(book),
        "coverage": measure_book_coverage(book),
        "calibration": calibrate_book(book),
        "replay": replay_book(book, since=dt.date(2025, 6, 1)),
        "route": reckon(resolve_route(book, draft_route(ROUTE))),
        "hostile": hostile_run(),
    }


def hostile_run() -> Run:
    """Return a run in which every free text tries to act."""
    return Run(
        scheme="CC(C)(C)OCCBr>>CC(C)(C)OCCN",
        conditions=dataclasses.replace(
            demo_plan().conditions,
            components=(Component(role=Role.ACID, name=HOSTILE, smiles="Cl"),),
            atmosphere=HOSTILE,
            workup=HOSTILE,
        ),
        outcome=Outcome(
            products=(ProductSeen(fate=Fate.OTHER, smiles="CC>evil", share=0.4),),
            dr=HOSTILE,
            failures=(Failure(mode="other", motif=HOSTILE),),
        ),
        verdict=Verdict.FAILED,
        note=HOSTILE,
        by=HOSTILE,
        project=HOSTILE,
        reference=HOSTILE,
        withdrawn_why=HOSTILE,
        attachments=(Attachment(name=HOSTILE, sha256="0" * 64, size_bytes=1),),
    )
