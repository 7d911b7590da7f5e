"""Exit codes and streams of the real program: 0 done, 1 the answer is no, 2 the call was wrong, 3 no usable store."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

PROGRAM = Path(sys.executable).with_name("sameline")


def started(bench, *arguments: str, **options) -> subprocess.CompletedProcess[str]:
    environment = {**os.environ, "NO_COLOR": "1", "COLUMNS": "100"}
    return subprocess.run(
        [PROGRAM, *arguments],
        cwd=bench.folder,
        env=environment,
        capture_output=True,
        text=True,
        check=False,
        stdin=subprocess.DEVNULL,
        **options,
    )


CALLS = {
    "done": (0, ("list", "batches"), "B-1", ""),
    "the answer is no": (1, ("log", "-b", "B-1", "-c", "TS", "twelve"), "", "'twelve' is text, not a figure"),
    "an unknown command": (2, ("measure",), "", "No such command 'measure'"),
    "an unknown option": (2, ("differ", "--loud"), "", "No such option: --loud"),
    "a missing option": (2, ("compare", "pair", "B-1", "B-2"), "", "Missing option '--characteristic'"),
    "a figure that is none": (2, ("compare", "x", "-c", "TS", "--alpha", "low"), "", "Invalid value for '--alpha'"),
    "no such comparison": (2, ("differ", "pair"), "", "no comparison is called 'pair'"),
    "no store": (3, ("differ", "--store", "elsewhere.db"), "", "there is no store here"),
}


@pytest.mark.parametrize("call", CALLS)
def test_the_program_ends_with_the_code_that_its_help_promises(bench, call):
    code, arguments, out, err = CALLS[call]
    ended = started(bench, *arguments)
    assert ended.returncode == code
    assert out in ended.stdout
    assert err in ended.stderr
    assert "Traceback" not in ended.stderr
    if code:
        assert ended.stdout == ""
        assert ended.stderr.startswith("sameline: ")
        assert len(ended.stderr.splitlines()) > 1, "a refusal says what to do"


def test_a_file_is_read_from_standard_input(bench):
    text = "batch,characteristic,tested_at,value\nB-1,TS,2026-01-05,12.5\n"
    taken = subprocess.run(
        [PROGRAM, "take", "-"], cwd=bench.folder, input=text, capture_output=True, text=True, check=False
    )
    assert taken.returncode == 0, taken.stderr
    assert "mean 12.50 MPa" in taken.stdout


def test_a_reader_that_goes_away_is_no_error(bench):
    first_line = f"'{PROGRAM}' trail | head -1; echo ${{PIPESTATUS[0]}}"
    ended = subprocess.run(
        ["/bin/bash", "-c", first_line], cwd=bench.folder, capture_output=True, text=True, check=False
    )
    assert ended.stdout.split() == ["entry", "recorded", "person", "act", "to", "what,", "and", "why", "0"]
    assert ended.stderr == ""


def test_a_stopped_command_says_that_nothing_unconfirmed_is_recorded(bench, monkeypatch):
    def stop(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    before = bench.state()
    monkeypatch.setattr("sameline.lab.Lab.record", stop)
    ran = bench("log", "-b", "B-1", "-c", "TS", "12.5", "--at", "2026-01-05")
    assert ran.code == 130
    assert "stopped; what was not confirmed is not recorded" in ran.err
    assert bench.state() == before


def test_help_lists_every_command_in_one_whole_line(tool):
    told = tool.done("--help").out
    listed = told.split("Commands:\n")[1].splitlines()
    assert len(listed) >= 17
    assert not [line for line in listed if line.endswith("...") or not line.startswith("  ") or line[2] == " "]
