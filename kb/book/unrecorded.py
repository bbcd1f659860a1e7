"""A check without a record book: published chemistry, liabilities and cautions alone.

For whoever has no book yet. It opens nothing and writes nothing; the assessment rests on no run and says so.
"""

from __future__ import annotations

from typing import NoReturn

from kb.errors import RecordNotFound
from kb.logs import tame_rdkit
from kb.record.assessment import Assessment
from kb.record.plan import Plan


class _NoRuns:
    """A source of whole runs that holds none."""

    def get(self, code: str) -> NoReturn:
        """Raise: there are no runs."""
        raise RecordNotFound(f"No run is called {code}.", "There is no record book.", code)


def check_unrecorded(plan: Plan) -> Assessment:
    """Return the assessment of a plan against published chemistry alone."""
    tame_rdkit()
    from kb.assess.assessment import assess
    from kb.assess.record_view import RecordView
    from kb.assess.table import build_table, columns_of

    return assess(plan, RecordView(build_table(columns_of(())), [], [], _NoRuns()))
