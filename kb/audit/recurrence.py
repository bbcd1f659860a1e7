"""Recurring failures: what keeps going wrong, where, when, at what cost, and whether the record could have told.

It owns the clusters: failures of one mode at one generalised place (`places.py`), acid and strong base told apart
where both recur. For each it says how often and when, in which projects, what it cost in material and days as far as
recorded, which members had an earlier member under conditions no harsher, and which house rules cover it; and it
proposes a rule (`condition_line.py`) with its trial on the whole book. It ranks clusters by cost of material and
count, and never people: initials are not read.
"""

from __future__ import annotations

import datetime as dt
from collections import Counter, defaultdict
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kb.assess.forcing import Force, force_of, forces_as_much, forces_no_more
from kb.assess.house_rules import try_rule
from kb.assess.predicate import parse_predicate
from kb.assess.predicate_words import words_of
from kb.assess.record_view import RecordView
from kb.audit.condition_line import Line, propose_line
from kb.audit.failing import failed_rows, judged_rows, meaning_of
from kb.audit.places import Aspect, Place
from kb.audit.profile_table import ProfileTable
from kb.audit.recurrence_values import Circumstance, Cluster, Proposal, Recurrence
from kb.audit.siting import Sited, site_failures
from kb.errors import Cancelled
from kb.materials.profile import ConditionProfile
from kb.progress import Progress, Silent
from kb.store.values import HouseRule
from kb.vocabulary import Severity

RECURS = 2
"""Runs from which a failure recurs."""
STRONG_BASE_PKAH = 12.0
"""From here a base is strong enough to be told apart from an acid; judgement."""
_NOTHING_HAPPENED = frozenset({"no-reaction", "stalled"})
_FORCING = ("acidity", "lewis_acid", "base_pkah", "ionising", "temperature_c", "has_unknown_reagent")
"""What `kb.assess.forcing` compares."""


def find_recurring(
    view: RecordView,
    circumstances: Mapping[str, Circumstance] | None = None,
    house_rules: Sequence[HouseRule] = (),
    since: dt.date | None = None,
    progress: Progress | None = None,
    prepare_motifs: Callable[[Sequence[str], Progress], None] | None = None,
) -> Recurrence:
    """Find the recurring failures of a book.

    Args:
        view: the whole book.
        circumstances: project and scale by code; missing ones count as not recorded.
        house_rules: retired ones are passed over.
        since: count failures from this day on; earlier ones still serve as the earlier record.
        prepare_motifs: told which motifs will be asked of the view, to look for them all at once.

    Raises:
        Cancelled: the user stopped it.
    """
    progress = progress or Silent()
    failed = failed_rows(view)
    counted = failed & (view.table.date >= since.toordinal()) if since else failed
    rows = [row for row, pairs in enumerate(view.failures) if pairs]
    sited = site_failures(view, rows)
    finder = _Finder(view, circumstances or {}, [r for r in house_rules if not r.is_retired], counted)
    groups = [group for group in _grouped(view, sited) if sum(counted[r] or not since for r in group.rows) >= RECURS]
    if prepare_motifs is not None:
        prepare_motifs([g.place.smarts for g in groups if g.place.smarts], progress)
    clusters = []
    for number, group in enumerate(groups):
        if progress.cancelled():
            raise Cancelled("The audit was stopped.", "Nothing was changed.")
        clusters.append(finder.cluster(group, since))
        progress.advance(number + 1, len(groups), "recurring failures")
    clusters.sort(key=lambda c: (-c.lost_mmol, -len(c.runs), c.name))
    clustered = {code for c in clusters for code in c.runs}
    return Recurrence(
        clusters=tuple(clusters),
        runs=len(view.table),
        failures=int(counted.sum()),
        in_clusters=len(clustered),
        unplaced=sum(one.place is None for one in sited),
        since=since,
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Group:
    mode: str
    place: Place
    driver: str
    rows: tuple[int, ...]


def _grouped(view: RecordView, sited: Sequence[Sited]) -> list[_Group]:
    """Gather failures by mode and place; acid and strong base apart where both recur."""
    gathered: dict[tuple[str, tuple[str, ...]], list[Sited]] = defaultdict(list)
    for one in sited:
        if one.place is not None:
            gathered[(one.mode, one.place.key)].append(one)
    groups = []
    for (mode, _), members in gathered.items():
        drivers: dict[str, list[int]] = defaultdict(list)
        for one in members:
            drivers[_driver(view, one.row)].append(one.row)
        opposed = [d for d in ("acid", "base") if len(drivers.get(d, ())) >= RECURS]
        if len(opposed) == 2:
            larger = max(opposed, key=lambda d: len(drivers[d]))
            drivers[larger] += drivers.pop("", [])
            parts = {d: drivers[d] for d in opposed}
        else:
            parts = {"": [one.row for one in members]}
        place = members[0].place
        groups += [
            _Group(mode=mode, place=place, driver=driver, rows=tuple(sorted(set(rows))))
            for driver, rows in parts.items()
            if place is not None and len(set(rows)) >= RECURS
        ]
    return groups


def _driver(view: RecordView, row: int) -> str:
    table = view.table
    if "strong" in (table.word("acidity", row), table.word("lewis_acid", row)):
        return "acid"
    return "base" if table.numbers["base_pkah"][row] >= STRONG_BASE_PKAH else ""


class _Finder:
    """Turns gathered failures into clusters, with what they share on a book."""

    def __init__(
        self,
        view: RecordView,
        circumstances: Mapping[str, Circumstance],
        rules: Sequence[HouseRule],
        counted: NDArray[np.bool_],
    ) -> None:
        self.view = view
        self.table = view.table
        self.circumstances = circumstances
        self.rules = rules
        self.counted = counted
        self.profiles = ProfileTable(view)
        self.fine = judged_rows(view) & ~failed_rows(view)
        self._warned: dict[str, set[str]] = {}
        self._order: dict[tuple[int, int, bool], bool] = {}

    def cluster(self, group: _Group, since: dt.date | None) -> Cluster:
        """Describe one group of failures."""
        table, place = self.table, group.place
        every = sorted(group.rows, key=lambda r: (table.date[r] <= 0, table.date[r], r))
        shown = [r for r in every if self.counted[r]] if since else every
        dated = [dt.date.fromordinal(int(table.date[r])) for r in shown if table.date[r] > 0]
        here = self._at(place)
        successes = here[self.fine[here]]
        line = self._line(group, np.array(every, dtype=np.intp), successes)
        covered = self._covered(shown)
        lost, lost_runs = self._lost(shown)
        times = [t for r in shown if (t := table.number("time_h", r)) is not None]
        projects = Counter(p for r in shown if (p := self._circumstance(r).project))
        whole = bool(covered) and covered[0][1] == len(shown)
        return Cluster(
            name="/".join(part.replace(" ", "-") for part in (group.mode, *place.key[1:], group.driver) if part),
            mode=group.mode,
            meaning=meaning_of(group.mode),
            place=place.words,
            smarts=place.smarts,
            conditions=_conditions(line, self._first(place)),
            runs=tuple(table.codes[r] for r in shown),
            first=dated[0] if dated else None,
            last=dated[-1] if dated else None,
            quarters=tuple(sorted(Counter(f"{d.year}-Q{(d.month + 2) // 3}" for d in dated).items())),
            projects=tuple(sorted(projects.items(), key=lambda pair: (-pair[1], pair[0]))),
            lost_mmol=round(lost, 2),
            lost_mmol_runs=lost_runs,
            days=round(sum(times) / 24, 2),
            days_runs=len(times),
            repeats=tuple(self._repeats(group, every, set(shown))),
            came_through=tuple(table.codes[r] for r in successes),
            covered_by=covered,
            proposal=None if whole or line is None else self._proposal(group, line, every),
            example=self._example(shown[-1], place),
            foreseeable=place.aspect is not Aspect.HAND,
        )

    def _at(self, place: Place) -> NDArray[np.intp]:
        """Return the rows at a kind of place, failed or not."""
        if place.aspect is Aspect.HAND:
            return np.zeros(0, dtype=np.intp)
        if place.aspect is Aspect.PARTNER:
            words = np.array([*self.table.nucleophile_words, ""], dtype=object)
            return np.flatnonzero(words[self.table.nucleophile] == place.key[1])
        if place.aspect is Aspect.MEDIUM:
            first = self._first(place)
            rows = np.arange(len(self.table))
            return np.flatnonzero(self.profiles.holds(first, rows)) if first else rows[:0]
        return np.asarray(self.view.rows_with_motif(place.smarts), dtype=np.intp)

    def _line(self, group: _Group, members: NDArray[np.intp], successes: NDArray[np.intp]) -> Line | None:
        first = self._first(group.place)
        if group.place.aspect is Aspect.HAND or (not first and not group.place.smarts):
            return None  # nothing to hang a rule on
        return propose_line(self.profiles, members, successes, first, group.mode in _NOTHING_HAPPENED)

    def _first(self, place: Place) -> str:
        """Return the test that a place itself is told by, where it lies in the flask; "" = in the substrate."""
        fact = {Aspect.PARTNER: "nucleophile_class", Aspect.MEDIUM: "solvent"}.get(place.aspect)
        word = place.key[-1].replace("-", "_")
        if fact is None or word not in words_of(fact):  # a class that conditions have no word for
            return ""
        return f"{fact} == {word}" if place.aspect is Aspect.PARTNER else f"{fact} in ({word})"

    def _proposal(self, group: _Group, line: Line, rows: Sequence[int]) -> Proposal:
        codes = [self.table.codes[r] for r in rows]
        share = line.members / (line.members + line.alarms)
        severity = Severity.SERIOUS if share >= 0.75 and line.members >= 3 else Severity.CAUTION
        title = f"{group.mode.replace('-', ' ').capitalize()} at {group.place.words}"
        rule = HouseRule(
            title=title,
            motif=group.place.smarts,
            when=line.text,
            severity=severity,
            why=f"In {len(rows)} runs of this book: {meaning_of(group.mode)}.",
            author="audit",
            source="recurring failures: " + ", ".join(codes[:12]) + (" ..." if len(codes) > 12 else ""),
        )
        return Proposal(rule=rule, trial=try_rule(rule, self.view, self.profiles.told))

    def _covered(self, rows: Sequence[int]) -> tuple[tuple[str, int], ...]:
        found = []
        for rule in self.rules:
            if rule.rule_id not in self._warned:
                self._warned[rule.rule_id] = set(try_rule(rule, self.view, self.profiles.told).hits)
            count = sum(self.table.codes[r] in self._warned[rule.rule_id] for r in rows)
            if count:
                found.append((rule.rule_id, count))
        return tuple(sorted(found, key=lambda pair: (-pair[1], pair[0])))

    def _lost(self, rows: Sequence[int]) -> tuple[float, int]:
        """Return substrate lost [mmol] and over how many runs that is known: scale x (1 - yield)."""
        lost, known = 0.0, 0
        for row in rows:
            scale = self._circumstance(row).scale_mmol
            if scale is None:
                continue
            got = self.table.yield_pct[row]
            lost += scale * (1 - min(0.0 if np.isnan(got) else float(got) / 100, 1.0))
            known += 1
        return lost, known

    def _circumstance(self, row: int) -> Circumstance:
        return self.circumstances.get(self.table.codes[row], Circumstance())

    def _repeats(self, group: _Group, rows: Sequence[int], shown: set[int]) -> list[tuple[str, str]]:
        """Return (run, earlier run) for members that an earlier day's member under no harsher conditions preceded."""
        if group.place.aspect is Aspect.HAND:
            return []
        date, codes = self.table.date, self.table.codes
        dated = [r for r in rows if date[r] > 0]
        forces = self.profiles.alike(_FORCING, np.array(dated, dtype=np.intp))
        mild = group.mode in _NOTHING_HAPPENED
        found: list[tuple[str, str]] = []
        first_of: dict[int, tuple[int, ConditionProfile]] = {}  # the first member of each force, earliest first
        for row, (force, profile) in zip(dated, forces, strict=True):
            if row in shown:
                for other, (earlier, theirs) in first_of.items():
                    if date[earlier] < date[row] and self._is_as_forcing((force, other, mild), profile, theirs):
                        found.append((codes[row], codes[earlier]))
                        break
            first_of.setdefault(force, (row, profile))
        return found

    def _is_as_forcing(
        self, key: tuple[int, int, bool], profile: ConditionProfile, earlier: ConditionProfile
    ) -> bool:
        """Return whether conditions are as forcing as earlier ones; key: their numbers, and whether milder counts."""
        if key not in self._order:
            compare: Callable[[Force, Force], bool | None] = forces_no_more if key[2] else forces_as_much
            self._order[key] = compare(force_of(profile), force_of(earlier)) is True
        return self._order[key]

    def _example(self, row: int, place: Place) -> tuple[str, tuple[int, ...]]:
        from rdkit import Chem

        smiles = self.table.substrate[row]
        mol = self.view.mol(smiles)
        query = Chem.MolFromSmarts(place.smarts) if place.smarts else None
        atoms = tuple(mol.GetSubstructMatch(query)) if mol is not None and query is not None else ()
        return smiles, atoms


def _conditions(line: Line | None, first: str) -> str:
    """Return a line in plain words, without the sentence round it and without what the place says already."""
    text = line.text.removeprefix(first).removeprefix(" and ") if line is not None else ""
    if not text:
        return ""
    said = parse_predicate(text).as_sentence()
    return said.removeprefix("Applies when ").removesuffix(".").removesuffix(" (numbers are judged limits)")
