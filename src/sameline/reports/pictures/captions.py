"""What a picture says of itself, so that pasted elsewhere it is still honest."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

from sameline.records.answers import ANSWERED, Conclusion
from sameline.reports.changes import look_words
from sameline.reports.differ import LOOKS_WORDS, MODEL_WORDS, PROCEDURE_WORDS
from sameline.reports.text import count, moment, percent, plain

if TYPE_CHECKING:
    from sameline.reports.pictures.content import DrawnRun, Shown
    from sameline.reports.subject import Subject

SAFETY = (
    "Safety-critical: this concerns the results of the batches tested. It releases no part; the product standard, "
    "local codes and a competent person decide."
)
NOTHING_ASIDE = "Nothing is set aside."


def conclusion_caption(
    conclusion: Conclusion, subject: Subject, runs: Sequence[DrawnRun], shown: str, *, behind: bool = False
) -> str:
    """Everything a reader must know of a conclusion's picture.

    Args:
        conclusion: what is shown.
        subject: what it is about.
        runs: that it rests on, those set aside too.
        shown: what the marks mean, in sentences.
        behind: whether the comparison is behind the records.
    """
    answer = conclusion.answer
    parts = [
        shown,
        question_words(subject),
        f"Version {conclusion.version}, {look_words(conclusion.look)}; {data_words(conclusion)}.",
        f"Records up to ledger entry {conclusion.position}.",
        f"Concluded {moment(conclusion.at)}, entry {conclusion.entry}.",
        aside_words(runs, [c.text for c in answer.cautions if c.code == "set aside"]),
    ]
    if behind:
        parts.insert(0, "BEHIND: records were changed since this was concluded.")
    if answer.state != ANSWERED:
        parts.insert(0, f"Not computed: {answer.reason}.")
    parts += [_sentence(c.text) for c in answer.cautions if c.code != "set aside"]
    if answer.guarantee:
        parts.append(f"The error rate is {answer.guarantee}.")
    if subject.safety_critical:
        parts.append(SAFETY)
    return " ".join(part for part in parts if part)


def question_words(subject: Subject) -> str:
    """What was asked, how, and at what error rate."""
    revision = subject.revision
    method = f", {subject.method}" if subject.method else ""
    how = f"{PROCEDURE_WORDS[revision.procedure]} {MODEL_WORDS[revision.model]}"
    unit = "" if revision.model == "nested" else f" of {revision.unit} values"
    rate = LOOKS_WORDS[revision.looks].format(rate=percent(revision.alpha), units=revision.final_units)
    margin = "no margin stated" if subject.margin is None else f"margin {plain(subject.margin)} {subject.unit}"
    of = f" Groups: {subject.filter}." if subject.filter else ""
    side = "" if revision.alternative == "two-sided" else f", one-sided ({revision.alternative})"
    what = f"{named(subject.name, subject.characteristic)} in {subject.unit}{method}"
    return f"{what}.{of} {how}{unit}{side}; {rate}; {margin}."


def named(name: str, code: str) -> str:
    """A name with its code, or the name alone where they are the same."""
    return name if name == code else f"{name} ({code})"


def data_words(conclusion: Conclusion) -> str:
    """How much it rests on."""
    answer = conclusion.answer
    filled = sum(g.runs > 0 for g in answer.groups)
    return f"n: {count(answer.runs, 'run')}, {count(answer.replicates, 'value')} in {count(filled, 'group')}"


def shown_caption(shown: Shown, marks: str, runs: Sequence[DrawnRun] | None = None) -> str:
    """What a reader must know of results shown as recorded."""
    from sameline.reports.pictures.content import counted

    entering, values = counted(shown.runs)
    method = f", {shown.method}" if shown.method else ""
    parts = [
        marks,
        f"{named(shown.name, shown.characteristic)} in {shown.unit}{method}; {shown.filter}.",
        f"n: {count(entering, 'run')}, {count(values, 'value')}.",
        "Procedure: none; nothing is tested here, so no error rate and no look applies." if runs is None else "",
        f"Records up to ledger entry {shown.position}.",
        aside_words(shown.runs, ()),
    ]
    if shown.left_out:
        parts.insert(
            1, f"Of {count(shown.left_out + _columns(shown), 'batch', 'batches')} the newest {_columns(shown)}."
        )
    if shown.safety_critical:
        parts.append(SAFETY)
    return " ".join(part for part in parts if part)


def _columns(shown: Shown) -> int:
    return len({run.column for run in shown.runs})


def aside_words(runs: Sequence[DrawnRun], effects: Iterable[str]) -> str:
    """What is set aside, for which causes, and what putting it back would do, where that is known."""
    causes = Counter(v.aside for run in runs for v in run.values if v.aside is not None)
    if not causes:
        return NOTHING_ASIDE
    said = "; ".join(f"{count(n, 'value')}: {cause}" for cause, n in sorted(causes.items()))
    effect = " ".join(_sentence(text) for text in effects)
    return f"Set aside ({said}). {effect}".strip()


def _sentence(text: str) -> str:
    return text[:1].upper() + text[1:].rstrip(".") + "."
