"""The registered code that was probably meant.

Characters that look alike are tried first (1, l and I; 0 and O; dashes of every kind), then one slip of a key
(a character missing, doubled, wrong, or two swapped), then general likeness.
"""

from __future__ import annotations

import difflib
import unicodedata
from collections.abc import Iterable

_ALIKE = str.maketrans({"l": "1", "i": "1", "|": "1", "!": "1", "o": "0", "q": "0", "s": "5", "z": "2", "b": "8"})
_LONGEST = 64
_LIKENESS_UP_TO = 2_000  # codes; general likeness costs some microseconds for each
_TIMES = 500  # texts; a file with more unknown codes than this is not helped by more suggestions


def looks(code: str) -> str:
    """The code with everything that looks alike made the same: case, dashes, blanks, 1/l/I, 0/O."""
    folded = unicodedata.normalize("NFKC", code).casefold()
    return "".join(sign for sign in folded.translate(_ALIKE) if sign.isalnum())


class Nearest:
    """Suggests from one set of codes.

    Args:
        codes: the registered codes.
    """

    def __init__(self, codes: Iterable[str]) -> None:
        self._codes = sorted(codes)
        self._looks: dict[str, str] = {}
        for code in self._codes:
            self._looks.setdefault(looks(code), code)
        self._left = _TIMES
        self._alphabet = sorted({sign for look in self._looks for sign in look})

    def to(self, text: str) -> str | None:
        """The nearest registered code, or None when none is near."""
        look = looks(text[:_LONGEST])
        if look in self._looks:
            return self._looks[look]
        self._left -= 1
        if self._left < 0:
            return None
        for slip in self._one_slip(look):
            if slip in self._looks:
                return self._looks[slip]
        if len(self._codes) > _LIKENESS_UP_TO:
            return None
        near = difflib.get_close_matches(text[:_LONGEST], self._codes, n=1, cutoff=0.6)
        return near[0] if near else None

    def _one_slip(self, look: str) -> Iterable[str]:
        places = range(len(look))
        yield from (look[:i] + look[i + 1] + look[i] + look[i + 2 :] for i in places[:-1])
        yield from (look[:i] + look[i + 1 :] for i in places)
        yield from (look[:i] + sign + look[i:] for i in range(len(look) + 1) for sign in self._alphabet)
        yield from (look[:i] + sign + look[i + 1 :] for i in places for sign in self._alphabet)


def did_you_mean(near: str | None) -> str | None:
    """The suggestion in words, or None."""
    return None if near is None else f"did you mean {near!r}?"
