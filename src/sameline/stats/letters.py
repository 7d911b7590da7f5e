"""The fewest letters that show which groups are not shown to differ.

Groups are vertices, pairs not shown to differ are edges. A set of letters is right when two groups share one exactly
if they are joined: each letter is a clique and every edge lies in a letter. The fewest letters are a minimum clique
cover of the edges, which is hard in general (Kou, Stockmeyer & Wong 1978) and easy for what comparisons usually give.

1. Forced letters: an edge whose relevant common neighbours form a clique lies in one best letter only; it is taken.
   On stretches of ordered means, and most near misses of them, this alone finds the proven fewest.
2. A greedy cover of what remains, redundant letters swept out, gives letters that are right but perhaps not fewest.
3. A search with a fixed amount of work then looks for fewer, or proves that there are none.

The insert-and-absorb algorithm (Piepho 2004) gives one letter for every maximal clique, up to 2^(k/2) of them where k
groups differ in k/2 separate pairs; the cover needs far fewer. Letters found are always maximal sets.

References: Piepho (2004), J. Comput. Graph. Stat. 13:456-466; Gramm, Guo, Hüffner, Niedermeier, Piepho & Schmid (2007),
Algorithms for compact letter displays, Comput. Stat. Data Anal. 52:725-736; Kou, Stockmeyer & Wong (1978), Covering
edges by cliques with regard to keyword conflicts and intersection graphs, Commun. ACM 21:135-139.
"""

from __future__ import annotations

import string
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from sameline.stats.cliques import bits, neighbours, take_forced
from sameline.stats.cover_search import fewest_cliques

_ALPHABET = string.ascii_lowercase + string.ascii_uppercase


@dataclass(frozen=True, slots=True)
class Cover:
    """Sets of vertex numbers, each ascending, in ascending order; `fewest` when proven to be as few as can be."""

    sets: list[list[int]]
    fewest: bool


def letter_name(number: int) -> str:
    """The name of the letter with this number, from 0: a-z, A-Z, then a1-Z1, a2-Z2 and so on."""
    round_, at = divmod(number, len(_ALPHABET))
    return _ALPHABET[at] + (str(round_) if round_ else "")


def cover(alike: NDArray[np.bool_], *, most: int) -> Cover | None:
    """Covers the edges of a graph by as few maximal cliques as it can.

    Args:
        alike: symmetric, shape (k, k), True for pairs not shown to differ; the diagonal is not read.
        most: give up beyond this number of sets.

    Returns:
        The cover, or None where more than `most` sets were needed.
    """
    graph = neighbours(alike)
    open_ = list(graph)
    lonely = [1 << vertex for vertex, near in enumerate(graph) if not near]
    certain = lonely + take_forced(graph, open_)
    if len(certain) > most:
        return None
    more, proven = fewest_cliques(graph, open_, most - len(certain))
    if more is None:
        return None
    return Cover(sorted(list(bits(clique)) for clique in certain + more), proven)
