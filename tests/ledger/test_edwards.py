from types import ModuleType

import pytest
from cryptography.hazmat.primitives.asymmetric.ed25519 import Ed25519PublicKey
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.ledger.edwards import check_public_key
from sameline.ledger.errors import FormatError
from sameline.ledger.signatures import verify_signature

P = 2**255 - 19
IDENTITY = (1).to_bytes(32, "little")


def small_order_points(ed25519: ModuleType):
    """All points whose order divides 8: L times any point has such an order (RFC 8032 section 5.1: 8 L points)."""
    found, y = set(), 2
    while len(found) < 8:
        for x in ed25519.roots(y):
            found.add(ed25519.times(ed25519.L, (x, y)))
        y += 1
    return found


def test_the_eight_points_of_small_order_are_refused(ed25519: ModuleType):
    points = small_order_points(ed25519)
    assert (0, 1) in points
    for point in points:
        assert ed25519.times(8, point) == (0, 1)
        with pytest.raises(FormatError, match="small order"):
            check_public_key(ed25519.encode(point))


def test_anybody_could_sign_under_such_a_key_were_it_accepted():
    # R and A the identity and S zero satisfy S B = R + k A for every text (RFC 8032 section 5.1.7).
    forged = IDENTITY + bytes(32)
    Ed25519PublicKey.from_public_bytes(IDENTITY).verify(forged, b"any text")
    with pytest.raises(FormatError, match="small order"):
        verify_signature(IDENTITY, "checkpoint", b"any text", forged)


@pytest.mark.parametrize("y", range(P, 2**255))
@pytest.mark.parametrize("sign", [0, 1])
def test_a_second_encoding_of_a_point_is_refused(y: int, sign: int):
    with pytest.raises(FormatError, match="one encoding"):
        check_public_key((y | sign << 255).to_bytes(32, "little"))


@pytest.mark.parametrize("y", [1, P - 1])
def test_zero_has_no_sign(y: int):
    with pytest.raises(FormatError, match="one encoding"):
        check_public_key((y | 1 << 255).to_bytes(32, "little"))


def test_about_half_of_all_numbers_are_no_point(ed25519: ModuleType):
    off = [y for y in range(2, 60) if not ed25519.roots(y)]
    assert 20 < len(off) < 40
    for y in off:
        with pytest.raises(FormatError, match="not a point"):
            check_public_key(y.to_bytes(32, "little"))


@settings(max_examples=25)
@given(st.binary(min_size=32, max_size=32))
def test_every_key_made_from_a_secret_is_accepted(ed25519: ModuleType, secret: bytes):
    check_public_key(ed25519.public_key(secret))


@pytest.mark.parametrize("size", [0, 31, 33])
def test_a_key_has_32_bytes(size: int):
    with pytest.raises(FormatError, match="32 bytes"):
        check_public_key(bytes(size))
