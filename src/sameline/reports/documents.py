"""Results as JSON documents for other programs: the names here are stable."""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

from sameline.conclusions.recompute import CHECKS, Verification
from sameline.records.answers import Conclusion
from sameline.records.trail import TrailEntry
from sameline.reports.changes import change_line
from sameline.reports.lines import drawn_lines
from sameline.reports.subject import Subject


def conclusion_document(conclusion: Conclusion, subject: Subject, *, behind: bool) -> dict[str, Any]:
    """One conclusion with its question and all its figures."""
    revision = subject.revision
    answer = asdict(conclusion.answer)
    answer["inputs"] = conclusion.answer.inputs.hex()
    return {
        "comparison": conclusion.name,
        "version": conclusion.version,
        "look": conclusion.look,
        "recorded_at": conclusion.at,
        "entry": conclusion.entry,
        "position": conclusion.position,
        "person": conclusion.person,
        "behind": behind,
        "question": {
            "revision": revision.revision,
            "characteristic": subject.characteristic,
            "name": subject.name,
            "method": subject.method,
            "unit": subject.unit,
            "limits": {"lower": subject.lower, "upper": subject.upper},
            "margin": subject.margin,
            "grouping": revision.grouping,
            "filter": subject.filter,
            "model": revision.model,
            "procedure": revision.procedure,
            "units": revision.unit if revision.model != "nested" else None,
            "alpha": revision.alpha,
            "alternative": revision.alternative,
            "looks": revision.looks,
            "safety_critical": subject.safety_critical,
        },
        "causes": list(conclusion.causes),
        "turns": [asdict(turn) for turn in conclusion.turns],
        **answer,
        "lines": list(drawn_lines(conclusion.answer.groups).values()),
    }


def overview_document(rows: list[tuple[str, Conclusion | None, bool]]) -> list[dict[str, Any]]:
    """Every comparison with its latest conclusion in short."""
    return [
        {
            "comparison": name,
            "behind": behind,
            "version": c.version if c else None,
            "look": c.look if c else None,
            "recorded_at": c.at if c else None,
            "state": c.answer.state if c else None,
            "reason": c.answer.reason if c else None,
            "pairs": len(c.answer.pairs) if c else None,
            "differ": sum(bool(p.differs) for p in c.answer.pairs) if c else None,
        }
        for name, c, behind in rows
    ]


def history_document(versions: list[Conclusion]) -> list[dict[str, Any]]:
    """The versions of one comparison's conclusion in short, oldest first."""
    return [
        {
            "version": c.version,
            "look": c.look,
            "recorded_at": c.at,
            "entry": c.entry,
            "person": c.person,
            "causes": list(c.causes),
            "state": c.answer.state,
            "reason": c.answer.reason,
            "turns": [asdict(turn) for turn in c.turns],
            "pairs": [asdict(pair) for pair in c.answer.pairs],
        }
        for c in versions
    ]


def outcome_document(entry: int, runs: tuple[int, ...], conclusions: tuple[Conclusion, ...]) -> dict[str, Any]:
    """What an act did."""
    changed = [{"comparison": c.name, "version": c.version, "change": change_line(c)} for c in conclusions]
    return {"entry": entry, "runs": list(runs), "comparisons": changed}


def trail_document(entries: list[TrailEntry]) -> list[dict[str, Any]]:
    """The audit trail."""
    return [asdict(entry) for entry in entries]


def verification_document(report: Verification) -> dict[str, Any]:
    """What was checked and found."""
    return {
        "good": not report.findings,
        "entries": report.ledger.entries,
        "rows": report.ledger.rows,
        "conclusions": report.conclusions,
        "root": report.ledger.root,
        "checks": list(CHECKS),
        "findings": [{**asdict(finding), "text": str(finding)} for finding in report.findings],
        "behind": list(report.behind),
    }
