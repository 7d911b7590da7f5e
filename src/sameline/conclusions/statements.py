"""Is a statement one that can be answered? Models, procedures and units, and which go together."""

from __future__ import annotations

import difflib
import math
from dataclasses import replace

from sameline.conclusions.looking import has_exact_form
from sameline.errors import CallError
from sameline.records.comparisons import GROUPINGS, Statement

MODELS = {
    "nested": ("tukey-kramer", "dunnett", "holm", "bonferroni"),
    "pooled": ("tukey-kramer", "dunnett", "bonferroni", "holm", "sidak"),
    "unequal": ("games-howell", "welch-holm"),
    "ranks": ("steel-dwass", "dunn"),
}
"""Model -> the procedures it offers, its own first.

nested: run random within batch, batch random within group; pooled: the units as they are, one common variance;
unequal: the units as they are, a variance for each group; ranks: the units' ranks.
"""

UNITS = ("run", "batch", "replicate")
LOOKS = ("open", "planned", "single")
SPENDINGS = ("obrien-fleming", "pocock")
WITH_CONTROL = "dunnett"


def settled(statement: Statement, *, model: str | None, procedure: str | None) -> Statement:
    """The statement with its model and procedure, where one or both are left to the other.

    Raises:
        CallError: a model or procedure is not known, or they do not go together.
    """
    if procedure is not None:
        _known("procedure", procedure, tuple(dict.fromkeys(p for ps in MODELS.values() for p in ps)))
    if model is None:
        fitting = [name for name, offered in MODELS.items() if procedure in offered]
        model = fitting[0] if fitting else "nested"
    _known("model", model, tuple(MODELS))
    if procedure is None:
        procedure = WITH_CONTROL if statement.control and WITH_CONTROL in MODELS[model] else MODELS[model][0]
    if procedure not in MODELS[model]:
        raise CallError(f"the {model} model does not offer {procedure}", advice=f"it offers {', '.join(MODELS[model])}")
    return replace(statement, model=model, procedure=procedure)


def check(statement: Statement) -> None:
    """Refuse a statement that cannot be meant.

    Raises:
        CallError: with what to change.
    """
    if not statement.name.strip() or any(not c.isprintable() for c in statement.name):
        raise CallError("a comparison needs a name of printable characters")
    _known("grouping", statement.grouping, GROUPINGS)
    _known("unit", statement.unit, UNITS)
    if not 0 < statement.alpha < 1:
        raise CallError(f"alpha is {statement.alpha:g}", advice="it lies between 0 and 1, for example 0.05")
    if statement.margin is not None and not (statement.margin > 0 and math.isfinite(statement.margin)):
        raise CallError(
            f"the margin is {statement.margin:g}", advice="it is the smallest difference that matters, above 0"
        )
    _check_groups(statement)
    _check_control(statement)
    _check_looks(statement)
    if statement.unit == "batch" and statement.grouping == "batch":
        raise CallError("batches that are the groups cannot be the units too", advice="use --unit run")

    if statement.known_spread and (statement.model != "nested" or statement.looks == "planned"):
        raise CallError(
            "a known spread goes with the nested model and open or single looks", advice="leave one of them out"
        )

    if statement.sessions and (statement.model != "nested" or statement.looks == "planned"):
        raise CallError("sessions go with the nested model and open or single looks", advice="leave one of them out")
    _check_windows(statement)


def _check_windows(statement: Statement) -> None:
    if statement.window_units is None and statement.window_months is None:
        return
    if statement.window_units is not None and statement.window_months is not None:
        raise CallError("windows go by units or by months", advice="leave out --window or --window-months")
    if statement.looks != "open" or not statement.groups or not has_exact_form(statement):
        raise CallError(
            "windows go with open looks at listed groups: batches on the nested model, or any on the pooled one",
            advice="leave the windows out",
        )
    if statement.window_months is not None and statement.window_months < 1:
        raise CallError(f"a window of {statement.window_months} months cannot be meant", advice="give 1 or more")
    if statement.window_units is not None and statement.window_units < 2 * len(statement.groups):
        raise CallError(
            f"a window of {statement.window_units} units is too short for {len(statement.groups)} groups",
            advice="give at least two units a group",
        )


def _check_groups(statement: Statement) -> None:
    if len(set(statement.groups)) != len(statement.groups):
        twice = next(g for g in statement.groups if statement.groups.count(g) > 1)
        raise CallError(f"group {twice!r} is listed twice")
    if len(statement.groups) == 1:
        raise CallError(
            "a comparison needs at least two groups", advice="list another, or leave the list out to compare all"
        )
    if statement.groups and statement.control and statement.control not in statement.groups:
        raise CallError(f"the control {statement.control!r} is not among the groups", advice="list it too")


def _check_control(statement: Statement) -> None:
    if statement.procedure == WITH_CONTROL and statement.control is None:
        raise CallError("Dunnett's procedure compares with a control", advice="name it with --control")
    if statement.control is not None and statement.procedure != WITH_CONTROL:
        raise CallError(
            f"a control goes with Dunnett's procedure, not with {statement.procedure}",
            advice="leave out --control or --procedure",
        )
    if statement.alternative != "two-sided" and statement.procedure != WITH_CONTROL:
        raise CallError(
            "one-sided questions are asked against a control", advice="use --procedure dunnett --control CODE"
        )
    _known("alternative", statement.alternative, ("two-sided", "less", "greater"))


def _check_looks(statement: Statement) -> None:
    _known("way of looking", statement.looks, LOOKS)
    if statement.looks == "planned" and statement.final_units is None:
        raise CallError("a plan states its final amount of data", advice="give --units, of all groups together")
    if statement.looks == "open" and statement.final_units is not None:
        raise CallError("looks without end have no final amount of data", advice="leave out --units, or plan the looks")
    if statement.final_units is not None and statement.final_units < 3:
        raise CallError(f"{statement.final_units} units in all cannot be compared", advice="plan three or more")
    if statement.looks == "planned" and (statement.procedure != "tukey-kramer" or not statement.groups):
        raise CallError(
            "planned looks are for all pairs of listed groups", advice="list the groups, or use open or single looks"
        )
    if statement.spending is not None:
        _known("spending", statement.spending, SPENDINGS)
        if statement.looks != "planned":
            raise CallError("only planned looks spend by a function", advice="leave out --spending")
    if statement.alternative != "two-sided" and statement.looks != "single":
        raise CallError("one-sided questions are asked at a single look", advice="use --looks single")


def _known(what: str, word: str, words: tuple[str, ...]) -> None:
    if word not in words:
        near = difflib.get_close_matches(word, words, n=1)
        hint = f"did you mean {near[0]!r}? " if near else ""
        raise CallError(f"there is no {what} {word!r}", advice=f"{hint}one of {', '.join(words)}")
