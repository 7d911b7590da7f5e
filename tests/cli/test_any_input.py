"""Whatever is typed or put in a file: never a traceback, never half a record."""

from __future__ import annotations

import string

from hypothesis import given, settings
from hypothesis import strategies as st

HEADINGS = ("batch", "characteristic", "tested_at", "replicate", "value", "unit", "note")
WORDS = st.one_of(
    st.text(st.characters(exclude_categories=("Cs",), exclude_characters="\0"), max_size=12),
    st.sampled_from(["B-1", "B-2", "TS", "12.5", "<0.5", "-3", "1e400", "nan", "2026-02-01", "2999-01-01", "MPa", "%"]),
)
MESSAGE_CODES = {1, 2, 3}


def held(tool, before, ran) -> None:
    """Either it is done and recorded, or it is refused with a message and nothing is recorded."""
    assert "Traceback" not in ran.err
    if ran.code == 0:
        assert tool.state()[0] > before[0]
    else:
        assert ran.code in MESSAGE_CODES
        assert ran.err.startswith("sameline: ")
        assert ran.out == ""
        assert tool.state() == before


@settings(max_examples=20)
@given(code=WORDS, name=WORDS)
def test_any_code_and_name(bench, code, name):
    before = bench.state()
    held(bench, before, bench("add", "supplier", "--name", name, "--", code))


@settings(max_examples=30)
@given(values=st.lists(WORDS, min_size=1, max_size=4), at=WORDS, batch=WORDS)
def test_any_values_typed(bench, values, at, batch):
    before = bench.state()
    held(bench, before, bench("log", f"--batch={batch}", "-c", "TS", f"--at={at}", "--", *values))


ROWS = st.lists(st.lists(WORDS, min_size=1, max_size=8), max_size=5)


@settings(max_examples=30)
@given(head=st.permutations(HEADINGS), rows=ROWS, separator=st.sampled_from(",;\t"))
def test_any_table(bench, head, rows, separator):
    before = bench.state()
    path = bench.folder / "any.csv"
    lines = [separator.join(head), *(separator.join(row) for row in rows)]
    path.write_bytes("\n".join(lines).encode("utf-8", "replace"))
    held(bench, before, bench("take", path))


@settings(max_examples=20)
@given(content=st.binary(max_size=300))
def test_any_bytes(bench, content):
    before = bench.state()
    path = bench.folder / "any.csv"
    path.write_bytes(content)
    held(bench, before, bench("take", path))


@settings(max_examples=20)
@given(
    name=WORDS,
    alpha=st.one_of(st.floats(), st.text(string.printable, max_size=5)),
    groups=st.lists(WORDS, max_size=3),
)
def test_any_comparison(bench, name, alpha, groups):
    before = bench.state()
    held(bench, before, bench("compare", "-c", "TS", f"--alpha={alpha}", "--", name, *groups))
