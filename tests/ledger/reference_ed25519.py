"""Ed25519 written as RFC 8032 section 5.1 reads: affine arithmetic by the addition law, slow."""

from hashlib import sha512

P = 2**255 - 19
L = 2**252 + 27742317777372353535851937790883648493
D = -121665 * pow(121666, -1, P) % P
B_Y = 4 * pow(5, -1, P) % P

Point = tuple[int, int]


def add(a: Point, b: Point):
    (x1, y1), (x2, y2) = a, b
    t = D * x1 * x2 * y1 * y2 % P
    return (x1 * y2 + x2 * y1) * pow(1 + t, -1, P) % P, (y1 * y2 + x1 * x2) * pow(1 - t, -1, P) % P


def times(k: int, a: Point):
    total = (0, 1)
    while k:
        if k & 1:
            total = add(total, a)
        a = add(a, a)
        k >>= 1
    return total


def encode(a: Point):
    return (a[1] | (a[0] & 1) << 255).to_bytes(32, "little")


def roots(y: int):
    """Both x of a y, found by trying the candidate root of section 5.1.3 and its turn by sqrt(-1)."""
    square = (y * y - 1) * pow(D * y * y + 1, -1, P) % P
    x = pow(square, (P + 3) // 8, P)
    x = x if x * x % P == square else x * pow(2, (P - 1) // 4, P) % P
    return (x, P - x) if x * x % P == square else ()


def base_point():
    return min(roots(B_Y), key=lambda x: x & 1), B_Y


def expanded(secret: bytes):
    h = sha512(secret).digest()
    a = int.from_bytes(h[:32], "little")
    return a & ((1 << 254) - 8) | 1 << 254, h[32:]


def public_key(secret: bytes):
    return encode(times(expanded(secret)[0], base_point()))


def sign(secret: bytes, message: bytes):
    a, prefix = expanded(secret)
    r = int.from_bytes(sha512(prefix + message).digest(), "little") % L
    big_r = encode(times(r, base_point()))
    k = int.from_bytes(sha512(big_r + public_key(secret) + message).digest(), "little") % L
    return big_r + ((r + k * a) % L).to_bytes(32, "little")
