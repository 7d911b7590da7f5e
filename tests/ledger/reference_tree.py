"""The Merkle tree of RFC 9162 written as its definitions read: recursive, slow, over the leaves' own bytes."""

from hashlib import sha256


def largest_power_of_two_below(n: int):
    k = 1
    while k * 2 < n:
        k *= 2
    return k


def mth(d: list[bytes]):
    """MTH(D[n]), section 2.1.1."""
    n = len(d)
    if n == 0:
        return sha256(b"").digest()
    if n == 1:
        return sha256(b"\x00" + d[0]).digest()
    k = largest_power_of_two_below(n)
    return sha256(b"\x01" + mth(d[:k]) + mth(d[k:])).digest()


def path(m: int, d: list[bytes]):
    """PATH(m, D[n]), section 2.1.3.1."""
    n = len(d)
    if n == 1:
        return []
    k = largest_power_of_two_below(n)
    if m < k:
        return [*path(m, d[:k]), mth(d[k:])]
    return [*path(m - k, d[k:]), mth(d[:k])]


def proof(m: int, d: list[bytes]):
    """PROOF(m, D[n]), section 2.1.4.1."""
    return subproof(m, d, b=True)


def subproof(m: int, d: list[bytes], *, b: bool):
    """SUBPROOF(m, D[n], b), section 2.1.4.1."""
    n = len(d)
    if m == n:
        return [] if b else [mth(d)]
    k = largest_power_of_two_below(n)
    if m <= k:
        return [*subproof(m, d[:k], b=b), mth(d[k:])]
    return [*subproof(m - k, d[k:], b=False), mth(d[:k])]
