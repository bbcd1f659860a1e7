"""Findings about the data itself: what is missing, impossible or at odds with itself in a plan or a run.

It owns checks that need no chemistry beyond the catalogue. They are notes, or cautions where a wrong number could
spoil the step.
"""

from __future__ import annotations

from kb.record.finding import Finding
from kb.record.outcome import Outcome
from kb.record.plan import Plan
from kb.store.derivation import Account
from kb.vocabulary import FindingKind, Severity

ADDS_UP_WITHIN = 0.03
"""How far a split may miss 100 % before it is said; integrals are rarely better than 3 %, common practice."""
_PRACTICE = "common practice"


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
    findings += _temperature_findings(account)
    if profile.acidity == "strong" and profile.base_pkah is not None and profile.base_pkah > 4:
        findings.append(
            _note(
                "data:acid-and-base",
                Severity.CAUTION,
                "Acid and base together",
                f"{profile.acid_name or 'A strong acid'} and {profile.base_name or 'a base'} (pKaH "
                f"{profile.base_pkah:.1f}) will neutralise each other; say which is in excess, or record two steps.",
            )
        )
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


def _temperature_findings(account: Account) -> list[Finding]:
    profile = account.profile
    findings = []
    if profile.temperature_c is not None and profile.bp_c is not None and profile.temperature_c > profile.bp_c + 3:
        findings.append(
            _note(
                "data:above-boiling-point",
                Severity.CAUTION,
                "Above the solvent's boiling point",
                f"{profile.temperature_c:.0f} °C against a boiling point of {profile.bp_c:.0f} °C: only in a vessel "
                "rated for the pressure, and by your local rules; otherwise the bath temperature is not the pot's.",
            )
        )
    if (
        profile.temperature_low_c is not None
        and profile.mp_c is not None
        and profile.temperature_low_c < profile.mp_c - 1
    ):
        findings.append(
            _note(
                "data:below-melting-point",
                Severity.CAUTION,
                "Below the solvent's melting point",
                f"{profile.temperature_low_c:.0f} °C against a melting point of {profile.mp_c:.0f} °C: the pot may "
                "freeze; add a co-solvent.",
            )
        )
    return findings


def _note(rule_id: str, severity: Severity, title: str, why: str) -> Finding:
    return Finding(rule_id=rule_id, kind=FindingKind.DATA, severity=severity, title=title, why=why, source=_PRACTICE)
