"""Turns a quoted expression into obligations and lets z3 decide them.

Every part of an expression must stay in its type: sums, products, negations, shifts, divisions and casts. Sums and
shifts by a constant are linear for z3. A product or quotient is first shown to lie within bounds (one query for each
pair of ranges) and then stands for any number within them, so that every query is small.

An interval is handled by its ends: `a.minus(b)` subtracts some end of `b` from some end of `a`, and a lemma about all
ends holds for the ones the code picks. So the methods of intervals and products are read as the arithmetic they do.
"""

import itertools
import math
from dataclasses import dataclass, field

import rust
import z3

# Steps z3 may take for one query; not seconds, so that the outcome does not depend on the machine's load.
STEPS = 20_000_000


@dataclass(frozen=True)
class Number:
    """Any integer of a type between two bounds."""

    kind: str
    low: int
    high: int

    def any(self):
        return Number(self.kind, *rust.bounds(self.kind))


@dataclass
class Lemma:
    """What must hold of an expression that stands in a file, for all values of its variables in their ranges."""

    file: str
    quote: str
    where: dict = field(default_factory=dict)
    assume: tuple = ()
    cases: dict = field(default_factory=dict)
    result: tuple = None
    places: int = 1
    terms: int = 1
    note: str = ""


class Open(Exception):
    """An obligation that z3 does not confirm; says which and, when there is one, at what values it fails."""


@dataclass
class Value:
    """What an expression comes to: its type (`None`: a literal's), a z3 term and bounds."""

    kind: str
    term: z3.ArithRef
    low: int
    high: int


def corners(sign, a, b):
    """Bounds of a product or quotient from those of its operands."""
    if sign == "*":
        found = [x * y for x in (a.low, a.high) for y in (b.low, b.high)]
    else:
        found = [x // y for x in (a.low, a.high) for y in (b.low, b.high)]
        found += [-(-x // y) for x in (a.low, a.high) for y in (b.low, b.high)] + [0]
    return min(found), max(found)


class Engine:
    """Proves lemmas under given constants; counts the queries."""

    def __init__(self, constants, loosened=False, steps=STEPS):
        self.constants = constants
        self.loosened = loosened
        self.steps = steps
        self.one = constants["ONE"][1]
        self.known = {}
        self.queries = 0
        self.fresh = itertools.count()

    def holds(self, premises, claim):
        """Whether the claim follows; otherwise a model of the opposite, or `None` when z3 gives up."""
        self.queries += 1
        solver = z3.Solver()
        solver.set("rlimit", self.steps)
        solver.add(*premises, z3.Not(claim))
        answer = solver.check()
        if answer == z3.unsat:
            return True
        return solver.model() if answer == z3.sat else None

    def unknown(self, kind, low, high):
        term = z3.Int(f"any{next(self.fresh)}")
        self.premises += [term >= low, term <= high]
        return Value(kind, term, low, high)

    def require(self, claim, text):
        answer = self.holds(self.premises, claim)
        if answer is not True and self.products:
            # Products by their definition, so that a counterexample is one.
            answer = self.holds(self.premises + self.products, claim)
        if answer is not True:
            raise Open(f"{text}: {self.witness(answer)}")

    def witness(self, model):
        if model is None:
            return "z3 gives up"
        values = {name: model.eval(term) for name, term in self.variables.items()}
        return "fails at " + ", ".join(f"{name} = {value}" for name, value in sorted(values.items()))

    def bounded(self, sign, a, b, same):
        """The product or quotient as a number within bounds that z3 confirms (once for each pair of ranges)."""
        low, high = corners(sign, a, b)
        if same and sign == "*":
            low = max(low, 0)
        key = (sign, a.low, a.high, b.low, b.high, same)
        if key not in self.known:
            # Products over the reals, which z3 decides faster and which include the integers.
            x, y = z3.Reals("x y") if sign == "*" else z3.Ints("x y")
            ranges = [x >= a.low, x <= a.high] + ([y == x] if same else [y >= b.low, y <= b.high])
            if sign == "*":
                claim = z3.And(x * y >= low, x * y <= high)
            else:
                # The quotient lies within one of the exact one, on the side of the rounding.
                q, rest = z3.Ints("q rest")
                ranges += [x == q * y + rest, rest < y if b.low > 0 else rest < -y, rest > -y if b.low > 0 else rest > y]
                ranges += [z3.Or(rest >= 0, x < 0)]
                claim = z3.And(q >= low - 1, q <= high + 1)
            self.known[key] = self.holds(ranges, claim) is True
        if not self.known[key]:
            raise Open(f"no bounds for a {sign} with operands in [{a.low}, {a.high}] and [{b.low}, {b.high}]")
        slack = 0 if sign == "*" else 1
        return low - slack, high + slack

    def fit(self, value, text):
        """The value, once z3 has confirmed that it fits its type."""
        if value.kind is None:
            return value
        least, most = rust.bounds(value.kind)
        self.require(z3.And(value.term >= least, value.term <= most), f"`{text}` leaves {value.kind}")
        return Value(value.kind, value.term, max(value.low, least), min(value.high, most))

    def operate(self, sign, a, b, text, same=False):
        kind = a.kind if sign in ("<<", ">>") else a.kind or b.kind
        if sign not in ("<<", ">>") and a.kind and b.kind and a.kind != b.kind:
            raise SyntaxError(f"`{text}` mixes {a.kind} and {b.kind}")
        if sign == "+":
            return self.fit(Value(kind, a.term + b.term, a.low + b.low, a.high + b.high), text)
        if sign == "-":
            return self.fit(Value(kind, a.term - b.term, a.low - b.high, a.high - b.low), text)
        if sign in ("*", "/"):
            if sign == "/":
                self.require(b.term != 0, f"`{text}` divides by zero")
                self.require(z3.Or(b.term != -1, a.term != rust.bounds(kind)[0]), f"`{text}` has no negative")
                if b.low <= 0 <= b.high:
                    raise Open(f"`{text}`: the divisor's bounds hold zero")
            if a.low == a.high or (b.low == b.high and sign == "*"):
                if sign == "*":
                    factor, other = (a.low, b) if a.low == a.high else (b.low, a)
                    ends = sorted((factor * other.low, factor * other.high))
                    return self.fit(Value(kind, factor * other.term, *ends), text)
            found = self.unknown(kind, *self.bounded(sign, a, b, same))
            if sign == "*":
                self.products.append(found.term == a.term * b.term)
            return self.fit(found, text)
        if sign in ("<<", ">>"):
            if b.low != b.high:
                raise Open(f"`{text}`: the shift is not a constant")
            bits = rust.INTEGERS[kind or "i64"]
            if not 0 <= b.low < bits:
                raise Open(f"`{text}` shifts {kind} by {b.low}")
            power = 1 << b.low
            if sign == "<<":
                # The value is kept: no bit is shifted out.
                return self.fit(Value(kind, a.term * power, a.low * power, a.high * power), text)
            return self.fit(Value(kind, a.term / power, a.low >> b.low, a.high >> b.low), text)
        raise SyntaxError(f"`{sign}` is not known")

    def number(self, value, kind=None):
        return Value(kind, z3.IntVal(value), value, value)

    def name(self, text):
        if text in self.variables_of:
            number = self.variables_of[text]
            if text not in self.variables:
                if self.loosened and number.low != number.high:
                    number = number.any()
                term = z3.Int(text)
                self.variables[text] = term
                self.premises += [term >= number.low, term <= number.high]
                self.ranges[text] = number
            number = self.ranges[text]
            return Value(number.kind, self.variables[text], number.low, number.high)
        last = text.split("::")[-1]
        if text == "i64::MAX":
            return self.number(rust.bounds("i64")[1], "i64")
        if last in self.constants:
            kind, value = self.constants[last]
            return self.number(value, kind)
        raise SyntaxError(f"`{text}` has no range")

    def method(self, name, receiver, arguments, text):
        a = self.value(receiver)
        end = ("i32", -self.one - 1, self.one + 1)
        if name in ("lo", "hi"):
            return a
        if name == "abs":
            least = rust.bounds(a.kind)[0]
            self.require(a.term != least, f"`{text}` has no absolute value")
            return Value(a.kind, z3.If(a.term >= 0, a.term, -a.term), 0, max(abs(a.low), abs(a.high)))
        if name == "unsigned_abs":
            kind = a.kind.replace("i", "u")
            return Value(kind, z3.If(a.term >= 0, a.term, -a.term), 0, max(abs(a.low), abs(a.high)))
        if name == "isqrt":
            x, y = z3.Ints("x y")
            most = math.isqrt(max(a.high, 0))
            if self.holds([y >= 0, y * y <= a.high], y <= most) is not True:
                raise Open(f"`{text}`: no bound of the root")
            return self.unknown(a.kind, 0, most)
        if name in ("min", "max"):
            b = self.value(arguments[0])
            pick = min if name == "min" else max
            test = a.term <= b.term if name == "min" else a.term >= b.term
            return Value(a.kind or b.kind, z3.If(test, a.term, b.term), pick(a.low, b.low), pick(a.high, b.high))
        if name == "clamp":
            low, high = (self.value(argument) for argument in arguments)
            self.require(low.term <= high.term, f"`{text}` has its ends the wrong way round")
            term = z3.If(a.term < low.term, low.term, z3.If(a.term > high.term, high.term, a.term))
            return Value(a.kind, term, min(max(a.low, low.low), high.high), max(min(a.high, high.high), low.low))
        if name == "div_euclid":
            return self.operate("/", a, self.value(arguments[0]), text)
        # Ends of intervals (32 bits) and of products (64 bits).
        if name == "widen":
            return self.operate("<<", Value("i64", a.term, a.low, a.high), self.name("FRACTION_BITS"), text)
        if name == "double":
            return self.operate("*", self.number(2), a, text)
        if name == "halve":
            self.operate("-", self.number(0), a, text)
            return self.operate(">>", a, self.number(1), text)
        if name in ("plus", "minus"):
            return self.operate("+" if name == "plus" else "-", a, self.value(arguments[0]), text)
        if name in ("times", "scale", "square"):
            b = a if name == "square" else self.value(arguments[0])
            wide = [Value("i64", v.term, v.low, v.high) for v in (a, b)]
            return self.operate("*", *wide, text, same=name == "square")
        if name in ("round", "less"):
            b = self.value(arguments[0])
            wide = Value("i64", b.term, b.low, b.high)
            if name == "round":
                self.operate("-", self.number(0), a, text)
                shifted = self.operate(">>", a, self.name("FRACTION_BITS"), text)
                self.operate("+", shifted, wide, text)
                self.operate("-", shifted, wide, text)
            else:
                self.operate("-", Value("i64", a.term, a.low, a.high), wide, text)
            return self.unknown(*end)
        raise SyntaxError(f"`{name}` is not known")

    def call(self, name, arguments, text):
        values = [self.value(argument) for argument in arguments]
        end = ("i32", -self.one - 1, self.one + 1)
        if name == "dot":
            parts = [self.operate("*", *(Value("i64", v.term, v.low, v.high) for v in values), text) for _ in range(3)]
            return self.operate("+", self.operate("+", parts[0], parts[1], text), parts[2], text)
        if name in ("root_up", "root_down"):
            return self.unknown("i64", 0, math.isqrt(max(values[0].high, 0)) + 1)
        if name in ("clamp", "clamped"):
            return self.unknown(*end)
        raise SyntaxError(f"`{name}` is not known")

    def value(self, node):
        if node[0] == "number":
            return self.number(node[1], node[2])
        if node[0] == "name":
            return self.name(node[1])
        if node[0] in ("method", "call"):
            text = node[-1]
            if text in self.variables_of:
                return self.name(text)
            return self.method(*node[1:]) if node[0] == "method" else self.call(*node[1:])
        if node[0] == "negative":
            a = self.value(node[1])
            return self.fit(Value(a.kind, -a.term, -a.high, -a.low), "a negative")
        if node[0] == "cast":
            a = self.value(node[1])
            return self.fit(Value(node[2], a.term, a.low, a.high), "a cast")
        if node[0] == "either":
            a, b = self.value(node[1]), self.value(node[2])
            return Value(
                a.kind or b.kind,
                z3.If(z3.Bool(f"choice{next(self.fresh)}"), a.term, b.term),
                min(a.low, b.low),
                max(a.high, b.high),
            )
        if node[0] == "binary":
            a = self.value(node[2])
            same = node[1] == "*" and node[2] == node[3]
            b = a if same else self.value(node[3])
            if node[1] in rust.Parser.LEVELS[0]:
                return self.unknown(None, 0, 1)
            return self.operate(node[1], a, b, describe(node), same)
        raise SyntaxError(str(node))

    def begin(self, where):
        self.variables_of = {rust.canonical(name): number for name, number in where.items()}
        self.variables, self.ranges, self.premises, self.products = {}, {}, [], []

    def prove(self, lemma):
        """Shows every obligation of a lemma; raises [`Open`] at the first that is not confirmed."""
        for case in [dict(zip(lemma.cases, values)) for values in itertools.product(*lemma.cases.values())] or [{}]:
            self.begin({**lemma.where, **{name: Number(kind, v, v) for name, (kind, v) in case.items()}})
            plain = {name: v for name, (_, v) in case.items()}
            for assumption in lemma.assume:
                self.assume(assumption, plain)
            found = self.value(rust.Parser(lemma.quote).whole())
            if lemma.terms > 1:
                # The closure's sum, term after term.
                total = found
                for _ in range(lemma.terms - 1):
                    more = self.unknown(found.kind, found.low, found.high)
                    total = self.operate("+", total, more, lemma.quote)
                found = total
            if lemma.result and found is not None:
                low, high = lemma.result
                self.require(z3.And(found.term >= low, found.term <= high), f"the result leaves [{low}, {high}]")
            if lemma.assume and self.holds(self.premises, z3.BoolVal(False)) is True:
                raise Open("the assumptions exclude each other")

    def assume(self, text, case):
        """Adds a comparison of sums of variables and constants as a premise."""
        scope = {**{name: value for name, (_, value) in self.constants.items()}, "either": z3.Or, "size": size, **case}
        text = rust.canonical(text).replace(",", ", ")
        for at, name in enumerate(sorted(self.variables_of, key=len, reverse=True)):
            if name not in case:
                text = text.replace(name, f"variable{at}")
                scope[f"variable{at}"] = self.name(name).term
        self.premises.append(eval(text, {"__builtins__": {}}, scope))


def size(term):
    return z3.If(term >= 0, term, -term)


def describe(node):
    """An expression in words short enough for a message."""
    if node[0] in ("method", "call"):
        return node[-1]
    if node[0] == "binary":
        return f"{describe(node[2])} {node[1]} {describe(node[3])}"
    if node[0] == "negative":
        return f"-{describe(node[1])}"
    if node[0] == "cast":
        return f"{describe(node[1])} as {node[2]}"
    if node[0] == "either":
        return f"({describe(node[1])} or {describe(node[2])})"
    return str(node[1])
