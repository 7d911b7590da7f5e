"""Whether a table's decimal sign is known: stated by its map, or proven by its own figures."""

from __future__ import annotations

from collections.abc import Iterator

from sameline.intake.figures import DecimalSign, Figure

_NAMES = {".": "point", ",": "comma"}
_KEPT = 1_000


class DecimalEvidence:
    """What one table has shown of its decimal sign.

    Where a map states it, nothing is in doubt. Elsewhere a figure such as "1,234" is taken with a decimal comma only
    if other figures of the same table ("12,5") can have no other sign. In a table whose cells are separated by commas
    or tabs, or in a spreadsheet, a point is a decimal sign unless a decimal comma stands beside it.

    Args:
        stated: the decimal sign that the map states, or None.
        point_is_usual: whether a point is the decimal sign until the contrary is seen.
    """

    def __init__(self, stated: DecimalSign | None, *, point_is_usual: bool) -> None:
        self.stated = stated
        self._usual = point_is_usual
        self._shown: dict[DecimalSign, tuple[int, str, str]] = {}
        self._doubtful: dict[DecimalSign, list[tuple[int, str, str]]] = {".": [], ",": []}

    @property
    def settled(self) -> bool:
        """Whether a plain figure with a point can teach nothing more: the point is the decimal sign, as was shown."""
        return self.stated == "." or (self._usual and "." in self._shown and self.stated is None)

    def note(self, figure: Figure, row: int, heading: str, text: str) -> bool:
        """Note what a figure shows; returns whether it is certain by itself."""
        if self.stated is not None:
            return True
        if figure.shows is not None:
            self._shown.setdefault(figure.shows, (row, heading, text))
        if figure.doubtful is None:
            return True
        doubtful = self._doubtful[figure.doubtful]
        if len(doubtful) < _KEPT:
            doubtful.append((row, heading, text))
        return figure.doubtful == "." and self._usual

    def doubts(self) -> Iterator[tuple[int, str, str, str, str]]:
        """What stays in doubt at the end of the table: row, heading, text, problem, suggestion."""
        advice = "state the decimal sign in the file's map, or write figures with one decimal sign"
        if len(self._shown) == 2:
            (row_a, _, text_a), (row, heading, text) = sorted(self._shown.values())
            problem = f"{text.strip()!r} has another decimal sign than {text_a.strip()!r} in row {row_a}"
            yield row, heading, text, problem, advice
            return
        for sign, cells in self._doubtful.items():
            known = sign in self._shown or (sign == "." and self._usual and not self._shown)
            for row, heading, text in () if known else cells:
                plain = text.strip()
                problem = f"{plain!r}: the {_NAMES[sign]} could be a decimal sign or a thousands separator"
                yield row, heading, text, problem, advice
