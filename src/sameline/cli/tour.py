"""`sameline tour`: the demo scenario, played in a new store, step by step."""

from __future__ import annotations

import json
import shlex
import shutil
import textwrap
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from sameline.cli.common import say, write
from sameline.errors import CallError, CheckFailedError

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from sameline.lab import Lab, Outcome

Step = dict[str, Any]
_WIDTH = 100


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(tour)


def tour(
    folder: Annotated[Path, typer.Argument(help="A folder for the demo's store and files; it is made.")] = Path("tour"),
    pause: Annotated[bool, typer.Option("--pause", help="Wait for the Enter key after each step.")] = False,
) -> None:
    """Play the demo scenario in a new store.

    It is a year of a gasket maker's incoming tests. The firm, its people and all figures are invented.
    """
    from sameline.resources import seed_folder

    scenario = json.loads((seed_folder() / "scenario.json").read_text(encoding="utf-8"))
    _make_folder(folder)
    shutil.copytree(seed_folder() / "runs", folder / "runs")
    player = _Player(folder)
    say(scenario["notice"])
    for number, step in enumerate(scenario["steps"], 1):
        _announce(number, len(scenario["steps"]), player.named(step))
        player.play(step)
        if pause:
            typer.prompt("", prompt_suffix="Enter for the next step", default="", show_default=False, err=True)
    player.close()
    write(_farewell(folder))


def _make_folder(folder: Path) -> None:
    try:
        folder.mkdir(parents=True, exist_ok=True)
        if any(folder.iterdir()):
            raise CallError("the folder is not empty", where=str(folder), advice="name a new one")
    except OSError as error:
        raise CallError("the folder cannot be made", where=str(folder), advice="name another one") from error


def _announce(number: int, total: int, step: Step) -> None:
    typer.echo("")
    typer.echo(f"-- {number} of {total} · {step['at'][:10]} · {step['by']} " + "-" * 30)
    write(textwrap.wrap(step["say"], _WIDTH))
    for command in _commands(step):
        lines = textwrap.wrap(command, _WIDTH - 4, break_long_words=False, break_on_hyphens=False)
        write([f"  $ {lines[0]}", *(f"      {line}" for line in lines[1:])])


@dataclass
class _Player:
    """Plays steps on one store, each at its own simulated moment."""

    folder: Path
    moment: str = ""

    def __post_init__(self) -> None:
        self.lab: Lab | None = None

    def play(self, step: Step) -> None:
        from sameline.records.moments import read_moment

        self.moment = read_moment(step["at"], "UTC")
        getattr(self, f"_{step['act']}")(step)

    def named(self, step: Step) -> Step:
        """The step, with the number of the run that an amendment names otherwise."""
        if step["act"] != "amend":
            return step
        run = self._of(step).find_run(step["batch"], step["characteristic"], step["tested_at"])
        return {**step, "run": run}

    def close(self) -> None:
        if self.lab is not None:
            self.lab.close()

    def _of(self, step: Step) -> Lab:
        assert self.lab is not None  # noqa: S101 - the scenario begins with init
        self.lab.acting(step["by"])
        return self.lab

    def _init(self, step: Step) -> None:
        from sameline.lab import make_lab

        person, laboratory = step["person"], step["laboratory"]
        self.lab = make_lab(
            self.folder / "lab.db",
            by=step["by"],
            person_name=person["name"],
            role=person.get("role"),
            name=laboratory["name"],
            zone=laboratory["zone"],
            clock=lambda: self.moment,
        )

    def _add(self, step: Step) -> None:
        lab = self._of(step)
        for kind, code, particulars in _registrations(step):
            lab.add(kind, code, **particulars)

    def _compare(self, step: Step) -> None:
        from sameline.conclusions.statements import settled
        from sameline.records.comparisons import Statement

        statement = Statement(
            name=step["name"],
            characteristic=step["characteristic"],
            grouping=step["grouping"],
            groups=tuple(step.get("groups", ())),
            of_material=step.get("of_material"),
            of_supplier=step.get("of_supplier"),
            alpha=float(step["alpha"]),
        )
        _show(self._of(step).compare(settled(statement, model=step["model"], procedure=step["procedure"])))

    def _take(self, step: Step) -> None:
        from sameline.lab.outcomes import by_source
        from sameline.reports.runs import runs_summary

        taken = self._of(step).take([self.folder / step["file"]], as_they_stand=True)
        for finding in taken.intake.questions:
            say(f"  asked about: {finding}")
        for (_, drafts), outcome in zip(by_source(taken.intake), taken.outcomes, strict=True):
            write(f"  {line}" for line in runs_summary(outcome.runs, drafts, taken.facts))
            _show(outcome)

    def _differ(self, step: Step) -> None:
        from sameline.reports.differ import contrast_text, differ_text

        lab = self._of(step)
        conclusion = lab.conclusion(step["name"])
        subject = lab.subject(conclusion)
        write(f"  {line}" for line in differ_text(conclusion, subject, behind=False))
        if "contrast" in step:
            unit = "replicate" if step["contrast"] == "replicates" else "run"
            write(f"  {line}" for line in contrast_text(conclusion, lab.contrast(conclusion, unit), subject, unit))

    def _history(self, step: Step) -> None:
        from sameline.reports.history import history_text

        write(f"  {line}" for line in history_text(self._of(step).history(step["name"])))

    def _amend(self, step: Step) -> None:
        lab = self._of(step)
        run = lab.find_run(step["batch"], step["characteristic"], step["tested_at"])
        measurement, draft = lab.corrected(run, step["replicate"], step["value"])
        _show(lab.amend(measurement, draft, reason=step["reason"]))

    def _trail(self, step: Step) -> None:
        from sameline.reports.history import trail_text

        write(f"  {line}" for line in trail_text(self._of(step).trail(batch=step["batch"])))

    def _verify(self, step: Step) -> None:
        from sameline.reports.history import verification_text

        report = self._of(step).verify()
        write(f"  {line}" for line in verification_text(report))
        if report.findings:
            raise CheckFailedError("the demo's records do not verify", where=str(self.folder))


def _show(outcome: Outcome) -> None:
    from sameline.reports.changes import change_line

    write(f"  {change_line(conclusion)}" for conclusion in outcome.conclusions)


_LISTS = {
    "persons": "person",
    "instruments": "instrument",
    "suppliers": "supplier",
    "materials": "material",
    "characteristics": "characteristic",
    "batches": "batch",
}
_FIGURES = ("lower", "upper", "target", "margin")


def _registrations(step: Step) -> Iterator[tuple[str, str, dict[str, Any]]]:
    """What an add step registers: kind, code, particulars."""
    for members, kind in _LISTS.items():
        for item in step.get(members, ()):
            particulars = {name: value for name, value in item.items() if name != "code"}
            particulars.update({name: float(item[name]) for name in _FIGURES if name in item})
            if kind == "characteristic":
                particulars["safety_critical"] = int(item["safety_critical"])
            yield kind, item["code"], particulars


def _commands(step: Step) -> list[str]:
    """The commands that do the same by hand."""
    return _COMMANDS[step["act"]](step)


def _line(*words: str, **options: object) -> str:
    given = [
        f"--{name.replace('_', '-')} {shlex.quote(str(value))}" for name, value in options.items() if value is not None
    ]
    return " ".join(["sameline", words[0], *(shlex.quote(word) for word in words[1:]), *given])


def _add_commands(step: Step) -> list[str]:
    lines = []
    for kind, code, particulars in _registrations(step):
        critical = particulars.pop("safety_critical", 0)
        shown = {name: _plain(value) for name, value in particulars.items() if name != "note"}
        lines.append(_line("add", kind, code, **shown) + (" --safety-critical" if critical else ""))
    return lines if len(lines) <= 4 else [*lines[:2], f"… and {len(lines) - 2} more like these"]


def _plain(value: object) -> object:
    return f"{value:g}" if isinstance(value, float) else value


def _compare_command(step: Step) -> list[str]:
    groups = step.get("groups", ())
    of = None if step["grouping"] == "batch" else step["grouping"]
    options = {"characteristic": step["characteristic"], "of": of}
    filters = {"material": step.get("of_material"), "supplier": step.get("of_supplier")}
    return [_line("compare", step["name"], *groups, **options, **filters)]


_COMMANDS: dict[str, Callable[[Step], list[str]]] = {
    "init": lambda step: [
        _line("init", by=step["by"], laboratory=step["laboratory"]["name"], zone=step["laboratory"]["zone"])
    ],
    "add": _add_commands,
    "compare": _compare_command,
    "take": lambda step: [_line("take", step["file"])],
    "differ": lambda step: [_line("differ", step["name"], contrast=step.get("contrast"))],
    "history": lambda step: [_line("history", step["name"])],
    "amend": lambda step: [
        _line("amend", step["value"], run=step["run"], replicate=step["replicate"], reason=step["reason"])
    ],
    "trail": lambda step: [_line("trail", batch=step["batch"])],
    "verify": lambda _step: [_line("verify")],
}


def _farewell(folder: Path) -> list[str]:
    return [
        "",
        f"The store is {folder / 'lab.db'}. Look around in it:",
        f"  sameline differ --store {folder / 'lab.db'}",
        f"  sameline differ 'quellimara set' --all --store {folder / 'lab.db'}",
        f"  sameline list batches --store {folder / 'lab.db'}",
        f"  sameline trail --last 10 --store {folder / 'lab.db'}",
    ]
