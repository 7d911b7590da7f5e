"""Conclusions as recorded: written from an answer, read back as the same values."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

from sqlalchemy import Connection, Select, Table, select

from sameline.errors import CallError
from sameline.records import tables as t
from sameline.records.acts import Act
from sameline.records.answers import (
    Answer,
    CautionAnswer,
    ComponentAnswer,
    Conclusion,
    GlobalTest,
    GroupAnswer,
    PairAnswer,
    Turn,
)
from sameline.records.comparisons import Revision
from sameline.records.registry import KINDS, codes
from sameline.records.store import Reading


def record(
    act: Act,
    revision: Revision,
    answer: Answer,
    *,
    version: int,
    look: int,
    position: int,
    causes: Sequence[int],
    turns: Sequence[Turn],
) -> int:
    """Record a conclusion within an act.

    Args:
        act: the act.
        revision: the comparison's revision that was answered.
        answer: what was computed.
        version: of the comparison's conclusions, counted from 1.
        look: of the comparison, counted from 1.
        position: the ledger entry up to which the records were read.
        causes: the entries that touched the comparison since the version before.
        turns: the verdicts that changed against it.

    Returns:
        The row's id.
    """
    test = answer.test or GlobalTest("", None, None, None, None)
    number = act.add(
        t.conclusion,
        comparison=revision.comparison,
        version=version,
        revision=revision.id,
        position=position,
        look=look,
        inputs=answer.inputs,
        state=answer.state,
        reason=answer.reason,
        runs=answer.runs,
        replicates=answer.replicates,
        runs_before_statement=answer.runs_before_statement,
        display=answer.display,
        test=test.name or None,
        statistic=test.statistic,
        df_between=test.df_between,
        df_within=test.df_within,
        p_value=test.p_value,
        critical_value=answer.critical_value,
        guarantee=answer.guarantee,
        looks_state=answer.looks_state,
        engine=answer.engine,
    )
    for cause in causes:
        act.add(t.conclusion_cause, conclusion=number, cause=cause)
    groups = {g.label: _add_group(act, number, revision.grouping, place, g) for place, g in enumerate(answer.groups, 1)}
    pairs = {(p.a, p.b): _add_pair(act, number, groups, p) for p in answer.pairs}
    for c in answer.components:
        act.add(
            t.conclusion_component,
            conclusion=number,
            level=c.level,
            variance=c.variance,
            lower=c.lower,
            upper=c.upper,
        )
    for caution in answer.cautions:
        act.add(t.conclusion_caution, conclusion=number, code=caution.code, text=caution.text)
    for turn in turns:
        pair = pairs[turn.a, turn.b]
        act.add(t.conclusion_turn, conclusion=number, pair=pair, before=turn.before, because=turn.because)
    return number


def _add_group(act: Act, conclusion: int, grouping: str, place: int, g: GroupAnswer) -> int:
    return act.add(
        t.conclusion_group,
        conclusion=conclusion,
        place=place,
        units=g.units,
        runs=g.runs,
        replicates=g.replicates,
        mean=g.mean,
        sd=g.sd,
        lower=g.lower,
        upper=g.upper,
        letters=g.letters,
        **{grouping: g.id},
    )


def _add_pair(act: Act, conclusion: int, groups: dict[str, int], p: PairAnswer) -> int:
    return act.add(
        t.conclusion_pair,
        conclusion=conclusion,
        a=groups[p.a],
        b=groups[p.b],
        difference=p.difference,
        standard_error=p.standard_error,
        df=p.df,
        statistic=p.statistic,
        p_value=p.p_value,
        lower=p.lower,
        upper=p.upper,
        differs=None if p.differs is None else int(p.differs),
        verdict=p.verdict,
        reason=p.reason,
        single_look_p=p.single_look_p,
        p_now=p.p_now,
        log_evidence=p.log_evidence,
        share=p.share,
    )


def latest(reading: Reading, comparison: int) -> Conclusion | None:
    """The last conclusion of a comparison as of the reading; None before the first."""
    query = _heads(reading).where(t.conclusion.c.comparison == comparison)
    return _one(reading, query.order_by(t.conclusion.c.version.desc()).limit(1))


def version_of(reading: Reading, comparison: int, version: int) -> Conclusion:
    """One version of a comparison's conclusion.

    Raises:
        CallError: there was no such version by then.
    """
    query = _heads(reading).where(t.conclusion.c.comparison == comparison, t.conclusion.c.version == version)
    found = _one(reading, query)
    if found is None:
        raise CallError(f"there is no version {version}", advice="`sameline history NAME` lists the versions")
    return found


def versions(reading: Reading, comparison: int) -> list[Conclusion]:
    """Every version of a comparison's conclusion as of the reading, oldest first."""
    query = _heads(reading).where(t.conclusion.c.comparison == comparison).order_by(t.conclusion.c.version)
    return _read(reading, query)


def versions_of(reading: Reading, comparison: int, last: int) -> dict[int, int]:
    """Conclusion id -> version, of a comparison's versions up to this one."""
    table = t.conclusion
    query = select(table.c.id, table.c.version).where(
        table.c.comparison == comparison, table.c.version <= last, table.c.entry <= reading.position
    )
    return dict(reading.connection.execute(query).all())


def before_look(reading: Reading, comparison: int, look: int) -> Conclusion | None:
    """The last conclusion of a comparison made at an earlier look than this one; None where there is none."""
    query = _heads(reading).where(t.conclusion.c.comparison == comparison, t.conclusion.c.look < look)
    return _one(reading, query.order_by(t.conclusion.c.version.desc()).limit(1))


def all_versions(reading: Reading, after: int = 0) -> list[tuple[int, int]]:
    """Comparison and version of every conclusion recorded after an entry, in the order in which they were recorded."""
    query = (
        select(t.conclusion.c.comparison, t.conclusion.c.version)
        .where(t.conclusion.c.entry <= reading.position, t.conclusion.c.entry > after)
        .order_by(t.conclusion.c.id)
    )
    return [(comparison, version) for comparison, version in reading.connection.execute(query)]


def _heads(reading: Reading) -> Select[Any]:
    return (
        select(
            t.conclusion,
            t.comparison.c.name,
            t.comparison_revision.c.revision.label("revision_number"),
            t.comparison_revision.c.grouping,
            t.entry.c.at,
            t.person.c.code,
        )
        .join(t.comparison, t.conclusion.c.comparison == t.comparison.c.id)
        .join(t.comparison_revision, t.conclusion.c.revision == t.comparison_revision.c.id)
        .join(t.entry, t.conclusion.c.entry == t.entry.c.number)
        .join(t.person, t.entry.c.person == t.person.c.id)
        .where(t.conclusion.c.entry <= reading.position)
    )


def _one(reading: Reading, query: Select[Any]) -> Conclusion | None:
    found = _read(reading, query)
    return found[0] if found else None


def _read(reading: Reading, query: Select[Any]) -> list[Conclusion]:
    heads = reading.connection.execute(query).mappings().all()
    return [_conclusion(reading.connection, head) for head in heads]


def _conclusion(connection: Connection, head: Any) -> Conclusion:  # noqa: ANN401 - a row of `_heads`
    groups = _parts(connection, t.conclusion_group, head["id"])
    labels_of = codes_of(connection, head["grouping"], (g[head["grouping"]] for g in groups))
    label = {g["id"]: labels_of[g[head["grouping"]]] for g in groups}
    pairs = {p["id"]: _pair(p, label) for p in _parts(connection, t.conclusion_pair, head["id"])}
    turns = [
        Turn(pairs[row["pair"]].a, pairs[row["pair"]].b, row["before"], pairs[row["pair"]].verdict, row["because"])
        for row in _parts(connection, t.conclusion_turn, head["id"])
    ]
    answer = Answer(
        **{f: head[f] for f in ("inputs", "state", "reason", "runs", "replicates", "runs_before_statement", "display")},
        groups=tuple(_group(g, head["grouping"], label[g["id"]]) for g in groups),
        pairs=tuple(pairs.values()),
        components=tuple(
            ComponentAnswer(c["level"], c["variance"], c["lower"], c["upper"])
            for c in _parts(connection, t.conclusion_component, head["id"])
        ),
        cautions=tuple(
            CautionAnswer(c["code"], c["text"]) for c in _parts(connection, t.conclusion_caution, head["id"])
        ),
        test=_test(head),
        critical_value=head["critical_value"],
        engine=head["engine"],
        guarantee=head["guarantee"],
        looks_state=head["looks_state"],
    )
    return Conclusion(
        id=head["id"],
        name=head["name"],
        comparison=head["comparison"],
        revision_id=head["revision"],
        revision=head["revision_number"],
        version=head["version"],
        look=head["look"],
        position=head["position"],
        entry=head["entry"],
        at=head["at"],
        person=head["code"],
        causes=tuple(c["cause"] for c in _parts(connection, t.conclusion_cause, head["id"])),
        turns=tuple(turns),
        answer=answer,
    )


def _parts(connection: Connection, table: Table, conclusion: int) -> Sequence[Any]:
    query = select(table).where(table.c.conclusion == conclusion).order_by(table.c.id)
    return connection.execute(query).mappings().all()


def codes_of(connection: Connection, kind: str, ids: Iterable[int]) -> dict[int, str]:
    """The codes of some registered things, by id."""
    identity = KINDS[kind].identity
    wanted = set(ids)
    if len(wanted) > 500:
        return codes(connection, KINDS[kind])
    query = select(identity.c.id, identity.c.code).where(identity.c.id.in_(wanted))
    return {row.id: row.code for row in connection.execute(query)}


def _group(row: Any, grouping: str, label: str) -> GroupAnswer:  # noqa: ANN401 - a row of conclusion_group
    fields = ("units", "runs", "replicates", "mean", "sd", "lower", "upper", "letters")
    return GroupAnswer(id=row[grouping], label=label, **{f: row[f] for f in fields})


def _pair(row: Any, label: dict[int, str]) -> PairAnswer:  # noqa: ANN401 - a row of conclusion_pair
    fields = (
        "difference",
        "standard_error",
        "df",
        "statistic",
        "p_value",
        "lower",
        "upper",
        "verdict",
        "reason",
        "single_look_p",
        "p_now",
        "log_evidence",
        "share",
    )
    differs = None if row["differs"] is None else bool(row["differs"])
    return PairAnswer(label[row["a"]], label[row["b"]], differs=differs, **{f: row[f] for f in fields})


def _test(head: Any) -> GlobalTest | None:  # noqa: ANN401 - a row of `_heads`
    if head["test"] is None:
        return None
    return GlobalTest(head["test"], head["statistic"], head["df_between"], head["df_within"], head["p_value"])
