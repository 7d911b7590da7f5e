"""`sameline picture`: files where they are asked for, text where they are not, and nothing written on a refusal."""

from __future__ import annotations

import subprocess
import sys

import pytest

KINDS = {
    "groups": ("groups", "pair"),
    "alike": ("groups", "pair", "--alike"),
    "pairs": ("pairs", "pair"),
    "evidence": ("evidence", "pair"),
    "evidence of a pair": ("evidence", "pair", "B-2", "B-1"),
    "over time": ("over-time", "TS", "--supplier", "NORD"),
    "spread": ("spread", "TS", "--material", "SEAL"),
    "power": ("power", "pair"),
}


@pytest.mark.parametrize("kind", KINDS)
def test_each_picture_is_written_told_and_documented(unchanged, kind):
    ran = unchanged.done("picture", *KINDS[kind], "--to", "a.svg", "--to", "a.png", "--width", 85, "--json")
    assert (unchanged.folder / "a.svg").read_bytes().startswith(b"<?xml")
    assert (unchanged.folder / "a.png").read_bytes().startswith(b"\x89PNG")
    assert ran.document.keys() == {"title", "caption", "files", "text"}
    assert ran.document["files"] == ["a.svg", "a.png"]
    assert "ledger entry" in ran.document["caption"]
    assert ran.err.splitlines() == ["a.svg: written", "a.png: written"]


def test_without_a_file_it_is_told_as_text(unchanged):
    told = unchanged.done("picture", "groups", "pair").out
    assert told.startswith("pair\n")
    assert "ledger entry" in " ".join(told.split())


def test_an_older_state_is_drawn_as_it_was(answered):
    before = answered.done("picture", "groups", "pair", "--json").document
    position = answered.done("differ", "pair", "--json").document["entry"]
    answered.done("log", "-b", "B-1", "-c", "TS", "14.0", "--at", "2026-01-09")
    now = answered.done("picture", "groups", "pair", "--json").document
    assert now != before
    assert answered.done("picture", "groups", "pair", "--as-of", position, "--json").document == before
    assert "n: 5 runs" in now["caption"]


REFUSED = {
    "no such comparison": (("groups", "nothing"), "no comparison is called"),
    "no such form": (("groups", "pair", "--to", "a.gif"), "ending in .svg or .png"),
    "no such width": (("pairs", "pair", "--width", 10), "cannot be 10 mm wide"),
    "three groups are no pair": (("evidence", "pair", "B-1", "B-2", "B-3"), "a pair is of two groups, not 3"),
    "a pair that was never compared": (("evidence", "pair", "B-1", "B-3"), "no version of pair"),
    "no such characteristic": (("over-time", "QQ"), "registered as 'QQ'"),
    "no such folder": (("groups", "pair", "--to", "nowhere/a.svg"), "it cannot be written"),
    "nothing recorded": (("over-time", "TS", "--supplier", "SUED"), "registered as 'SUED'"),
}


@pytest.mark.parametrize("call", REFUSED)
def test_what_cannot_be_drawn_is_refused(unchanged, refused, call):
    arguments, words = REFUSED[call]
    refused(unchanged("picture", *arguments), 2, words)
    assert not list(unchanged.folder.glob("*.svg"))


def test_the_help_needs_no_matplotlib():
    code = (
        "import sys\nfrom sameline.cli import run\nrun(['picture', '--help'])\nassert 'matplotlib' not in sys.modules"
    )
    subprocess.run([sys.executable, "-c", code], check=True, capture_output=True)
