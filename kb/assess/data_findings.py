"""Findings about the data itself: what is missing, impossible or at odds with itself in a plan or a run.

It owns checks that need no chemistry beyond the catalogue. They are notes, or cautions where a wrong number could
spoil the step.
"""

from __future__ import annotations

from kb.assess.caution_mixture import is_vessel_closed
from kb.record.finding import Finding
from kb.record.outcome import Outcome
from kb.record.plan import Plan
from kb.store.derivation import Account
from kb.vocabulary import FindingKind, Role, Severity

ADDS_UP_WITHIN = 0.03
"""How far a split may miss 100 % before it is said; integrals are rarely better than 3 %, common practice."""
ABOVE_BY_K = 3.0
BELOW_BY_K = 1.0
WEAKEST_BASE_PKAH = 4.0
"""From here a base takes the proton of a strong acid; common practice."""
_PRACTICE = "common practice"
ABOVE_BOILING = "data:above-boiling-point"


def find_data_findings(plan: Plan, account: Account) -> tuple[Finding, ...]:
    """Return what is missing or impossible in a plan's conditions."""
    findings: list[Finding] = []
    conditions, profile = plan.conditions, account.profile
    if not account.reading.ok or account.reading.centre is None:
        findings.append(
            _note(
                "data:not-read",
                Severity.CAUTION,
                "The scheme was not read",
                account.reading.reason or "No centre.",
            )
        )
    if conditions.temperature is None:
        findings.append(
            _note(
                "data:no-temperature",
                Severity.NOTE,
                "No temperature given",
                "Rules that depend on temperature cannot be told; precedents are compared without it.",
            )
        )
    if profile.has_unknown_solvent:
        findings.append(
            _note(
                "data:no-solvent",
                Severity.NOTE,
                "Solvent not given or not known",
                "The medium decides much here.",
            )
        )
    if profile.has_unknown_reagent:
        findings.append(
            _note(
                "data:unknown-reagent",
                Severity.NOTE,
                "A reagent is not in the catalogue",
                "Rules that ask for the absence of an acid, base or metal cannot be told. Check by hand.",
            )
        )
    findings += _temperature_findings(plan, account)
    findings += _acid_and_base(plan, account)
    return tuple(findings)


def find_outcome_findings(outcome: Outcome) -> tuple[Finding, ...]:
    """Return what does not add up in a recorded outcome."""
    findings = []
    split = outcome.split
    total = sum(split.values())
    if split and abs(total - 1) > ADDS_UP_WITHIN:
        findings.append(
            _note(
                "data:split-sum",
                Severity.CAUTION,
                "The split does not add up",
                f"The shares make {100 * total:.0f} %. Kept as written; comparisons scale it to 100 %.",
            )
        )
    if outcome.yield_pct is not None and outcome.yield_pct > 100:
        findings.append(
            _note(
                "data:yield-over-100",
                Severity.CAUTION,
                "Yield over 100 %",
                f"{outcome.yield_pct:.0f} % recorded: wet or impure product? Counted as 100 % in estimates.",
            )
        )
    return tuple(findings)


def _temperature_findings(plan: Plan, account: Account) -> list[Finding]:
    profile = account.profile
    findings = []
    is_closed = is_vessel_closed(plan.conditions.vessel)
    hot, cold = profile.temperature_c, profile.temperature_low_c
    if hot is not None and profile.bp_c is not None and hot > profile.bp_c + ABOVE_BY_K and is_closed is not True:
        where = "In an open vessel" if is_closed is False else "Unless the vessel is closed"
        findings.append(
            _note(
                "data:above-boiling-point",
                Severity.CAUTION,
                "Above the solvent's boiling point",
                f"{hot:.0f} °C against a boiling point of {profile.bp_c:.0f} °C. {where} the pot stays at the boiling "
                "point, whatever the bath says; a closed vessel must be rated for the pressure, by your local rules.",
            )
        )
    if cold is not None and profile.mp_c is not None and cold < profile.mp_c - BELOW_BY_K:
        findings.append(
            _note(
                "data:below-melting-point",
                Severity.CAUTION,
                "Below the solvent's melting point",
                f"{cold:.0f} °C against a melting point of {profile.mp_c:.0f} °C: the pot may freeze; add a "
                "co-solvent.",
            )
        )
    return findings


def _acid_and_base(plan: Plan, account: Account) -> list[Finding]:
    """Return the finding that an acid and a base were given for one flask, with what is taken to be left of them."""
    profile = account.profile
    given = {role: [c.name for c in plan.conditions.components if c.role is role] for role in (Role.ACID, Role.BASE)}
    is_strong = profile.acidity == "strong" and profile.base_pkah is not None and profile.base_pkah > WEAKEST_BASE_PKAH
    if not is_strong and not (given[Role.ACID] and given[Role.BASE]):
        return []
    acid = given[Role.ACID][0] if given[Role.ACID] else profile.acid_name or "a strong acid"
    base = given[Role.BASE][0] if given[Role.BASE] else profile.base_name or "a base"
    left = [word for word in (profile.acid_name, profile.base_name) if word] or ["neither"]
    return [
        _note(
            "data:acid-and-base",
            Severity.CAUTION,
            "Acid and base together",
            f"{acid} and {base} neutralise each other; taken to be left here: {' and '.join(left)}. Give equivalents "
            "of both, or two steps.",
        )
    ]


def _note(rule_id: str, severity: Severity, title: str, why: str) -> Finding:
    return Finding(rule_id=rule_id, kind=FindingKind.DATA, severity=severity, title=title, why=why, source=_PRACTICE)
