"""Text files: comma, semicolon, tab or bar between cells; UTF-8, or UTF-16 with its mark."""

from __future__ import annotations

import codecs
import csv
import io
from collections.abc import Callable, Iterator, Mapping

from sameline.intake.figures import DecimalSign
from sameline.intake.rawfiles import RawFile
from sameline.intake.tables import Row, UnreadableError

DELIMITERS = (",", ";", "\t", "|")
_STEP = 1 << 20
_KNOWN_AS = {
    b"\xd0\xcf\x11\xe0": "an old or a password-protected workbook",
    b"%PDF": "a PDF document",
    b"\x89PNG": "a picture",
    b"\xff\xd8\xff": "a picture",
    b"SQLite format 3": "a database",
    b"\x1f\x8b": "a compressed file",
    b"{\\rtf": "a text document with layout",
}


class TextTable:
    """A text file read with one delimiter.

    Args:
        file: the file's name without folders.
        data: its text, encoded in `encoding`.
        encoding: an encoding in which the data are known to be valid.
        delimiter: what stands between cells.
    """

    sheet: str | None = None
    hidden = False

    def __init__(self, file: str, data: bytes, encoding: str, delimiter: str) -> None:
        self.file = file
        self.point_is_usual = delimiter in (",", "\t")
        self.delimiter = delimiter
        self._data = data
        self._encoding = encoding
        self._line: Callable[[], int] = int  # tells the line that reading has come to

    def rows(self, decimal: DecimalSign = ".") -> Iterator[Row]:  # noqa: ARG002 - text has its own sign
        """All rows with their numbers; a row may run over several lines where a cell in quotes does."""
        text = io.TextIOWrapper(io.BytesIO(self._data), encoding=self._encoding, newline="")
        reader = csv.reader(text, delimiter=self.delimiter, strict=True)
        self._line = lambda: reader.line_num
        return enumerate(reader, 1)

    def explained(self, error: Exception) -> UnreadableError | None:
        """A quote that is not closed, or a cell that is too long."""
        if not isinstance(error, csv.Error):
            return None
        problem = f"line {self._line()} cannot be taken apart into cells: {error}"
        return UnreadableError(problem, "look for a quotation mark without its partner")

    def merged(self) -> Mapping[tuple[int, int], tuple[int, int]]:
        """A text file has no merged cells."""
        return {}


def text_tables(raw: RawFile, encodings: tuple[str, ...] = ()) -> list[TextTable]:
    """The file read with each delimiter that its first lines hold, the one with most columns first.

    Args:
        raw: the file.
        encodings: encodings that heading maps state; tried where the file is not UTF-8.

    Raises:
        UnreadableError: it is not text that can be read.
    """
    data, encoding = _plain(raw.data, encodings)
    if not data.strip(b" \t\r\n,;|\xef\xbb\xbf"):
        raise UnreadableError("the file is empty", "write headings in the first row and the results below")
    if _has_endless_line(data):
        raise UnreadableError(f"a line is longer than {_STEP:,} bytes", "end each result with a line break")
    start = data[:_STEP].decode(encoding, errors="replace").splitlines()[:20]
    count = {mark: max((line.count(mark) for line in start), default=0) for mark in DELIMITERS}
    used = sorted((mark for mark in DELIMITERS if count[mark]), key=lambda mark: -count[mark]) or [","]
    return [TextTable(raw.name, data, encoding, mark) for mark in used]


def _has_endless_line(data: bytes) -> bool:
    """Whether some line is so long that it is no row of a table: one row must not fill the memory."""
    places = range(0, len(data) - _STEP, _STEP)
    return any(data.find(b"\n", at, at + _STEP) < 0 and data.find(b"\r", at, at + _STEP) < 0 for at in places)


def _plain(data: bytes, encodings: tuple[str, ...]) -> tuple[bytes, str]:
    """The data and an encoding they are valid in."""
    for mark, name in _KNOWN_AS.items():
        if data.startswith(mark):
            raise UnreadableError(f"this is {name}, not a table", "save the results as CSV or XLSX")
    if data.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        try:
            data = data.decode("utf-16").encode()
        except (UnicodeDecodeError, UnicodeEncodeError) as error:
            raise UnreadableError("the file begins as UTF-16 and is not", "save it as CSV UTF-8") from error
    if (place := data.find(b"\0")) >= 0:
        line = data.count(b"\n", 0, place) + 1
        advice = "export it again; if it is UTF-16, save it as CSV UTF-8"
        raise UnreadableError(f"there is a NUL byte in line {line}: the file is damaged or not text", advice, line)
    invalid = _first_invalid(data)
    if invalid is None:
        return data, "utf-8-sig"
    for encoding in encodings:
        try:
            return data.decode(encoding).encode(), "utf-8"
        except (UnicodeError, LookupError):
            continue
    raise _wrong_encoding(data, invalid)


def _first_invalid(data: bytes) -> int | None:
    """Where the data stop being UTF-8; None when they do not."""
    decoder = codecs.getincrementaldecoder("utf-8")()
    for start in range(0, len(data), _STEP):
        waiting = len(decoder.getstate()[0])
        try:
            decoder.decode(data[start : start + _STEP], final=start + _STEP >= len(data))
        except UnicodeDecodeError as error:
            return start - waiting + error.start
    return None


def _wrong_encoding(data: bytes, place: int) -> UnreadableError:
    line = data.count(b"\n", 0, place) + 1
    around = data[max(place - 12, 0) : place + 12].splitlines()
    shown = next((piece for piece in around if data[place : place + 1] in piece), b"")
    reading = shown.decode("cp1252", errors="replace").strip()
    return UnreadableError(
        f"the file is not UTF-8: byte {data[place]:#04x} in line {line}",
        f"save it as CSV UTF-8, or state its encoding in the file's map (as cp1252 it would read {reading!r})",
        line,
    )
