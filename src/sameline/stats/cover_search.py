"""Covers the open edges of a graph by few cliques: greedily, then by a search that may prove that none has fewer."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from sameline.stats.cliques import bits, close, edges, matrix, take_forced

RESTARTS = 30  # greedy covers tried; all counts here are fixed, so that the answer never varies
GREEDY_STEPS = 10_000  # vertices added over all of them, after which no other is begun
SEARCH_WORK = 25_000  # edges and cliques looked at when searching for fewer
SEARCH_GROUPS = 40  # beyond it the search would not end within its work and is not begun

Bools = NDArray[np.bool_]


def fewest_cliques(graph: list[int], open_: list[int], most: int) -> tuple[list[int] | None, bool]:
    """Covers the open edges.

    Returns:
        (the cliques, whether none fewer can do); None for the cliques where more than `most` were needed.
    """
    if not any(open_):
        return [], True
    best = greedy(graph, open_, most)
    if len(graph) > SEARCH_GROUPS:
        return best, False
    return _Search(graph, best).run(open_)


def greedy(graph: list[int], open_: list[int], most: int) -> list[int] | None:
    """The best of several greedy covers, without redundant cliques; None where each has more than `most`."""
    alike, wanted = matrix(graph), matrix(open_)
    best: list[list[int]] | None = None
    steps = 0
    for restart in range(RESTARTS):
        if steps >= GREEDY_STEPS or (restart > 1 and best is None):
            break
        found = _greedy_once(alike, wanted, restart, 2 * (most if best is None else len(best)) + 8)
        steps += sum(map(len, found)) + len(graph)
        kept = _without_redundant(found, wanted)
        if kept and len(kept) <= most and (best is None or len(kept) < len(best)):
            best = kept
    return None if best is None else [sum(1 << vertex for vertex in clique) for clique in best]


def _greedy_once(alike: Bools, wanted: Bools, restart: int, limit: int) -> list[list[int]]:
    """Grows cliques from the vertex with most open edges, each step by the vertex that closes most.

    Ties go another way in each restart.
    Stops at `limit` cliques, short of covering everything; such a cover is not kept.
    """
    left = wanted.copy()
    cliques: list[list[int]] = []
    while len(cliques) < limit and left.any():
        noise = _scattered(len(alike), restart * limit + len(cliques))
        start = int(np.argmax(left.sum(axis=1) + noise))
        clique, near = [start], alike[start].copy()
        gain = left[start] + noise
        while near.any():
            best = int(np.argmax(np.where(near, gain, -1.0)))
            clique.append(best)
            near &= alike[best]
            gain += left[best]
        left[np.ix_(clique, clique)] = False
        cliques.append(sorted(clique))
    return cliques


def _scattered(count: int, turn: int) -> NDArray[np.float64]:
    """Numbers in [0, 1/2) that look random and are the same for ever: the mixing steps of splitmix64.

    Reference: Steele, G. L., Lea, D. & Flood, C. H. (2014), Fast splittable pseudorandom number generators, OOPSLA.
    """
    x = (np.arange(count, dtype=np.uint64) + np.uint64(turn * 65_536 + 1)) * np.uint64(0x9E3779B97F4A7C15)
    x = (x ^ (x >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
    x = (x ^ (x >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
    return (x ^ (x >> np.uint64(31))) / 2.0**65


def _without_redundant(cliques: list[list[int]], wanted: Bools) -> list[list[int]]:
    """Drops cliques whose edges all lie in others, earliest first: later ones were grown for what was left.

    Empty where the cliques do not cover every wanted edge.
    """
    times = np.zeros(wanted.shape, np.int64)
    inside = [np.ix_(clique, clique) for clique in cliques]
    for block in inside:
        times[block] += 1
    if np.any(times[wanted] == 0):
        return []
    kept = []
    for clique, block in zip(cliques, inside, strict=True):
        if np.all(times[block][wanted[block]] > 1):
            times[block] -= 1
        else:
            kept.append(clique)
    return kept


class _Search:
    """Branch and bound over the cliques through the open edge with the fewest common neighbours."""

    def __init__(self, graph: list[int], best: list[int] | None) -> None:
        self.graph = graph
        self.best = best
        self.work = 0

    def run(self, open_: list[int]) -> tuple[list[int] | None, bool]:
        """The best cover found, and whether none smaller exists."""
        self._descend(list(open_), [])
        return self.best, self.work <= SEARCH_WORK and self.best is not None

    def _descend(self, open_: list[int], taken: list[int]) -> None:
        taken = taken + take_forced(self.graph, open_)
        if not any(open_):
            if self.best is None or len(taken) < len(self.best):
                self.best = taken
            return
        ordered = sorted(edges(open_), key=self._common)
        self.work += 2 * len(ordered)
        if self.best is not None and len(taken) + self._at_least(ordered) >= len(self.best):
            return
        for clique in self._branches(ordered[0], open_):
            if self.work > SEARCH_WORK:
                return
            rest = list(open_)
            close(clique, rest)
            self._descend(rest, [*taken, clique])

    def _common(self, edge: tuple[int, int]) -> int:
        """How many neighbours the ends share."""
        return (self.graph[edge[0]] & self.graph[edge[1]]).bit_count()

    def _at_least(self, ordered: list[tuple[int, int]]) -> int:
        """A lower bound: open edges no two of which lie in one clique, picked scarcest first."""
        apart: list[int] = []
        for u, v in ordered:
            near = (self.graph[u] | 1 << u) & (self.graph[v] | 1 << v)
            if all(ends & ~near for ends in apart):
                apart.append(1 << u | 1 << v)
        self.work += len(ordered) * len(apart) // 8
        return len(apart)

    def _branches(self, edge: tuple[int, int], open_: list[int]) -> list[int]:
        """The maximal cliques through one open edge, most gainful first."""
        u, v = edge
        found: list[int] = []
        self._maximal(1 << u | 1 << v, self.graph[u] & self.graph[v], 0, found)
        return sorted(found, key=lambda clique: (-_gain(clique, open_), clique))

    def _maximal(self, clique: int, candidates: int, done: int, found: list[int]) -> None:
        """Bron and Kerbosch (1973) with a pivot, up to the fixed amount of work."""
        self.work += 1
        if not candidates and not done:
            found.append(clique)
            return
        if self.work > SEARCH_WORK:
            return
        pivot = max(bits(candidates | done), key=lambda vertex: (self.graph[vertex] & candidates).bit_count())
        for vertex in bits(candidates & ~self.graph[pivot]):
            near = self.graph[vertex]
            self._maximal(clique | 1 << vertex, candidates & near, done & near, found)
            candidates &= ~(1 << vertex)
            done |= 1 << vertex


def _gain(clique: int, open_: list[int]) -> int:
    return sum((open_[vertex] & clique).bit_count() for vertex in bits(clique))
