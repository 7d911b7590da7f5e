"""A second look at the data behind a conclusion, as text and as a document."""

from __future__ import annotations

from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from sameline.reports.text import interval, number, p_value, percent, table

if TYPE_CHECKING:
    from sameline.conclusions.diagnosis import Diagnosis
    from sameline.records.answers import Conclusion
    from sameline.reports.subject import Subject
    from sameline.stats import DiagnosticTest, OverallTest

_NAMES = {
    "one-way anova": "all groups alike, one common spread (analysis of variance)",
    "welch": "all groups alike, each its own spread (Welch)",
    "kruskal-wallis": "all groups alike, by ranks (Kruskal-Wallis)",
    "levene-median": "equal spread (Levene, on medians)",
    "levene-mean": "equal spread (Levene, on means)",
    "bartlett": "equal spread (Bartlett)",
    "shapiro-wilk": "normal shape (Shapiro-Wilk, on residuals)",
    "grubbs": "Grubbs",
    "cochran": "Cochran's C",
    "mandel-h": "Mandel's h",
    "mandel-k": "Mandel's k",
}


def diagnosis_text(found: Diagnosis, conclusion: Conclusion, subject: Subject) -> list[str]:
    """Tests of all groups, of spread and shape, of equivalence, and what stands out."""
    lines = [f"{conclusion.name} v{conclusion.version}, a second look at its data: tests on {found.unit}", ""]
    rows = [
        (_NAMES[test.name], f"{test.statistic:.4g}", _df(test.df1, test.df2), p_value(test.p_value))
        for test in _tests(found)
    ]
    lines += [*table(("", "statistic", "df", "p-value"), rows, "<>>>"), ""]
    lines += _equivalence(found, subject)
    lines += _suspects(found)
    if found.not_computed:
        lines += ["", "  Not computed:"]
        lines += [f"  * {_NAMES.get(name, name)}: {why}" for name, why in found.not_computed.items()]
    lines += [
        "",
        "  These inform; none of them chooses a procedure or sets anything aside. Only a person does, with a cause.",
    ]
    return lines


def _tests(found: Diagnosis) -> list[OverallTest | DiagnosticTest]:
    return [*found.overall, *found.diagnostics]


def _df(first: float | None, second: float | None) -> str:
    return ", ".join(f"{df:.4g}" for df in (first, second) if df is not None)


def _equivalence(found: Diagnosis, subject: Subject) -> list[str]:
    own = found.equivalence
    if own is None:
        return []
    decimals = subject.decimals + 1
    rows = [
        (
            f"{p.b} minus {p.a}",
            number(p.difference, decimals),
            interval(p.lower, p.upper, decimals),
            p_value(p.p_value),
            "equivalent" if p.equivalent else "not shown",
        )
        for p in own.pairs
    ]
    confidence = percent(1 - 2 * own.alpha)
    headings = ("two one-sided tests", "difference", f"{confidence} interval a pair", "p-value", "within the margin")
    return [*table(headings, rows, "<><><"), "  These hold for each pair by itself, at one look.", ""]


def _suspects(found: Diagnosis) -> list[str]:
    if not found.suspects:
        return ["  No value, run or group stands out (1 % a test)."]
    rows = [
        (_NAMES.get(s.test, s.test), s.what, f"{s.statistic:.3f}", f"{s.critical:.3f}", p_value(s.p_value))
        for s in found.suspects
    ]
    return [
        "  What stands out (1 % a test):",
        *table(("test", "which", "statistic", "critical", "p-value"), rows, "<<>>>"),
    ]


def diagnosis_document(found: Diagnosis, conclusion: Conclusion) -> dict[str, Any]:
    """The same for other programs."""
    own = found.equivalence
    return {
        "comparison": conclusion.name,
        "version": conclusion.version,
        "unit": found.unit,
        "tests": [asdict(test) for test in _tests(found)],
        "equivalence": [p._asdict() for p in own.pairs] if own else None,
        "suspects": [asdict(suspect) for suspect in found.suspects],
        "not_computed": found.not_computed,
    }
