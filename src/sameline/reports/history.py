"""How a conclusion came about: its versions, the audit trail, and the report of a verification."""

from __future__ import annotations

from collections.abc import Sequence

from sameline.conclusions.recompute import CHECKS, Verification
from sameline.records.answers import ANSWERED, Conclusion
from sameline.records.trail import TrailEntry
from sameline.reports.changes import look_words, tally, turn_words
from sameline.reports.text import count, listed, moment, p_value, table


def history_text(versions: Sequence[Conclusion]) -> list[str]:
    """The versions of one comparison's conclusion, oldest first, with what turned at each and why."""
    lines: list[str] = []
    for c in versions:
        said = tally(c) if c.answer.state == ANSWERED else f"not computed: {c.answer.reason}"
        causes = f"after {'entry' if len(c.causes) == 1 else 'entries'} {listed([str(n) for n in c.causes])}"
        lines.append(f"v{c.version}, {look_words(c.look)}: {moment(c.at)}, {c.person}, entry {c.entry} ({causes})")
        lines.append(f"    {said}")
        lines += [f"    {turn_words(turn, c.version)}, because of {turn.because}" for turn in c.turns]
        lines += _evidence(c)
    return lines


def _evidence(conclusion: Conclusion) -> list[str]:
    """The pair with the strongest evidence, and what the look alone would have said of its strongest."""
    judged = [p for p in conclusion.answer.pairs if p.p_value is not None]
    alone = [p for p in judged if p.single_look_p is not None]
    if not judged or not alone:
        return []
    first = min(judged, key=lambda p: p.p_value or 0.0)
    least = min(alone, key=lambda p: p.single_look_p or 0.0)
    said = f"this look alone {p_value(least.single_look_p)} ({least.a} and {least.b})"
    if (first.p_value or 0.0) < 1:
        said = f"strongest evidence: {first.a} and {first.b}, overall p {p_value(first.p_value)}; {said}"
    return [f"    {said}"]


def trail_text(entries: Sequence[TrailEntry]) -> list[str]:
    """The audit trail as a table: who did what, when, to what, and why."""
    rows = [(str(e.number), moment(e.at), e.person, e.act, _to_what(e) + _why(e)) for e in entries]
    return table(("entry", "recorded", "person", "act", "to what, and why"), rows, "><<<<", indent="")


def _to_what(entry: TrailEntry) -> str:
    said = ", ".join(entry.about) or "the store"
    counts = [count(entry.rows[name], word) for name, word in _COUNTED.items() if name in entry.rows]
    return f"{said} ({', '.join(counts)})" if counts else said


_COUNTED = {"run": "run", "measurement": "value"}


def _why(entry: TrailEntry) -> str:
    return f": {entry.reason}" if entry.reason else ""


def verification_text(report: Verification) -> list[str]:
    """What was checked, by number, with every finding under its check."""
    ledger = report.ledger
    sizes = (
        count(ledger.entries, "entry", "entries"),
        count(ledger.rows, "row"),
        count(report.conclusions, "conclusion"),
    )
    lines = [f"{', '.join(sizes)} checked"]
    for number, what in enumerate(CHECKS, 1):
        found = [f for f in report.findings if f.check == number]
        lines.append(f"{number}. {what}: {'good' if not found else count(len(found), 'finding')}")
        lines += [f"     {finding}" for finding in found]
    lines.append(f"root of the ledger: {ledger.root}")
    if report.behind:
        lines.append(f"behind, and said so: {listed(list(report.behind))}; the next act brings them up to date")
    return lines
