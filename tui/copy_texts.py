"""Plans, assessments and runs as SMILES, Markdown and JSON for the clipboard. Pure."""

from __future__ import annotations

import json
from typing import Any

from kb.record.assessment import Assessment
from kb.record.portable import run_to_dict
from kb.record.run import Run
from tui.present import (
    FATE_WORDS,
    advice_line,
    conditions_words,
    estimate_rest,
    evidence_words,
    finding_line,
    interval_words,
    percent,
    precedent_cells,
    reading_words,
    run_lines,
)


def assessment_texts(assessment: Assessment) -> dict[str, str]:
    """Return a checked plan in the three kinds."""
    plan = assessment.plan
    lines = [
        "## Planned step",
        "",
        f"`{_ticked(plan.scheme)}`",
        "",
        f"{conditions_words(plan.conditions)}  ",
        reading_words(assessment.reading),
        "",
        "| expected | share | 80 % interval |",
        "|---|---|---|",
        *(
            f"| {FATE_WORDS[fate]} | {percent(share.mean)} | {interval_words(share)} |"
            for fate, share in assessment.estimate.fates
        ),
        "",
        estimate_rest(assessment.estimate),
        "",
        "### Findings",
        *(f"- {_cell(finding_line(f))}. {_cell(evidence_words(f.evidence, f.kind))}" for f in assessment.findings),
        "",
        "### Closest runs",
        "| run | likeness | split, % | what differs | yield | verdict |",
        "|---|---|---|---|---|---|",
        *("| " + " | ".join(_cell(c) for c in precedent_cells(p)) + " |" for p in assessment.precedents),
        "",
        "### One change",
        *(f"- {_cell(change)}: {effect}" for change, effect in map(advice_line, assessment.advice)),
        "",
        "An estimate is no permission: local safety rules and qualified people decide.",
    ]
    return {"SMILES": plan.scheme, "Markdown": "\n".join(lines), "JSON": _json(assessment.as_dict())}


def run_texts(run: Run) -> dict[str, str]:
    """Return a run in the three kinds."""
    lines = [f"## Run {run.code or ''}".rstrip(), ""]
    lines.extend(f"- **{word}**: {_cell(value)}" for word, value in run_lines(run) if word != "scheme")
    lines.extend(["", f"`{_ticked(run.scheme)}`"])
    return {"SMILES": run.scheme, "Markdown": "\n".join(lines), "JSON": _json(run_to_dict(run))}


def audit_texts(audit: Any, markdown: str, smiles: str = "") -> dict[str, str]:
    """Return an audit as Markdown and JSON, and the structure it is about as SMILES where there is one."""
    texts = {"SMILES": smiles} if smiles else {}
    return texts | {"Markdown": markdown, "JSON": _json(audit.as_dict())}


def _json(data: Any) -> str:
    return json.dumps(data, ensure_ascii=False, indent=2, default=str)


def _cell(text: str) -> str:
    """Return text that stays inside a table cell or a list item of Markdown."""
    return text.replace("|", "\\|").replace("\n", " ").replace("<", "&lt;")


def _ticked(text: str) -> str:
    return text.replace("`", "'").replace("\n", " ")
