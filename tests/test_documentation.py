"""README is true: every command and option is in its reference, nothing else is, and every example runs."""

from __future__ import annotations

import contextlib
import io
import json
import re
import shlex
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
import typer

from sameline.cli import app, run

README = Path(__file__).parents[1] / "README.md"
TEXT = README.read_text(encoding="utf-8")
COMMON = {"--store", "--by", "--json", "--as-of", "--reason", "--help", "-h"}


def commands(command: Any = None, name: str = "sameline") -> Iterator[tuple[str, Any]]:  # noqa: ANN401 - typer's own
    """Every command that does something, with its whole name."""
    command = command or typer.main.get_command(app)
    members = getattr(command, "commands", None)
    if members is None:
        yield name, command
        return
    for word, member in members.items():
        yield from commands(member, f"{name} {word}")


COMMANDS = dict(commands())


def sections() -> dict[str, str]:
    """The reference's sections by their headings."""
    _, reference = TEXT.split("\n## Reference\n")
    parts = re.split(r"^### (.+)$", reference, flags=re.MULTILINE)[1:]
    return dict(zip(parts[::2], parts[1::2], strict=True))


def taken(command: Any) -> set[str]:  # noqa: ANN401 - typer's own
    """The options, short ones too, and the arguments of a command."""
    found: set[str] = set()
    for parameter in command.params:
        options = [*parameter.opts, *parameter.secondary_opts]
        found |= {"FILE"} if parameter.name == "files" else set(options)
    return found


def documented(section: str) -> set[str]:
    """What a section names in backticks."""
    prose = re.sub(r"^```.*?^```$", "", section, flags=re.MULTILINE | re.DOTALL)
    return set(re.findall(r"`([^`\n]+)`", prose))


def test_every_command_has_one_section_and_nothing_else_has():
    found = [heading for heading in sections() if heading.startswith("sameline ")]
    assert sorted(found) == sorted(COMMANDS)


@pytest.mark.parametrize("name", COMMANDS)
def test_every_option_and_argument_of_a_command_is_documented(name):
    missing = taken(COMMANDS[name]) - COMMON - documented(sections()[name])
    assert not missing, f"not in README's section {name!r}"


@pytest.mark.parametrize("name", COMMANDS)
def test_no_option_is_documented_that_is_not_there(name):
    named = {word for word in documented(sections()[name]) if word.startswith("-") and word != "-"}
    assert not named - taken(COMMANDS[name]) - COMMON


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_an_example(name):
    assert re.search(rf"^{name} ?", blocks_of(sections()[name]), re.MULTILINE)


def blocks_of(text: str) -> str:
    return "\n".join(re.findall(r"^```sh\n(.*?)^```$", text, re.MULTILINE | re.DOTALL))


def test_what_every_command_takes_is_documented_once():
    assert documented(sections()["What every command takes"]) >= COMMON


def steps() -> Iterator[tuple[str, str]]:
    """README's blocks in order: a file to be saved (its name is the last in backticks above it), commands, a text."""
    name = ""
    for before, kind, block in re.findall(r"(.*?)^```(\w+)\n(.*?)^```$", TEXT, re.MULTILINE | re.DOTALL):
        files = re.findall(r"`([\w-]+\.csv)`", before)
        name = files[-1] if files else name
        yield (f"csv {name}" if kind == "csv" else kind), block


def steady(text: str) -> str:
    """A text without the moment at which it was recorded."""
    return re.sub(r"recorded \S+ \S+ UTC", "recorded then", text).rstrip("\n")


def test_every_example_runs_and_shows_what_is_shown(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("SAMELINE_STORE", raising=False)
    out = ""
    for kind, block in steps():
        if kind.startswith("csv "):
            (tmp_path / kind.removeprefix("csv ")).write_text(block, encoding="utf-8")
        elif kind == "sh":
            for line in block.splitlines():
                out = ran(line, monkeypatch)
        elif kind == "text":
            assert steady(out) == steady(block)
        elif kind == "python":
            printed = io.StringIO()
            with contextlib.redirect_stdout(printed):
                exec(block, {})  # noqa: S102 - the example is ours
            assert printed.getvalue().startswith("[('A-101', 'A-102', ")


def ran(line: str, monkeypatch: pytest.MonkeyPatch) -> str:
    word, *arguments = shlex.split(line)
    if word == "export":
        monkeypatch.setenv(*arguments[0].split("=", 1))
        return ""
    assert word == "sameline", line
    if "KEY" in arguments:
        (key,) = json.loads(ran("sameline key list --json", monkeypatch))
        arguments[arguments.index("KEY")] = key["key"]
    out, err = io.StringIO(), io.StringIO()
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        code = run(arguments)
    assert code == 0, (line, err.getvalue())
    return out.getvalue()


def test_the_two_commands_are_there():
    """The second one is what the checks run."""
    assert re.search(r"^python3 -m venv .*sameline tour demo$", TEXT, re.MULTILINE)
    assert len(re.findall(r"^python3 -m venv .*pytest$", TEXT, re.MULTILINE)) == 1
