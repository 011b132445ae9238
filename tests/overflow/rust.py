"""Reads the part of Rust that the lemmas need: tokens, constants and arithmetic expressions."""

import re
from dataclasses import dataclass

TOKEN = re.compile(
    r"""(?P<skip>\s+|//[^\n]*|"(?:[^"\\]|\\.)*"|'[a-z_]+\b(?!'))
      | (?P<number>\d[\d_]*(?:\.\d+)?(?:[iu](?:8|16|32|64|128|size)|f32|f64)?)
      | (?P<name>[A-Za-z_]\w*)
      | (?P<sign><<=|>>=|<<|>>|->|=>|::|\.\.=|\.\.|==|!=|<=|>=|&&|\|\||\+=|-=|\*=|/=|%=|.)""",
    re.VERBOSE | re.DOTALL,
)
KEYWORDS = {"let", "return", "if", "else", "match", "in", "mut", "while", "for", "ref", "move", "impl", "as"}
INTEGERS = {"i8": 8, "i32": 32, "i64": 64, "i128": 128, "u8": 8, "u16": 16, "u32": 32, "u64": 64, "usize": 32}
# Methods and functions that do arithmetic: each use must be covered like an operator.
METHODS = {
    "abs", "checked_add", "checked_mul", "checked_sub", "clamp", "div_euclid", "double", "halve", "less", "minus", "negate", "over", "over_interval", "plus",
    "pow", "product", "rem_euclid", "round", "scale", "square", "sum", "times", "widen", "wrapping_add", "wrapping_mul",
}


@dataclass(frozen=True)
class Token:
    kind: str
    text: str
    line: int


def tokens(text):
    """The tokens of a source text without comments, strings and lifetimes."""
    found, line = [], 1
    for match in TOKEN.finditer(text):
        if match.lastgroup != "skip":
            found.append(Token(match.lastgroup, match.group(), line))
        line += match.group().count("\n")
    return found


def bounds(kind):
    """Least and greatest value of an integer type; `usize` is taken as 32 bits."""
    bits = INTEGERS[kind]
    return (-(1 << bits - 1), (1 << bits - 1) - 1) if kind[0] == "i" else (0, (1 << bits) - 1)


def is_operand(token):
    return token.kind == "number" or token.text in (")", "]") or (token.kind == "name" and token.text not in KEYWORDS)


def operators(source):
    """Positions of everything that computes: operators, casts between integers, calls of METHODS."""
    found = []
    for at, token in enumerate(source):
        before = source[at - 1] if at else Token("sign", "", 0)
        after = source[at + 1] if at + 1 < len(source) else Token("sign", "", 0)
        starts = after.kind in ("number", "name") or after.text in ("(", "-", "*", "&")
        if token.text == "-" or token.text in ("+=", "-=", "*=", "/=", "%=", "<<=", ">>="):
            found.append(at)
        elif token.text in ("+", "*", "/", "%", "<<", ">>") and is_operand(before) and starts:
            found.append(at)
        elif token.text == "as" and after.text in INTEGERS:
            found.append(at)
        elif token.text in METHODS and before.text in (".", "::") and after.text in ("(", "::"):
            found.append(at)
    return found


def places(source, quote):
    """Where the tokens of a quotation stand in a source."""
    wanted = [token.text for token in tokens(quote)]
    texts = [token.text for token in source]
    return [at for at in range(len(texts) - len(wanted) + 1) if texts[at : at + len(wanted)] == wanted], len(wanted)


def canonical(text):
    """The tokens of an expression without spaces but between words."""
    return joined(tokens(text))


def joined(found):
    return re.sub(r"(?<=\W) | (?=\W)", "", " ".join(token.text for token in found))


def constants(sources):
    """Every `const NAME: TYPE = expression;` that is an integer expression over others: name to (type, value)."""
    pattern = re.compile(r"const (\w+): (\w+) = ([^;{]+);")
    known, waiting = {}, []
    for text in sources:
        waiting += [m.groups() for m in pattern.finditer(text) if m.group(2) in INTEGERS]
    while waiting:
        later = []
        for name, kind, expression in waiting:
            plain = re.sub(r"\b(?:super::|Self::)|\bas \w+", "", expression)
            plain = re.sub(r"(\d)_(?=\d)", r"\1", plain)
            names = set(re.findall(r"[A-Za-z_]\w*", plain))
            if names <= set(known):
                value = eval(plain.replace("/", "//"), {"__builtins__": {}}, {n: known[n][1] for n in names})
                low, high = bounds(kind)
                assert low <= value <= high, f"{name} does not fit {kind}"
                known[name] = (kind, value)
            else:
                later.append((name, kind, expression))
        if len(later) == len(waiting):
            break
        waiting = later
    return known


class Parser:
    """Expressions to nested tuples; the first entry names the node.

    `("number", value, type or None)`, `("name", text)`, `("negative", e)`, `("cast", e, type)`,
    `("binary", sign, a, b)`, `("method", name, receiver, arguments, text)`, `("call", name, arguments, text)`,
    `("either", a, b)` for an `if` whose condition is left open.
    """

    LEVELS = [("<=", ">=", "<", ">", "=="), ("<<", ">>"), ("+", "-"), ("*", "/", "%")]

    def __init__(self, text):
        self.tokens = tokens(text) + [Token("end", "", 0)]
        self.at = 0

    def next(self):
        self.at += 1
        return self.tokens[self.at - 1]

    def peek(self):
        return self.tokens[self.at].text

    def expect(self, text):
        token = self.next()
        if token.text != text:
            raise SyntaxError(f"{text!r} expected, {token.text!r} found")

    def text(self, start):
        return joined(self.tokens[start : self.at])

    def whole(self):
        node = self.binary(0)
        if self.peek() in ("+=", "-="):
            node = ("binary", self.next().text[0], node, self.binary(0))
        if self.tokens[self.at].kind != "end":
            raise SyntaxError(f"unexpected {self.peek()!r}")
        return node

    def binary(self, level):
        if level == len(self.LEVELS):
            return self.cast()
        left = self.binary(level + 1)
        while self.peek() in self.LEVELS[level]:
            sign = self.next().text
            left = ("binary", sign, left, self.binary(level + 1))
        return left

    def cast(self):
        node = self.unary()
        while self.peek() == "as":
            self.next()
            node = ("cast", node, self.next().text)
        return node

    def unary(self):
        if self.peek() == "-":
            self.next()
            return ("negative", self.unary())
        if self.peek() in ("*", "&"):
            self.next()
            return self.unary()
        return self.postfix()

    def arguments(self):
        self.expect("(")
        found = []
        while self.peek() != ")":
            if self.peek() == "|":
                # A closure: only within a call that has a range of its own.
                self.next()
                while self.next().text != "|":
                    pass
            found.append(self.binary(0))
            if self.peek() == ",":
                self.next()
        self.expect(")")
        return found

    def postfix(self):
        start = self.at
        token = self.next()
        if token.kind == "number":
            match = re.fullmatch(r"([\d_]+)((?:[iu]\d+|usize)?)", token.text)
            node = ("number", int(match[1].replace("_", "")), match[2] or None)
        elif token.text == "(":
            node = self.binary(0)
            self.expect(")")
        elif token.text == "if":
            while self.next().text != "{":
                pass
            first = self.binary(0)
            self.expect("}")
            self.expect("else")
            self.expect("{")
            node = ("either", first, self.binary(0))
            self.expect("}")
        elif token.kind == "name":
            while self.peek() == "::":
                self.next()
                self.next()
            if self.peek() == "(":
                name = self.tokens[self.at - 1].text
                arguments = self.arguments()
                node = ("call", name, arguments, self.text(start))
            else:
                node = ("name", self.text(start))
        else:
            raise SyntaxError(f"unexpected {token.text!r}")
        while self.peek() in (".", "["):
            if self.next().text == "[":
                depth = 1
                while depth:
                    depth += {"[": 1, "]": -1}.get(self.next().text, 0)
                node = ("name", self.text(start))
                continue
            name = self.next().text
            if self.peek() == "(":
                node = ("method", name, node, self.arguments(), self.text(start))
            else:
                node = ("name", self.text(start))
        return node
