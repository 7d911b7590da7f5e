"""Is a public key a point that only its owner can sign for? The curve arithmetic of RFC 8032 section 5.1.

The eight points of small order are valid encodings under which a signature can be written for any text without a
private key. Whoever registered one could later say that anybody might have signed. They are refused here, and so
are encodings that are not of a point, or not the one encoding of it.
"""

from __future__ import annotations

from typing import Final

from sameline.ledger.errors import FormatError

_P: Final = 2**255 - 19
_D: Final = -121665 * pow(121666, -1, _P) % _P
_SQUARE_ROOT_OF_MINUS_ONE: Final = pow(2, (_P - 1) // 4, _P)


def check_public_key(raw: bytes) -> None:
    """Refuse a public key that is no point of edwards25519, or one of small order.

    Args:
        raw: the 32 bytes of RFC 8032 section 5.1.2.

    Raises:
        FormatError: with the reason.
    """
    if len(raw) != 32:
        raise FormatError(f"a public key has 32 bytes, not {len(raw)}")
    x, y = _decoded(raw)
    for _ in range(3):
        x, y = _doubled(x, y)
    if (x, y) == (0, 1):
        raise FormatError("the public key is a point of small order, under which anybody could sign")


def _decoded(raw: bytes) -> tuple[int, int]:
    """The point of an encoding: RFC 8032 section 5.1.3."""
    number = int.from_bytes(raw, "little")
    sign, y = number >> 255, number & (2**255 - 1)
    # 1. Decode y; it must be below p.
    if y >= _P:
        raise FormatError("the public key is not in its one encoding")
    # 2. x**2 = (y**2 - 1) / (d y**2 + 1), 3. with a candidate root.
    square = (y * y - 1) * pow(_D * y * y + 1, -1, _P) % _P
    x = pow(square, (_P + 3) // 8, _P)
    if (x * x - square) % _P:
        x = x * _SQUARE_ROOT_OF_MINUS_ONE % _P
    if (x * x - square) % _P:
        raise FormatError("the public key is not a point of the curve")
    # 4. The sign chooses the root; zero has none.
    if x == 0 and sign:
        raise FormatError("the public key is not in its one encoding")
    return (x if x & 1 == sign else _P - x), y


def _doubled(x: int, y: int) -> tuple[int, int]:
    """The point added to itself, by the curve's complete addition law (RFC 8032 section 5.1.4, affine)."""
    t = _D * x * x * y * y % _P
    return 2 * x * y * pow(1 + t, -1, _P) % _P, (y * y + x * x) * pow(1 - t, -1, _P) % _P
