#!/usr/bin/env python3
"""Proves that no sum, product, shift or cast of the fixed-point code leaves its type.

`prove.py` reads the constants from the Rust sources, finds every quoted expression where it is said to stand, has z3
prove each lemma, and fails when a computing expression of the listed files belongs to no lemma and no exemption.
`prove.py --self-test` spoils assumptions one at a time and must find a counterexample each time.

Needs Python 3.10 and the package z3-solver.
"""

import argparse
import pathlib
import sys
import time

import z3

import exempt
import facts
import lemmas
import rust
from engine import Engine, Lemma, Number, Open

ROOT = pathlib.Path(__file__).resolve().parents[2]


class Sources:
    """The files of the repository, read once."""

    def __init__(self):
        self.read = {}

    def text(self, file):
        if file not in self.read:
            self.read[file] = (ROOT / file).read_text()
        return self.read[file]

    def tokens(self, file):
        return rust.tokens(self.text(file))


def standing(sources, lemma_list):
    """Complaints about quotations that do not stand in their file, or not as often as said."""
    wrong = []
    for file, quote, count in lemma_list:
        found, _ = rust.places(sources.tokens(file), quote)
        if len(found) != count:
            wrong.append(f"{file}: `{quote}` stands {len(found)} times, not {count}")
    return wrong


def uncovered(sources, quotes):
    """Computing expressions that no quotation covers, as file, line and text; and how many there are in all."""
    missing, total = [], 0
    for file in exempt.FILES:
        source = sources.tokens(file)
        covered = set()
        for quoted, quote in quotes:
            if quoted == file:
                found, length = rust.places(source, quote)
                covered |= {at + k for at in found for k in range(length)}
        operators = rust.operators(source)
        total += len(operators)
        lines = sources.text(file).splitlines()
        for at in operators:
            if at not in covered:
                line = source[at].line
                missing.append(f"{file}:{line}: `{source[at].text}` in `{lines[line - 1].strip()}`")
    return missing, total


def run(constants, lemma_list, fact_list, report, until_open=False):
    """Proves everything, or until something is open; returns what stayed open and the number of queries."""
    engine, opened = Engine(constants), []
    for name, _, premises, claim in fact_list:
        answer = engine.holds(premises, claim)
        if answer is not True:
            opened.append(f"fact: {name}: {'z3 gives up' if answer is None else answer}")
        report(f"{'proved' if answer is True else 'OPEN  '}  fact: {name}")
    for lemma in lemma_list:
        if opened and until_open:
            break
        try:
            engine.prove(lemma)
            outcome = "proved"
        except (Open, SyntaxError) as why:
            opened.append(f"{lemma.file}: `{lemma.quote}`: {why}")
            outcome = "OPEN  "
        note = f"  ({lemma.note})" if lemma.note else ""
        report(f"{outcome}  {lemma.file}: {' '.join(lemma.quote.split())}{note}")
    return opened, engine.queries


def needs_ranges(constants, lemma_list):
    """How many lemmas are no longer proved once their variables may take any value of their types."""
    failing = 0
    for lemma in lemma_list:
        try:
            Engine(constants, loosened=True, steps=1_000_000).prove(lemma)
        except Open:
            failing += 1
    return failing


def self_test(constants, lemma_list, fact_list):
    """Each spoiled assumption must leave something open."""
    one = constants["ONE"][1]
    square = constants["ONE_SQUARED"][1]

    def with_constant(name, value):
        return {**constants, name: (constants[name][0], value)}

    def with_range(file, quote, name, number):
        changed = [lemma for lemma in lemma_list if lemma.file.endswith(file) and lemma.quote == quote]
        assert changed, f"no lemma about {quote}"
        return [Lemma(**{**vars(lemma), "where": {**lemma.where, name: number}}) for lemma in changed]

    def again(name, value):
        other = with_constant(name, value)
        return other, lemmas.lemmas(lemmas.ranges(other)), list(facts.facts(other))

    eight = Number("i64", -4 * (one + 1) ** 2, 4 * (one + 1) ** 2)
    spoiled = [
        ("eight products in a sum", constants, with_range("interval.rs", "self.lo + other.lo", "other.lo", eight), []),
        (
            "no margin of the packer",
            constants,
            with_range(
                "link.rs",
                "square.plus(next.square_before).plus(along_next)",
                "square",
                Number("i64", 0, square),
            ),
            [],
        ),
        (
            "axes of any length",
            constants,
            with_range(
                "start.rs", "root_up(square.hi - n * n).min(ONE as i64)", "n", Number("i64", -3 * one, 3 * one)
            ),
            [],
        ),
        (
            "a row twice as long",
            constants,
            with_range(
                "rows.rs",
                "((sum + (1 << (FRACTION_BITS - 1))) >> FRACTION_BITS) as i32",
                "sum",
                Number("i64", -2 * square, 2 * square),
            ),
            [],
        ),
        (
            "a remainder of any size",
            constants,
            with_range("rows.rs", "l - self.hi", "self.hi", Number("i64", *rust.bounds("i64"))),
            [],
        ),
        (
            "a divisor that may be zero",
            constants,
            with_range("direction.rs", "((d.x as i64) << FRACTION_BITS) / length", "length", Number("i64", 0, one)),
            [],
        ),
        ("ONE = 2^31", *again("ONE", 1 << 31)),
        ("FRACTION_BITS = 32", *again("FRACTION_BITS", 32)),
        ("FARTHEST = 16 ONE", *again("FARTHEST", 16 * one)),
        ("ROUNDING = 32", *again("ROUNDING", 32)),
        ("MOST_JOINTS = 32", *again("MOST_JOINTS", 32)),
    ]
    blind = 0
    for name, values, spoiled_lemmas, spoiled_facts in spoiled:
        opened, _ = run(values, spoiled_lemmas, spoiled_facts, lambda line: None, until_open=True)
        blind += not opened
        print(f"{'found  ' if opened else 'MISSED '} {name}: {opened[0] if opened else 'everything was proved'}")
    moved = Sources()
    moved.read = {file: text.replace("a * c", "a * c * 1") for file, text in ((f, moved.text(f)) for f in exempt.FILES)}
    changed = standing(moved, [(l.file, l.quote, l.places) for l in lemma_list])
    missing, _ = uncovered(moved, quotations(lemma_list))
    for name, seen in (("a changed expression", changed or missing),):
        blind += not seen
        print(f"{'found  ' if seen else 'MISSED '} {name}: {seen[0] if seen else 'nothing was said'}")
    failing = needs_ranges(constants, lemma_list)
    print(f"{failing} of {len(lemma_list)} lemmas need the ranges of their variables; the others hold for any values")
    return blind


def quotations(lemma_list):
    return [(lemma.file, lemma.quote) for lemma in lemma_list] + [(file, quote) for file, quote, _, _ in exempt.EXEMPT]


def main():
    options = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    options.add_argument("--self-test", action="store_true", help="spoil assumptions and require counterexamples")
    options.add_argument("--quiet", action="store_true", help="print the totals and what is wrong only")
    options = options.parse_args()
    began = time.monotonic()
    sources = Sources()
    constants = rust.constants([sources.text(file) for file in exempt.CONSTANTS])
    lemma_list = lemmas.lemmas(lemmas.ranges(constants))
    fact_list = list(facts.facts(constants))
    if options.self_test:
        blind = self_test(constants, lemma_list, fact_list)
        print(f"self-test: {time.monotonic() - began:.1f} s")
        return 1 if blind else 0

    wrong = standing(sources, [(lemma.file, lemma.quote, lemma.places) for lemma in lemma_list])
    wrong += standing(sources, [(file, quote, count) for file, quote, count, _ in exempt.EXEMPT])
    for file, quote, _ in lemmas.PREMISES:
        if not rust.places(sources.tokens(file), quote)[0]:
            wrong.append(f"{file}: the premise `{quote}` does not stand")
    missing, total = uncovered(sources, quotations(lemma_list))
    wrong += [f"{place} belongs to no lemma and no exemption" for place in missing]
    opened, queries = run(constants, lemma_list, fact_list, (lambda line: None) if options.quiet else print)
    for complaint in wrong + opened:
        print(f"WRONG   {complaint}", file=sys.stderr)
    exempted = sum(count for _, _, count, _ in exempt.EXEMPT)
    print(
        f"{len(lemma_list)} lemmas and {len(fact_list)} facts, {len(opened)} open; {total} operators in "
        f"{len(exempt.FILES)} files, {len(missing)} uncovered, {exempted} places exempt; {queries} queries to z3 "
        f"{z3.get_version_string()} in {time.monotonic() - began:.1f} s"
    )
    return 1 if wrong or opened else 0


if __name__ == "__main__":
    sys.exit(main())
