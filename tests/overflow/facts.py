"""Facts about real numbers that the ranges of the lemmas rest on, each decided by z3.

Unit vectors and rotations are known to within a few units, so a sum over their entries is smaller than the entries'
own bounds allow. `u` is one unit: 2^-30 of one.
"""

import math

import z3


def facts(constants):
    """Name, why it is needed, premises, claim."""
    one, rounding, joints = constants["ONE"][1], constants["ROUNDING"][1], constants["MOST_JOINTS"][1]
    sizes = math.isqrt(3 * one * one) + 20
    a, b, c, d, e, f = z3.Reals("a b c d e f")
    w, x, y, z = z3.Reals("w x y z")
    n = w * w + x * x + y * y + z * z
    first = w * w + x * x - y * y - z * z
    second, third = 2 * (x * y + w * z), 2 * (x * z - w * y)
    yield (
        "columns of a rotation are unit vectors",
        "w, x, y, z any quaternion; the others by exchanging names",
        [],
        first * first + second * second + third * third == n * n,
    )
    yield (
        "sizes of a unit vector's components sum to at most sqrt(3)",
        "`SIZES`: a vector within two units of a unit one, each component known to within four",
        [a >= 0, b >= 0, c >= 0, a * a + b * b + c * c <= (one + 2) ** 2],
        a + b + c + 12 <= sizes,
    )
    low, high = z3.Reals("low high")
    yield (
        "`Product::over` is within four units of the quotient",
        "entries of the wanted rotation; the shifted norm is at least 2^30, `a` the shifted dividend, `d` the norm",
        [d >= one, a <= d, a >= 0, b >= a, b <= a + 1, low > d - 1, low <= d, high * low <= b * one + low],
        high * d <= a * one + 4 * d,
    )
    yield (
        "row times column is at most the product of their lengths",
        "Lagrange's identity, for sums of three products of entries",
        [],
        (a * a + b * b + c * c) * (d * d + e * e + f * f) - (a * d + b * e + c * f) ** 2
        == (a * e - b * d) ** 2 + (a * f - c * d) ** 2 + (b * f - c * e) ** 2,
    )
    k = z3.Int("k")
    yield (
        "a product of rotations keeps its rows within `ROUNDING` of one",
        "each factor is within 16 units of a rotation and each product is rounded; at most two factors a joint",
        [k >= 0, k < 2 * joints],
        z3.And(
            (one + 32 * k) * (one + 16) + one <= (one + 32 * (k + 1)) * one,
            one + 32 * (k + 1) <= one + rounding,
        ),
    )
    yield (
        "two entries of a row of length one and two numbers of size one",
        "`l1 cx - l0 cy` and a row times a vector stay below two",
        [a * a + b * b + c * c <= (one + rounding) ** 2]
        + [term for v in (d, e, f) for term in (v <= one + 1, v >= -one - 1)]
        + [x >= 0, y >= 0, z >= 0, x >= a, x >= -a, y >= b, y >= -b, z >= c, z >= -c]
        + [x * x + y * y + z * z <= (one + rounding) ** 2],
        (x + y + z) * (one + 1) <= 2 * one * (one - 1),
    )
    yield (
        "`Direction::normalised` gives a length within four units",
        "`a` is the length before, `b` its root rounded down; components are cut towards zero",
        [b >= one / 2 - 1, a >= b, a < b + 1, c * b <= a * one],
        c <= one + 4,
    )
    yield (
        "an entry times its sine is at most one half",
        "first half of the bound on the trace",
        [a <= 1, a >= -1],
        a * a * (1 - a * a) <= z3.Q(1, 4),
    )
    yield (
        "a small turn keeps the trace from being negative",
        "3 cos - 9/2 sin bounds the trace's products from below; with `least` = 1 + 2 cos above 13/5 it is above -1/2",
        [c * c + a * a == 1, a >= 0, 1 + 2 * c > z3.Q(13, 5)],
        3 * c - z3.Q(9, 2) * a >= -z3.Q(9, 20),
    )
