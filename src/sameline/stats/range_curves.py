"""Two curves through the studentized range's tail, for the many pairs of one comparison.

* One number of degrees of freedom, many q (Tukey-Kramer): log P(Q > q) over v = 2√df asinh(q/(2√df)). Where q is
  small against √df this is q, and behind it a multiple of log q, so that the curve stays smooth from the normal centre
  to the algebraic tail.
* One level, many degrees of freedom (Games-Howell): log q over log2 df.

Both are Chebyshev panels through values of `range_tail`, made where they are needed and kept; the interpolation loses
about 1e-13.
"""

from __future__ import annotations

import math
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.panels import Panels, fit_panels
from sameline.stats.range_tail import log_quantile, log_sf

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Array = NDArray[np.float64]

_TERMS = 14
# Blocks of panels of the first curve: edges in v, and the width of a panel. Beyond the last, pair by pair.
_EDGES = (0.0, 6.0, 12.0, 48.0)
_FINE, _COARSE, _TURN = 0.5, 4.0, 12.0
# The second curve's panels are octaves of df; beyond 2^20 pair by pair.
_OCTAVES = 20


def log_sf_over_q(q: Array, groups: int, df: float) -> Array:
    """Return log P(Q > q) for many q > 0 and one df; shape as q."""
    if math.isinf(df):
        return log_sf(q, groups, np.full_like(q, df))
    scale = 2.0 * math.sqrt(df)
    v = scale * np.arcsinh(q / scale)
    block = np.searchsorted(_EDGES, v, side="right") - 1
    out = np.empty_like(q)
    for index in range(len(_EDGES)):
        here = np.flatnonzero(block == index)
        if not here.size:
            continue
        if index < len(_EDGES) - 1:
            out[here] = _tail_block(groups, df, index)(v[here])
        else:
            out[here] = log_sf(q[here], groups, np.full(here.size, df))
    return out


def quantiles_over_df(alpha: float, groups: int, df: Array) -> Array:
    """Return the q with P(Q > q) = alpha for many df; shape as df."""
    log2_df = np.log2(df)
    octave = np.minimum(log2_df, _OCTAVES).astype(np.intp)
    out = np.empty_like(df)
    for index in np.unique(octave):
        here = octave == index
        if index < _OCTAVES:
            out[here] = _quantile_octave(alpha, groups, int(index))(log2_df[here])
        else:
            out[here] = log_quantile(np.full(int(here.sum()), math.log(alpha)), groups, df[here])
    return np.asarray(np.exp(out))


@lru_cache(maxsize=1024)
def _tail_block(groups: int, df: float, index: int) -> Panels:
    """Return one block of the curve of log P over v."""
    scale = 2.0 * math.sqrt(df)
    start, end = _EDGES[index], _EDGES[index + 1]
    width = _FINE if end <= _TURN else _COARSE

    def over_v(v: Array) -> Array:
        return log_sf(scale * np.sinh(v / scale), groups, np.full_like(v, df))

    return fit_panels(over_v, (start, end, end, width, width), _TERMS)


@lru_cache(maxsize=1024)
def _quantile_octave(alpha: float, groups: int, index: int) -> Panels:
    """Return one octave of the curve of log q over log2 df."""

    def over_log2_df(log2_df: Array) -> Array:
        return log_quantile(np.full_like(log2_df, math.log(alpha)), groups, np.exp2(log2_df))

    return fit_panels(over_log2_df, (float(index), index + 1.0, index + 1.0, 1.0, 1.0), _TERMS)
