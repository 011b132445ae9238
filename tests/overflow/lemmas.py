"""The lemmas: every computing expression of the integer code, the ranges of what it computes with, and why.

Ranges are written in the constants of the sources, which the caller reads from there. `END` is an end of an interval:
at most one in size, or one unit beyond where `Interval::clamped` marks a set that lies outside. `UNIT` is an end of
an interval that has been intersected with a unit one and not found empty.
"""

import math

import rust
from engine import Lemma, Number


def ranges(constants):
    """Named ranges, from the constants of the sources."""
    one, square = constants["ONE"][1], constants["ONE_SQUARED"][1]
    rounding, joints = constants["ROUNDING"][1], constants["MOST_JOINTS"][1]
    least, most = rust.bounds("i64")
    # The sizes of the components of a unit vector known to within four units, added up: see FACTS.
    sizes = math.isqrt(3 * one * one) + 20
    # What a joint adds to an origin and to the remainder of a form: `multiple` is at most 128 in size.
    origin = joints * (2 * one + 130 * (one + 2))
    noise = joints * (6 * one + 2 * (one + 1) + 2 * rounding * 130 + 16)
    remainder = origin + 2 * one + rounding + noise + 4 * one + joints * 270 * one

    def both(kind, size):
        return Number(kind, -size, size)

    return {
        "ANY": Number("i64", least + 1, most),
        "I32": Number("i32", *rust.bounds("i32")),
        "I8": Number("i8", *rust.bounds("i8")),
        "BYTE": Number("i64", 0, 128),
        "UNIT": both("i32", one),
        "END": both("i32", one + 1),
        "WIDE": both("i64", one + 1),
        "PRODUCT": both("i64", (one + 1) ** 2),
        "TWO": both("i64", 2 * (one + 1) ** 2),
        "THREE": both("i64", 3 * (one + 1) ** 2),
        "FOUR": both("i64", 4 * (one + 1) ** 2),
        "SQUARE": Number("i64", -(1 << 12), square),
        "PLUS": Number("i64", 0, square),
        # The packer leaves a millionth of the reach (see PREMISES): more than 2^-20 of the square.
        "LINK": Number("i64", -(1 << 12), square - (square >> 20)),
        "ALONG": both("i64", 6 * square),
        "HALF": Number("i32", 0, one),
        "LENGTH": Number("i64", 0, one),
        "SIZES": both("i64", sizes * (one + 1)),
        "NOMINAL": both("i64", sizes + 3),
        "TRACE": both("i64", 3 * sizes * (one + 1)),
        "TRACE_LEAST": Number("i64", -square, 3 * square),
        "ROTATION": both("i32", one + rounding),
        "ROTATION64": both("i64", one + rounding),
        "SLACK": Number("i32", 0, one + 1),
        "SPAN": Number("i64", 0, 2 * one),
        "ORIGIN": both("i64", origin),
        "NOISE": Number("i64", 0, noise),
        "REMAINDER": both("i64", remainder),
        "WEIGHTED": both("i64", 16 * remainder),
        "COEFFICIENT": both("i64", joints * 128 * 2 * one * 8),
        "FACTOR": both("i64", one + 1),
        "BEND": Number("i64", 0, 134 * one),
        "STEP": both("i64", 2 * one),
        "REACH": both("i64", 130 * (one + 2)),
    }


# What the ranges rest on outside the fixed-point code: expressions that must still stand where they stood.
PREMISES = [
    ("host-cli/src/pack/mod.rs", "(reach * (1.0 + 1e-6)).log2().ceil() as i8", "no length exceeds 1 / (1 + 1e-6)"),
    ("host-cli/src/pack/integers.rs", "square(size + xyz) as i64 + (1 << 12)", "squared length of a link"),
    ("host-cli/src/pack/integers.rs", "1 + (chord.min(1.0) * ONE as f64).ceil() as i32", "slack of a link: at most one"),
    ("host-cli/src/pack/integers.rs", "(known * snapped * ONE as f64).round() as i32", "entries of a rotation"),
    ("core/src/target.rs", "(least * least..=most * most).contains(&square)", "axes of a target in range are units"),
    ("core/src/propagate/start.rs", "q.unsigned_abs() > ONE as u32", "components of a quaternion: at most one"),
    ("core/src/propagate/start.rs", "norm.lo < ONE_SQUARED >> 2", "length of a quaternion: at least one half"),
    ("core/src/propagate/cell.rs", "pub const ANYTHING: Cell = Cell { before: [Interval::UNIT; 3],", "cells are units"),
]


def lemmas(r):
    """Every lemma, with the ranges of [`ranges`]."""

    def of(file):
        def lemma(quote, places=1, terms=1, assume=(), cases=None, result=None, note="", **where):
            named = {name: r[kind] for name, kind in where.pop("of", {}).items()}
            assert not where
            return Lemma(file, quote, named, tuple(assume), cases or {}, result, places, terms, note)

        return lemma

    found = []
    for group in (fixed, interval, direction, arc, cells, link, start, network, rows, relaxation):
        found += group(of, r)
    return found


def fixed(of, r):
    at = of("core/src/fixed/mod.rs")
    return [
        at("value.clamp(-(ONE as i64), ONE as i64) as i32", of={"value": "ANY"}),
        at("(square.max(0) as u64).isqrt() as i64", of={"square": "ANY"}),
        at("square.max(0) as u64", places=2, of={"square": "ANY"}),
        Lemma(
            "core/src/fixed/mod.rs",
            "(root + (root * root < square) as u64) as i64",
            {"root": Number("u64", 0, math.isqrt(rust.bounds("i64")[1])), "square": Number("u64", 0, rust.bounds("i64")[1])},
        ),
    ]


def interval(of, r):
    at = of("core/src/fixed/interval.rs")
    ends = {"self.lo": "END", "self.hi": "END", "other.lo": "END", "other.hi": "END"}
    # At most seven products: four and three.
    sums = {"self.lo": "FOUR", "self.hi": "FOUR", "other.lo": "THREE", "other.hi": "THREE"}
    products = {name: "ANY" for name in ("self.lo", "self.hi", "lo", "hi")}
    squares = {name: "THREE" for name in ("self.lo", "self.hi")}
    shifts = {"shift": [("u32", s) for s in range(33)]}
    # What the shift makes of the divisor: `shift` is the least that leaves at most 31 bits.
    divisor = ("divisor.hi < 2 ** (31 + shift)",)
    one = r["UNIT"].high
    over = {
        "divisor.lo": Number("i64", 1, rust.bounds("i64")[1]),
        "divisor.hi": Number("i64", 1, rust.bounds("i64")[1]),
        "self.lo": r["ANY"],
        "self.hi": r["ANY"],
        "high": Number("i64", 1, 2 * one),
        "low": Number("i64", 1, 2 * one),
        "limit": Number("i64", 2, 2 * one + 1),
        "above": Number("i64", -2 * one - 1, 2 * one + 1),
        "below": Number("i64", -2 * one - 1, 2 * one + 1),
    }

    def quotient(quote, cases=None, assume=(), result=None):
        where = {n: v for n, v in over.items() if rust.places(rust.tokens(quote), n)[0]}
        return Lemma("core/src/fixed/interval.rs", quote, where, assume, cases or {}, result)

    return [
        at("-ONE", of={}),
        at("lo.clamp(-(ONE as i64), ONE as i64 + 1) as i32", of={"lo": "ANY"}, result=(-one, one + 1)),
        at("hi.clamp(-(ONE as i64) - 1, ONE as i64) as i32", of={"hi": "ANY"}, result=(-one - 1, one)),
        at("self.hi as i64 - self.lo as i64", of=ends),
        at("(-(self.lo as i64)).max(self.hi as i64)", of=ends),
        at("(self.lo as i64) << FRACTION_BITS", of=ends),
        at("(self.hi as i64) << FRACTION_BITS", of=ends),
        at("self.lo as i64 - other.hi as i64", of=ends),
        at("self.hi as i64 - other.lo as i64", of=ends),
        at("-self.hi", places=5, of=ends, note="of an interval"),
        at("-self.hi", places=5, of=products, note="of a product"),
        at("-self.lo", places=5, of=ends, note="of an interval"),
        at("-self.lo", places=5, of=products, note="of a product"),
        at("a * c", of={"a": "WIDE", "c": "WIDE"}),
        at("a * d", of={"a": "WIDE", "d": "WIDE"}),
        at("b * c", of={"b": "WIDE", "c": "WIDE"}),
        at("b * d", of={"b": "WIDE", "d": "WIDE"}),
        at("self.lo as i64 * factor as i64", of={"self.lo": "END", "factor": "ROTATION"}),
        at("self.hi as i64 * factor as i64", of={"self.hi": "END", "factor": "ROTATION"}),
        at("self.lo as i64 * self.lo as i64", of=ends),
        at("self.hi as i64 * self.hi as i64", of=ends),
        at("(before - self.width()) * 16", of={"before": "SPAN", "self.width()": "SPAN"}),
        at("-root", places=3, of={"root": "END"}),
        at("root_down(square.lo).min(ONE as i64 + 1) as i32", of={"square.lo": "ANY"}),
        at("self.lo + other.lo", of=sums, note="at most seven products"),
        at("self.hi + other.hi", of=sums, note="at most seven products"),
        at("self.lo - other.hi", of=sums, note="at most seven products"),
        at("self.hi - other.lo", of=sums, note="at most seven products"),
        at("2 * self.lo", of=squares),
        at("2 * self.hi", of=squares),
        at("self.lo >> 1", of=products),
        at("-((-self.hi) >> 1)", of=products),
        at("-LEAST", of={}),
        at("-divisor.hi", of={"divisor.hi": "END"}),
        at("-divisor.lo", of={"divisor.lo": "END"}),
        Lemma(
            "core/src/fixed/interval.rs",
            "lo.div_euclid(if lo >= 0 { high } else { low })",
            {"lo": r["ANY"], "high": Number("i64", 1 << 10, one + 1), "low": Number("i64", 1 << 10, one + 1)},
        ),
        Lemma(
            "core/src/fixed/interval.rs",
            "-(-hi).div_euclid(if hi >= 0 { low } else { high })",
            {"hi": r["ANY"], "high": Number("i64", 1 << 10, one + 1), "low": Number("i64", 1 << 10, one + 1)},
        ),
        at("(self.lo >> FRACTION_BITS) - slack as i64", of={"self.lo": "ANY", "slack": "I32"}),
        at("-((-self.hi) >> FRACTION_BITS) + slack as i64", of={"self.hi": "ANY", "slack": "I32"}),
        at("self.hi - self.lo", places=2, of=squares, note="a width of at most six products"),
        at(
            "before - (self.hi - self.lo) > before >> 4",
            of={"before": "THREE", **squares},
            assume=("self.hi - self.lo <= before", "self.hi >= self.lo"),
            note="meeting only narrows",
        ),
        quotient("divisor.lo >> shift", shifts),
        quotient("(divisor.hi >> shift) + 1", shifts, divisor, (1, 2 * one)),
        quotient("high + 1"),
        quotient("(self.lo >> shift).clamp(-limit, limit)", shifts),
        quotient("(-((-self.hi) >> shift)).clamp(-limit, limit)", shifts),
        quotient("(above << FRACTION_BITS).div_euclid(if above >= 0 { high } else { low })"),
        quotient("-((-below) << FRACTION_BITS).div_euclid(if below >= 0 { low } else { high })"),
    ]


def direction(of, r):
    file = "core/src/fixed/direction.rs"
    at = of(file)
    ends = {name: "END" for name in ("self.x", "self.y", "other.x", "other.y")}
    one = r["UNIT"].high
    any64 = Number("i64", *rust.bounds("i64"))
    left = {"zeros": [("u32", z) for z in range(34, 65)]}
    right = {"zeros": [("u32", z) for z in range(0, 34)]}

    def shorter(quote, name, cases):
        # That many leading zeros: the larger of the two sizes is below this power of two.
        bound = (f"{name} < 2 ** (64 - zeros)", f"{name} > -(2 ** (64 - zeros))")
        return Lemma(file, quote, {name: any64}, bound, cases, (-one, one))

    normal = {"d.x": r["UNIT"], "d.y": r["UNIT"], "length": Number("i64", 1, 2 * one)}
    return [
        at("-ONE", places=2, of={}),
        at("-self.y", places=4, of=ends),
        at("self.x as i64 * other.y as i64 - self.y as i64 * other.x as i64", of=ends),
        at("self.x as i64 * other.x as i64 + self.y as i64 * other.y as i64", of=ends),
        at("self.x as i64 * other.x as i64 - self.y as i64 * other.y as i64", of=ends),
        at("self.x as i64 * other.y as i64 + self.y as i64 * other.x as i64", of=ends),
        shorter("(x << (zeros - 34)) as i32", "x", left),
        shorter("(y << (zeros - 34)) as i32", "y", left),
        shorter("(x >> (34 - zeros)) as i32", "x", right),
        shorter("(y >> (34 - zeros)) as i32", "y", right),
        at("self.x as i64", places=5, of={"self.x": "I32"}),
        at("self.y as i64", places=5, of={"self.y": "I32"}),
        Lemma(file, "((d.dot(d)) as u64).isqrt() as i64", {"d.dot(d)": Number("i64", 0, 2 * one * one)}),
        Lemma(file, "((d.x as i64) << FRACTION_BITS) / length", normal),
        Lemma(file, "((d.y as i64) << FRACTION_BITS) / length", normal),
        at("self.x >> 27", of={"self.x": "UNIT"}, result=(-8, 8)),
        at("self.y >> 27", of={"self.y": "UNIT"}, result=(-8, 8)),
        Lemma(file, "(self.x - dy) as i64", {"self.x": r["UNIT"], "dy": Number("i32", -8, 8)}),
        Lemma(file, "(self.y + dx) as i64", {"self.y": r["UNIT"], "dx": Number("i32", -8, 8)}),
        Lemma(file, "(self.x + dy) as i64", {"self.x": r["UNIT"], "dy": Number("i32", -8, 8)}),
        Lemma(file, "(self.y - dx) as i64", {"self.y": r["UNIT"], "dx": Number("i32", -8, 8)}),
    ]


def arc(of, r):
    at = of("core/src/fixed/arc.rs")
    ends = {f"self.{end}.{axis}": "END" for end in ("lo", "hi") for axis in ("x", "y")}
    return [
        at("of(self.lo) as i64", of={"of(self.lo)": "END"}),
        at("of(self.hi) as i64", of={"of(self.hi)": "END"}),
        at("a.min(b) - DIRECTION_SLACK", of={"a": "WIDE", "b": "WIDE"}),
        at("a.max(b) + DIRECTION_SLACK", of={"a": "WIDE", "b": "WIDE"}),
        at("-ONE", of={}),
        at("-d.x", of={"d.x": "END"}),
        at("-d.y", of={"d.y": "END"}),
        at("self.lo.x as i64 + self.hi.x as i64", of=ends),
        at("self.lo.y as i64 + self.hi.y as i64", of=ends),
        at("sum.0.abs().max(sum.1.abs())", of={"sum.0": "STEP", "sum.1": "STEP"}),
        at("(ONE >> 4) as i64", of={}),
        at("-middle.x", of={"middle.x": "UNIT"}),
        at("-middle.y", of={"middle.y": "UNIT"}),
    ]


def cells(of, r):
    at = of("core/src/propagate/cell.rs")
    plane = {name: "END" for name in ("c", "s", "vx", "vy", "wx", "wy", "wz", "vz")}
    space = {"one": "SQUARE", "square": "SQUARE", "radius": "TWO", "before": "SQUARE", "after": "SQUARE"}
    lengths = {f"{name}.{end}": "END" for name in ("a", "b") for end in ("lo", "hi")}
    views = {f"cell.before[{k}]": "END" for k in range(3)}
    found = [
        at("one.minus(self.sine.square())", of={"one": "SQUARE", "self.sine": "END"}),
        at("one.minus(self.cosine.square())", of={"one": "SQUARE", "self.cosine": "END"}),
        at("radius.minus(y.square())", of={"radius": "TWO", "y": "END"}),
        at("radius.minus(x.square())", of={"radius": "TWO", "x": "END"}),
        at("wx.square().plus(wy.square())", of=plane),
        at("vx.square().plus(vy.square())", of=plane),
        at("square.minus(wz.square())", of={**plane, **space}),
        at("radius.plus(wz.square())", places=2, of={**plane, **space}),
        at("radius.plus(vz.square())", of={**plane, **space}),
        at("square.minus(radius)", of=space),
        at("before.minus(radius)", of=space),
        at("after.minus(radius)", of=space),
        at("radius.hi >> 2", of={"radius.hi": "TWO"}),
        at("cell.before[0].square().plus(cell.before[1].square())", of=views),
        at("a.lo as i64 + b.lo as i64", of=lengths),
        at("a.hi as i64 + b.hi as i64", of=lengths),
    ]
    for first, sign, second in (
        ("c.times(vx)", "minus", "s.times(vy)"),
        ("s.times(vx)", "plus", "c.times(vy)"),
        ("c.times(wx)", "plus", "s.times(wy)"),
        ("c.times(wy)", "minus", "s.times(wx)"),
    ):
        found.append(at(f"{first}.{sign}({second}).round(0)", of=plane))
    found.append(at("wx.times(vx).plus(wy.times(vy))", of=plane))
    found.append(at("wy.times(vx).minus(wx.times(vy))", of=plane))
    for part in ("cosine", "sine"):
        found.append(at(f"reach.times(arc.{part}()).round(0)", places=2, of={"reach": "END", f"arc.{part}()": "END"}))
    return found


def link(of, r):
    file = "core/src/propagate/link.rs"
    at = of(file)
    ends = {
        **{f"{v}.{end}": "END" for v in ("vector[k]", "placement.origin[k]", "tip[j]", "tip[k]") for end in ("lo", "hi")},
        **{f"{v}.{end}": "END" for v in ("own", "shift", "relative[k]") for end in ("lo", "hi")},
    }
    acted = {"factor": "ROTATION64", "lo": "STEP", "hi": "STEP", "sum[j].lo": "FOUR", "sum[j].hi": "FOUR"}
    squares = {
        "square": "LINK",
        "next.square_before": "SQUARE",
        "previous.square_after": "SQUARE",
        "along_next": "ALONG",
        "along_previous": "ALONG",
        "difference": "TWO",
    }
    turned = {**ends, "reach": "WIDE"}
    parts = {"parts[0]": "PRODUCT", "parts[1]": "PRODUCT", "parts[2]": "PRODUCT"}
    pairs = {"parts[(k + 1) % 3]": "PRODUCT", "parts[(k + 2) % 3]": "PRODUCT"}
    inner = {"wanted.lo": "PRODUCT", "wanted.hi": "PRODUCT", "sum.lo": "THREE", "sum.hi": "THREE"}
    relative = {f"relative[{k}]": "END" for k in range(3)}
    found = [
        at("placement.rotation[k][j] as i64", of={"placement.rotation[k][j]": "ROTATION"}),
        at("vector[k].lo as i64", of=ends),
        at("vector[k].hi as i64", of=ends),
        at("lo -= placement.origin[k].hi as i64", of={"lo": "WIDE", **ends}),
        at("hi -= placement.origin[k].lo as i64", of={"hi": "WIDE", **ends}),
        at("sum[j].lo += factor * lo", of=acted, note="two terms of two products before the third"),
        at("sum[j].hi += factor * hi", of=acted),
        at("sum[j].lo += factor * hi", of=acted),
        at("sum[j].hi += factor * lo", of=acted),
        at("s.round(placement.turn_slack)", of={"s": "ANY", "placement.turn_slack": "SLACK"}),
        at("sum.plus(vector[j].scale(factor))", of={"sum": "TWO", "vector[j]": "END", "factor": "UNIT"}),
        at("sum.plus(placement.origin[k].widen())", of={"sum": "THREE", "placement.origin[k]": "END"}),
        at("sum.round(placement.turn_slack)", of={"sum": "FOUR", "placement.turn_slack": "SLACK"}),
        at("fixed[1].times(own[1])", of={"fixed[1]": "END", "own[1]": "END"}),
        at(
            "sum.minus(across).minus(fixed[other].times(own[other]))",
            of={"sum": "TWO", "across": "PRODUCT", "fixed[other]": "END", "own[other]": "END"},
        ),
        at("dot(&placement.back, &next.before).double()", of={"placement.back": "UNIT", "next.before": "UNIT"}),
        at("dot(&placement.origin, &previous.after).double()", of={"placement.origin": "UNIT", "previous.after": "UNIT"}),
        at("square.plus(next.square_before).plus(along_next)", of=squares, note="eight: the packer's margin is needed"),
        at("square.plus(previous.square_after).minus(along_previous)", of=squares),
        at("previous.square_after.minus(next.square_before)", of=squares),
        at("difference.minus(square).halve()", of=squares),
        at("difference.plus(square).halve()", of=squares),
        at("a[0].times(b[0]).plus(a[1].times(b[1])).plus(a[2].times(b[2]))", of={f"{v}[{k}]": "END" for v in "ab" for k in range(3)}),
        at("sum.plus(axes[k][j].times(local.before[k]))", of={"sum": "TWO", "axes[k][j]": "END", "local.before[k]": "END"}),
        at("sum.plus(tip[j].widen())", of={"sum": "THREE", "tip[j]": "END"}),
        at("sum.round(0)", places=2, of={"sum": "FOUR"}),
        at("base.after[k].less(tip[k])", places=4, of={"base.after[k]": "END", "tip[k]": "END"}),
        at("dot(&axes[k], &relative).round(0)", of={"axes[k]": "END", "relative": "END"}),
        at("relative[0].square().plus(relative[1].square()).plus(relative[2].square())", places=2, of=relative),
        at("own.lo as i64 + tip[j].lo as i64", of=ends),
        at("own.hi as i64 + tip[j].hi as i64", of=ends),
        at("tip[k].lo as i64 - reach", of=turned),
        at("tip[k].hi as i64 + reach", of=turned),
        at("dot(axis_in_tip, &local.before).round(0)", of={"axis_in_tip": "END", "local.before": "END"}),
        at("local.square_before.minus(along.square())", of={"local.square_before": "SQUARE", "along": "END"}),
        at("along.times(axis_in_base[k]).round(0)", of={"along": "END", "axis_in_base[k]": "END"}),
        at("tip[k].lo as i64 + shift.lo as i64 - reach", of=turned),
        at("tip[k].hi as i64 + shift.hi as i64 + reach", of=turned),
        at("dot(&cone.in_tip, &local.before).round(0)", of={"cone.in_tip": "END", "local.before": "END"}),
        at("along.widen()", of={"along": "END"}),
        at("tip[k].lo as i64 + relative[k].lo as i64", of=ends),
        at("tip[k].hi as i64 + relative[k].hi as i64", of=ends),
        at(
            "most += dot(fixed, own).hi",
            of={"most": "TRACE", "dot(fixed, own).hi": "SIZES"},
            assume=("1000 * size(most) <= 2 * 1733 * ONE_SQUARED",),
            note="two columns of a rotation before the third; see FACTS",
        ),
        at(
            "least.lo - (most - own.times(*fixed).hi)",
            of={"least.lo": "TRACE_LEAST", "most": "TRACE", "own.times(*fixed).hi": "PRODUCT"},
            assume=("either(5 * least.lo <= 13 * ONE_SQUARED, 2 * most >= -ONE_SQUARED)", "1000 * size(most - own.times(*fixed).hi) <= 3 * 1733 * ONE_SQUARED"),
            note="a small turn keeps the trace from being negative; see FACTS",
        ),
        at("own.times(*fixed)", of={"own": "END", "fixed": "END"}),
        at("i64::MAX >> 1", of={}),
        at("a[k].times(b[k])", of={"a[k]": "END", "b[k]": "END"}),
        at("parts[0].plus(parts[1]).plus(parts[2])", of=parts),
        at("inner.widen()", of={"inner": "END"}),
        at("wanted.lo - sum.lo", of=inner),
        at("(sum.hi - sum.lo) >> 4", places=2, of=inner),
        at("sum.hi - wanted.hi", of=inner),
        at("parts[(k + 1) % 3].plus(parts[(k + 2) % 3])", of=pairs),
        at("wanted.minus(others)", of={"wanted": "PRODUCT", "others": "TWO"}),
    ]
    return found


def start(of, r):
    at = of("core/src/propagate/start.rs")
    norm = {"square(w)": "PRODUCT", **{f"square({n})": "PRODUCT" for n in "xyzabc"}}
    spread = {
        "length": "LENGTH",
        "cosine.lo": "UNIT",
        "cosine.hi": "UNIT",
        "sine.hi": "UNIT",
        "square.hi": "SQUARE",
        "across": "LENGTH",
    }
    half = {"half": "HALF", "square": "PLUS", "half_cosine": "LENGTH"}
    return [
        at("root_up(ONE_SQUARED - a as i64 * a as i64).min(ONE as i64) as i32", of={"a": "END"}),
        at(
            "Interval::point(a).times(cosine).plus(Interval::point(across).times(sine))",
            of={"Interval::point(a)": "END", "cosine": "END", "Interval::point(across)": "END", "sine": "END"},
        ),
        at("sum.round(1)", of={"sum": "TWO"}),
        at("-upper(-component.lo)", of={"component.lo": "END", "upper(-component.lo)": "END"}),
        at("-component.lo", of={"component.lo": "END"}),
        at("root_up(square.hi).min(ONE as i64)", of=spread),
        at("-((-n) >> 30)", of={"n": "SIZES"}, result=(r["NOMINAL"].low, r["NOMINAL"].high)),
        at("(length * cosine.lo as i64) >> 30", of=spread),
        at("root_up(square.hi - n * n).min(ONE as i64)", of={**spread, "n": "NOMINAL"}),
        at("n * cosine.lo as i64", of={**spread, "n": "NOMINAL"}),
        at("n * cosine.hi as i64", of={**spread, "n": "NOMINAL"}),
        at("-((-(near.max(far) + across * sine.hi as i64)) >> 30)", of={**spread, "near": "TWO", "far": "TWO"}),
        at("-upper(-nominal.lo)", of={"upper(-nominal.lo)": "WIDE"}),
        at("-nominal.lo", of={"nominal.lo": "SIZES"}),
        at("half.clamp(0, ONE)", of={"half": "I32"}),
        at("half as i64 * half as i64", of=half),
        at("ONE_SQUARED - 2 * square", places=2, of=half),
        at("root_up(ONE_SQUARED - square).min(ONE as i64)", of=half),
        at("((2 * half as i64 * half_cosine) >> 30) + 1", of=half),
        at("ONE as u32", places=2, of={}),
        at("a.square()", of={"a": "UNIT"}),
        at("square(w).plus(square(x)).plus(square(y)).plus(square(z))", of=norm),
        at("ONE_SQUARED >> 2", of={}),
        at("square(w).plus(square(a)).minus(square(b)).minus(square(c))", of=norm),
        at("a.times(b).double()", of={"a": "UNIT", "b": "UNIT"}),
        at("w.times(c).double()", of={"w": "UNIT", "c": "UNIT"}),
        at("first.plus(second)", of={"first": "TWO", "second": "TWO"}),
        at("first.minus(second)", of={"first": "TWO", "second": "TWO"}),
        at("v as i64 - 2", of={"v": "I32"}),
        at("v as i64 + 2", of={"v": "I32"}),
        at("cosine.widen()", places=2, of={"cosine": "END"}),
        at(
            "cosine.widen().double().plus(Interval::point(ONE).widen())",
            of={"cosine": "END", "Interval::point(ONE)": "UNIT"},
        ),
        at("ONE_SQUARED >> 40", of={}),
    ]


def network(of, r):
    at = of("core/src/propagate/mod.rs")
    branch = of("core/src/propagate/branch.rs")
    sliding = {
        "joint.multiple": "I8",
        "factor": "REACH",
        "span.length.lo": "END",
        "span.length.hi": "END",
        "joint.shift.lo": "END",
        "joint.shift.hi": "END",
        "a": "REACH",
        "b": "REACH",
    }
    one = r["UNIT"].high
    ahead = Number("i64", 0, 2 * one)
    file = "core/src/propagate/branch.rs"
    return [
        at("own.length.less(joint.shift)", of={"own.length": "END", "joint.shift": "END"}),
        at("joint.shift.less(own.length)", of={"own.length": "END", "joint.shift": "END"}),
        at("joint.multiple as i64", of=sliding),
        Lemma(
            "core/src/propagate/mod.rs",
            "span.length.lo as i64 * factor",
            {"span.length.lo": r["END"], "factor": Number("i64", -128, 127)},
        ),
        Lemma(
            "core/src/propagate/mod.rs",
            "span.length.hi as i64 * factor",
            {"span.length.hi": r["END"], "factor": Number("i64", -128, 127)},
        ),
        at("a.min(b) + joint.shift.lo as i64", of=sliding),
        at("a.max(b) + joint.shift.hi as i64", of=sliding),
        at("1 << 34", of={}),
        Lemma(file, "self.length.width() as u32", {"self.length.width()": r["SPAN"]}),
        branch("1 << 30", of={}),
        branch("((self.length.lo as i64 + self.length.hi as i64) >> 1) as i32", of={"self.length.lo": "END", "self.length.hi": "END"}),
        branch("-x", of={"x": "TWO"}),
        branch("(x >> 31).max(0)", of={"x": "TWO"}, result=(0, 2 * one)),
        branch("(y >> 31).max(0)", of={"y": "TWO"}, result=(0, 2 * one)),
        Lemma(file, "(y << 28) / (x + y).max(1)", {"x": ahead, "y": ahead}),
        Lemma(
            file,
            "(quarters << 28) + (part.min(ONE as i64 >> 2) as u32)",
            {"quarters": Number("u32", 0, 3), "part": Number("i64", 0, 1 << 59)},
        ),
        Lemma(file, "span.size(variable.motion) as u64", {"span.size(variable.motion)": Number("u32", 0, 2**32 - 1)}, terms=8),
        branch("1 << 5", of={}),
    ]


def rows(of, r):
    file = "core/src/rows.rs"
    at = of(file)
    one = r["UNIT"].high
    turn = r["ROTATION"]
    row = {"a[i][k]": turn, "b[k][j]": r["ROTATION"], "v[k]": r["END"]}
    # Rows and columns of rotations: see FACTS.
    narrow = Number("i64", -2 * one * (one - 1), 2 * one * (one - 1))
    slide = {
        "variable.length": r["END"],
        "variable.length.magnitude()": Number("i64", 0, one + 1),
        "joint.shift.magnitude()": Number("i64", 0, one + 1),
        "joint.shift.width()": r["SPAN"],
        "half_way(variable.length)": r["WIDE"],
        "half_way(joint.shift)": r["WIDE"],
        "multiple": Number("i64", -128, 127),
        "noise": r["NOISE"],
        "extent": Number("i64", 0, 129 * (one + 1)),
    }
    l = {"l0": turn, "l1": turn, "cx": r["WIDE"], "cy": r["WIDE"], "rx": Number("i64", 0, one + 3), "ry": Number("i64", 0, one + 3)}
    form = {
        "form.lo": r["REMAINDER"],
        "form.hi": r["REMAINDER"],
        "bend.lo": r["THREE"],
        "bend.hi": r["THREE"],
        "error": Number("i64", 0, 270 * one),
    }
    add = {
        "self.lo": r["WEIGHTED"],
        "self.hi": r["WEIGHTED"],
        "a": Number("i128", -(2**90), 2**90),
        "b": Number("i128", -(2**90), 2**90),
        "slack": Number("i64", 0, 2 * one + 64),
        "bound": r["WEIGHTED"],
        "factor": r["FACTOR"],
    }
    bend = {"times": Number("i64", 0, 128), "sine": Number("i64", 0, one + 1), "one": Number("i64", one, one)}
    loose = {**bend, "loose": Number("i64", 0, one), "bent": Number("i64", 0, 130 * one), "cube(loose)": Number("i64", 0, one + 3)}

    def exactly(quote, where, **more):
        return Lemma(file, quote, where, **more)

    return [
        exactly("a[i][k] as i64 * b[k][j] as i64", row, terms=3),
        exactly("a[i][k] as i64 * v[k] as i64", row, terms=3),
        exactly("((sum + (1 << (FRACTION_BITS - 1))) >> FRACTION_BITS) as i32", {"sum": narrow}, note="less than two; see FACTS"),
        exactly("rounded(sum) as i64", {"rounded(sum)": r["I32"]}),
        exactly("((i.lo as i64 + i.hi as i64) >> 1) as i32", {"i.lo": r["END"], "i.hi": r["END"]}),
        exactly("(i.lo as i64 + i.hi as i64) >> 1", {"i.lo": r["END"], "i.hi": r["END"]}, places=2),
        exactly("-d.y", {"d.y": r["END"]}),
        exactly("sine.lo as i64", {"sine.lo": r["END"]}),
        exactly("sine.hi as i64", {"sine.hi": r["END"]}),
        exactly("span.length.lo as i64 - middle", {"span.length.lo": r["END"], "middle": r["WIDE"]}),
        exactly("span.length.hi as i64 - middle", {"span.length.hi": r["END"], "middle": r["WIDE"]}),
        exactly("origin[k] + step[k]", {"origin[k]": r["ORIGIN"], "step[k]": r["STEP"]}),
        exactly(
            "noise += 2 * placement_noise(placement.turn_slack, &placement.origin)",
            {"noise": r["NOISE"], "placement_noise(placement.turn_slack,&placement.origin)": Number("i64", 0, 3 * one + 3)},
        ),
        exactly("ONE as i64 - about.cosine().lo as i64", {"about.cosine().lo": r["UNIT"]}, result=(0, 2 * one)),
        exactly("joint.multiple as i64", {"joint.multiple": r["I8"]}, places=3),
        exactly("half_way(variable.length) * multiple + half_way(joint.shift)", slide, result=(-130 * one, 130 * one)),
        exactly("at[k][2] as i64", {"at[k][2]": turn}),
        exactly("origin[k] + scaled(at[k][2] as i64, length)", {"origin[k]": r["ORIGIN"], "scaled(at[k][2] as i64,length)": r["REACH"]}),
        exactly("variable.length.magnitude() * multiple.abs() + joint.shift.magnitude()", slide, result=(0, 129 * (one + 1))),
        exactly("noise += joint.shift.width() + 2 * ROUNDING * (extent >> FRACTION_BITS)", slide),
        exactly(
            "ROUNDING + last.noise + 2 * spread",
            {"last.noise": r["NOISE"], "spread": r["SPAN"]},
        ),
        exactly("at_middle[k] + origin", {"at_middle[k]": r["STEP"], "origin": r["ORIGIN"]}),
        exactly("value - noise", {"value": r["ORIGIN"], "noise": r["NOISE"]}),
        exactly("value + noise", {"value": r["ORIGIN"], "noise": r["NOISE"]}),
        exactly(
            "form.coefficients[variable] += row[2] as i64 * joint.multiple as i64",
            {"form.coefficients[variable]": r["COEFFICIENT"], "row[2]": turn, "joint.multiple": r["I8"]},
        ),
        exactly("(x.width() + 1) / 2 + 1", {"x.width()": r["SPAN"]}, result=(0, one + 3)),
        exactly("(y.width() + 1) / 2 + 1", {"y.width()": r["SPAN"]}, result=(0, one + 3)),
        exactly("hi.max(-lo)", {"hi": r["WIDE"], "lo": r["WIDE"]}),
        exactly("l1 as i64 * cx - l0 as i64 * cy", l),
        exactly(
            "form.coefficients[variable] += along * joint.multiple as i64",
            {"form.coefficients[variable]": r["COEFFICIENT"], "along": r["STEP"], "joint.multiple": r["I8"]},
        ),
        exactly(
            "((l1.unsigned_abs() as i64 * rx + l0.unsigned_abs() as i64 * ry) >> FRACTION_BITS) + 2",
            l,
            result=(0, 2 * one + 2048),
        ),
        exactly(
            "((left * middle.sine) >> FRACTION_BITS) + scaled(along.abs(), bent) + 2",
            {
                "left": Number("i64", 0, 2 * one + 2048),
                "middle.sine": Number("i64", 0, one + 1),
                "scaled(along.abs(),bent)": Number("i64", 0, 267 * one),
            },
            result=(0, 270 * one),
        ),
        exactly("along.abs()", {"along": r["STEP"]}),
        exactly("x.scale(l0).plus(y.scale(l1)).round(0)", {"x": r["END"], "y": r["END"], "l0": turn, "l1": turn}),
        exactly("((middle.versine + 1) >> 1) as i32", {"middle.versine": Number("i64", 0, 2 * one)}, result=(0, one)),
        exactly("across.times(half).double()", {"across": r["END"], "half": r["END"]}),
        exactly("form.lo += ((-bend.hi) >> FRACTION_BITS) - error", form),
        exactly("form.hi += -(bend.lo >> FRACTION_BITS) + error", form),
        exactly("*own += scaled(*c, factor)", {"own": r["COEFFICIENT"], "scaled(*c,factor)": r["COEFFICIENT"]}),
        exactly("bound as i128 * factor as i128", {**add, "factor": Number("i64", -(2**31), 2**31)}, result=(-(2**90), 2**90)),
        exactly("slack + MOST_JOINTS as i64", add),
        exactly("self.lo += (a.min(b) >> FRACTION_BITS) as i64 - slack", add),
        exactly("self.hi += -((-a.max(b)) >> FRACTION_BITS) as i64 + slack", add),
        exactly("l - self.hi", {"l": r["STEP"], "self.hi": r["WEIGHTED"]}),
        exactly("h - self.lo", {"h": r["STEP"], "self.lo": r["WEIGHTED"]}),
        exactly("-FARTHEST", {}, places=2),
        exactly("l.min(FARTHEST) << FRACTION_BITS", {"l": Number("i64", -(2**32), 2**60)}, assume=("l > -FARTHEST",)),
        exactly("h.max(-FARTHEST) << FRACTION_BITS", {"h": Number("i64", -(2**60), 2**32)}, assume=("h < FARTHEST",)),
        exactly("(self.lo + self.hi) >> 1", {"self.lo": r["WEIGHTED"], "self.hi": r["WEIGHTED"]}),
        exactly("scaled(scaled(x, x), x) + 3", {"scaled(scaled(x,x),x)": Number("i64", 0, one)}),
        exactly("self.multiple.unsigned_abs() as i64", {"self.multiple": r["I8"]}, result=(0, 128)),
        exactly("times * sine", bend),
        exactly("one + far", {**bend, "far": Number("i64", 0, 128 * (one + 1))}, result=(0, 130 * one)),
        exactly(
            "self.turn.about(self.turn.middle()).sine().magnitude() + 16 + 4 * times",
            {"self.turn.about(self.turn.middle()).sine().magnitude()": Number("i64", 0, one + 1), **bend},
        ),
        exactly("one * 9 / 10", bend),
        exactly("loose + cube(loose) / 4 + 1", loose),
        exactly("2 * one", bend),
        exactly(
            "bent + if loose < one * 9 / 10 { loose + cube(loose) / 4 + 1 } else { 2 * one }",
            loose,
            result=(0, r["BEND"].high),
        ),
        exactly(
            "((a as i128 * b as i128) >> FRACTION_BITS) as i64",
            {"a": Number("i64", -(2**44), 2**44), "b": Number("i64", -(2**44), 2**44)},
        ),
        exactly(
            "turn_slack as i64 + origin.iter().map(|o| o.width()).max().unwrap_or(0)",
            {"turn_slack": r["SLACK"], "origin.iter().map(|o| o.width()).max().unwrap_or(0)": r["SPAN"]},
            result=(0, 3 * one + 1),
        ),
        exactly("middle + lo", {"middle": r["WIDE"], "lo": r["STEP"]}),
        exactly("middle + hi", {"middle": r["WIDE"], "hi": r["STEP"]}),
        exactly("root_down(ONE_SQUARED - sine * sine)", {"sine": r["WIDE"]}),
        exactly("cosine as i32", {"cosine": Number("i64", 0, one)}),
        exactly("sine as i32", {"sine": r["WIDE"]}),
    ]


def relaxation(of, r):
    file = "core/src/relaxation.rs"
    one = r["UNIT"].high
    vectors = {**{f"{v}[{k}]": r["WIDE"] for v in ("a", "d", "along") for k in "ij"}}
    shares = {"turn": Number("i64", -9 * one, 9 * one), "t": Number("i64", -9 * one, 9 * one), "size": Number("i64", 1, 2**31)}

    def exactly(quote, where, **more):
        return Lemma(file, quote, where, **more)

    return [
        exactly("cone.least.lo >> FRACTION_BITS", {"cone.least.lo": r["PRODUCT"]}),
        exactly("bound.lo as i64", {"bound.lo": r["END"]}),
        exactly("bound.hi as i64", {"bound.hi": r["END"]}),
        exactly("ONE as i64 / 2", {}),
        exactly("least.lo >> (FRACTION_BITS + 1)", {"least.lo": r["TRACE_LEAST"]}),
        exactly("sine.hi as i64", {"sine.hi": r["END"]}),
        exactly("(i.lo as i64 + i.hi as i64) / 2", {"i.lo": r["END"], "i.hi": r["END"]}),
        exactly("forms[k].middle().clamp(-(ONE as i64), ONE as i64)", {"forms[k].middle()": r["WEIGHTED"]}),
        exactly("*turn += (a[i] * d[j] - a[j] * d[i]) >> FRACTION_BITS", {**vectors, **shares}),
        exactly("(t >> 6) * (t >> 6)", shares, terms=3),
        exactly("(((t >> 6) << FRACTION_BITS) / size).clamp(-(ONE as i64), ONE as i64)", shares),
        exactly("(along[i] * a[j] - along[j] * a[i]) >> (FRACTION_BITS + 1)", vectors, result=(-one - 4, one + 4)),
        exactly("(v.lo as i64 + v.hi as i64) / 2", {"v.lo": r["END"], "v.hi": r["END"]}),
        exactly("(hi - lo) / 8", {"hi": r["WIDE"], "lo": r["WIDE"]}),
        exactly("1 << 10", {}),
        exactly("hi - slice", {"hi": r["WIDE"], "slice": r["STEP"]}, places=2),
        exactly("lo + slice", {"lo": r["WIDE"], "slice": r["STEP"]}, places=2),
    ]
