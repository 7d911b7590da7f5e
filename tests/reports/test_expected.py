"""What the commands write, to the letter. `python tests/reports/write_expected.py` writes the files anew."""

from __future__ import annotations

from pathlib import Path

import pytest

EXPECTED = sorted((Path(__file__).parent / "expected").glob("*.txt"))


def test_every_text_has_its_file(written):
    assert {path.stem for path in EXPECTED} == written.keys()


@pytest.mark.parametrize("path", EXPECTED, ids=lambda path: path.stem)
def test_the_text_is_as_expected(written, path: Path):
    assert written[path.stem] == path.read_text(encoding="utf-8")


def test_no_line_ends_in_blanks_and_nothing_is_nan(written):
    for text in written.values():
        assert not [line for line in text.splitlines() if line != line.rstrip()]
        assert "nan" not in text.lower().split()
