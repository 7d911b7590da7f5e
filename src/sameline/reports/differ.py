"""The answer to "which differ?", for a terminal: one comparison in full, or all of them in a table."""

from __future__ import annotations

from collections.abc import Sequence

from sameline.records.answers import ANSWERED, Answer, Conclusion, GroupAnswer, PairAnswer
from sameline.reports.changes import look_words, tally
from sameline.reports.lines import bars, by_mean, drawn_lines
from sameline.reports.subject import Subject
from sameline.reports.text import count, interval, moment, number, p_value, percent, plain, table

_MATTERS = "differs and matters"

MODEL_WORDS = {
    "nested": "on the nested model",
    "pooled": "with one common spread",
    "unequal": "with a spread for each group",
    "ranks": "on ranks",
}
PROCEDURE_WORDS = {
    "tukey-kramer": "Tukey-Kramer",
    "dunnett": "Dunnett",
    "bonferroni": "Bonferroni",
    "holm": "Holm",
    "sidak": "Šidák",
    "games-howell": "Games-Howell",
    "welch-holm": "Welch with Holm",
    "steel-dwass": "Steel-Dwass",
    "dunn": "Dunn with Holm",
}
LOOKS_WORDS = {
    "open": "error rate {rate} over all pairs and all looks, however many",
    "planned": "error rate {rate} over all pairs and all looks up to {units} units",
    "single": "error rate {rate} over all pairs, at one look",
}
_NESTING = {
    "batch": "run within batch",
    "material": "run within batch within material",
    "supplier": "run within batch within supplier",
}
_UNITS = {"run": "run means", "batch": "batch means", "replicate": "replicates"}


def differ_text(conclusion: Conclusion, subject: Subject, *, behind: bool, all_pairs: bool = False) -> list[str]:
    """One conclusion in full.

    Args:
        conclusion: the conclusion.
        subject: what it is about.
        behind: whether its comparison is behind the records.
        all_pairs: whether pairs that are not shown to differ are listed too.
    """
    answer = conclusion.answer
    lines = [*_head(conclusion, subject), ""]
    if behind:
        lines += ["  BEHIND: records were changed since; the next act brings it up to date.", ""]
    if answer.state != ANSWERED:
        lines += [f"  Not computed: {answer.reason}", ""]
        lines += [*_groups(answer.groups, subject, drawn=False), ""]
    else:
        lines += [*_groups(answer.groups, subject, drawn=answer.display == "lines"), ""]
        lines += [*_legend(conclusion), ""]
        lines += [*_pairs(conclusion, subject, all_pairs=all_pairs), ""]
        lines += _spread(conclusion, subject)
    lines += _cautions(conclusion, subject)
    while lines and not lines[-1]:
        lines.pop()
    return lines


def contrast_text(conclusion: Conclusion, naive: Answer, subject: Subject, unit: str) -> list[str]:
    """What a single look would have said that takes each unit as independent evidence, beside what was concluded."""
    words = f"For contrast, a single look at {percent(subject.revision.alpha)} that takes {_UNITS[unit]} as independent"
    if naive.state != ANSWERED:
        return ["", f"  {words} could not be computed: {naive.reason}."]
    concluded = {(p.a, p.b): p.verdict for p in conclusion.answer.pairs}
    decimals = subject.decimals + 1
    rows = [
        (*_pair_row(p, decimals), concluded.get((p.a, p.b), "–"))
        for p in naive.pairs
        if p.differs or p.verdict != concluded.get((p.a, p.b))
    ]
    if not rows:
        return ["", f"  {words} would say the same of every pair."]
    confidence = percent(1 - subject.revision.alpha)
    headings = ("pair", "difference", f"{confidence} interval", "p-value", "it would say", "concluded")
    return ["", f"  {words} would say:", *table(headings, rows, "<><><<")]


def single_look_text(conclusion: Conclusion, subject: Subject) -> list[str]:
    """What each pair's look would have said had it been the only one, beside what was concluded."""
    rows = [
        (f"{p.b} minus {p.a}", p_value(p.single_look_p), p_value(p.p_value), verdict_words(p))
        for p in conclusion.answer.pairs
    ]
    rate = percent(subject.revision.alpha)
    words = f"  For contrast, this look alone: below {rate} a single look would have claimed the difference."
    return ["", words, *table(("pair", "p-value alone", "overall p", "concluded"), rows, "<>><")]


def overview_text(rows: Sequence[tuple[str, Conclusion | None, bool]]) -> list[str]:
    """Every comparison in one table."""
    if not rows:
        return ["No comparison has been stated. `sameline compare NAME --characteristic CODE …` states one."]
    cells = [_overview_row(*row) for row in rows]
    return table(("comparison", "version", "look", "runs", "recorded", "answer"), cells, "<>>><<", indent="")


def _overview_row(name: str, conclusion: Conclusion | None, behind: bool) -> tuple[str, ...]:
    late = "BEHIND: " if behind else ""
    if conclusion is None:
        return name, "–", "–", "–", "–", f"{late}no conclusion yet"
    answer = conclusion.answer
    said = tally(conclusion) if answer.state == ANSWERED else f"not computed: {answer.reason}"
    return (
        name,
        f"v{conclusion.version}",
        str(conclusion.look or "–"),
        str(answer.runs),
        conclusion.at[:10],
        late + said,
    )


def _head(conclusion: Conclusion, subject: Subject) -> list[str]:
    revision = subject.revision
    named = subject.characteristic if subject.name == subject.characteristic else None
    about = f"{named or f'{subject.name} ({subject.characteristic})'}, {subject.unit}"
    how = f"{PROCEDURE_WORDS[revision.procedure]} {MODEL_WORDS[revision.model]}"
    units = _NESTING[revision.grouping] if revision.model == "nested" else f"of {_UNITS[revision.unit]}"
    margin = f"margin {plain(subject.margin)} {subject.unit}" if subject.margin is not None else "no margin stated"
    answer = conclusion.answer
    data = f"{count(answer.runs, 'run')} and {count(answer.replicates, 'value')}"
    recorded = f"recorded {moment(conclusion.at)} by {conclusion.person}, entry {conclusion.entry}"
    lines = [
        f"{conclusion.name}: {about}",
        f"  {how} ({units}); {margin}",
        f"  {LOOKS_WORDS[revision.looks].format(rate=percent(revision.alpha), units=revision.final_units)}",
        f"  version {conclusion.version}, {look_words(conclusion.look)}, on {data}; {recorded}",
    ]
    if subject.method:
        lines.insert(1, f"  measured by {subject.method}")
    if subject.filter:
        lines.append(f"  groups: {subject.filter}")
    return lines


def _groups(groups: Sequence[GroupAnswer], subject: Subject, *, drawn: bool) -> list[str]:
    """The groups in order of mean, and beside them the lines: a bar runs along the groups that stand on one line."""
    decimals = subject.decimals + 1
    known = by_mean(groups)
    empty = [g for g in groups if g.mean is None]
    lines = list(drawn_lines(groups))
    rows = [
        (
            g.label,
            str(g.runs),
            str(g.replicates),
            number(g.mean, decimals),
            number(g.sd, decimals + 1),
            interval(g.lower, g.upper, decimals),
            bars(g, lines) if drawn else g.letters,
        )
        for g in (*known, *empty)
    ]
    confidence = percent(1 - subject.revision.alpha)
    headings = (
        subject.revision.grouping,
        "runs",
        "values",
        "mean",
        "sd of units",
        f"{confidence} interval of the mean",
        "lines" if drawn else "letters" if lines else "",
    )
    return table(headings, rows, "<>>>><<")


def _legend(conclusion: Conclusion) -> list[str]:
    display = conclusion.answer.display
    if display == "lines":
        return ["  Groups along one bar are not shown to differ."]
    if display == "letters":
        return ["  Groups that share a letter are not shown to differ."]
    if display == "control":
        return ["  Each group is compared with the control only."]
    return ["  Too many overlapping sets for lines: read the pairs."]


def _pairs(conclusion: Conclusion, subject: Subject, *, all_pairs: bool) -> list[str]:
    pairs = conclusion.answer.pairs
    shown = [p for p in pairs if all_pairs or p.differs]
    rest = len(pairs) - len(shown)
    if not shown:
        if len(pairs) == 1:
            return [f"  The one pair is not shown to differ: {pairs[0].verdict}.", "  --all shows its interval."]
        words = f"  None of the {len(pairs)} pairs is shown to differ ({tally(conclusion)})."
        return [words, "  --all lists them with their intervals."]
    decimals = subject.decimals + 1
    rows = [_pair_row(p, decimals) for p in shown]
    confidence = percent(1 - subject.revision.alpha)
    once = subject.revision.looks == "single"
    width = "simultaneous interval" if once else "interval over all looks"
    headings = ("pair", "difference", f"{confidence} {width}", "p-value" if once else "overall p", "verdict")
    lines = table(headings, rows, "<><><")
    lines += [
        f"  * {p.a} and {p.b} were shown to differ at an earlier look; the data of this look alone would not show it."
        for p in shown
        if p.receded
    ]
    if rest:
        lines.append(f"  {tally(conclusion)}; --all lists the other pairs too.")
    return lines


def _pair_row(p: PairAnswer, decimals: int) -> tuple[str, ...]:
    return (
        f"{p.b} minus {p.a}",
        number(p.difference, decimals),
        interval(p.lower, p.upper, decimals),
        p_value(p.p_value),
        verdict_words(p),
    )


def verdict_words(p: PairAnswer) -> str:
    """The verdict on a pair as it stands in a table."""
    if p.reason:
        return f"{p.verdict}: {p.reason}"
    if p.verdict == "equivalent" and p.differs:
        return "equivalent: differs, by less than matters"
    return p.verdict.upper() if p.verdict == _MATTERS else p.verdict


def _spread(conclusion: Conclusion, subject: Subject) -> list[str]:
    components = conclusion.answer.components
    if not components:
        return []
    decimals = subject.decimals + 2
    said = ", ".join(f"{c.level} to {c.level} {number(c.variance**0.5, decimals)}" for c in components)
    return [f"  Spread as standard deviations ({subject.unit}): {said}.", ""]


def _cautions(conclusion: Conclusion, subject: Subject) -> list[str]:
    texts = [c.text for c in conclusion.answer.cautions]
    if conclusion.answer.guarantee:
        texts.append(f"the error rate over all looks is {conclusion.answer.guarantee}")
    if subject.safety_critical:
        texts.append(
            "safety-critical: this concerns the mean results of the lots tested. It releases no part; the product "
            "standard, local codes and a competent person decide"
        )
    return ["  Cautions:", *(f"  * {text}" for text in texts)] if texts else []
