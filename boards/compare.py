"""Compares a program's output with its golden file: compare.py GOLDEN OUTPUT.

Lines that begin with `#` hold measured figures: their words must be the same, and no figure may be
more than a tenth above the golden one. All other lines must be the same.
"""

import re
import sys

NUMBER = re.compile(r"\d+")
ALLOWED = 1.1


def differences(golden: list[str], output: list[str]):
    for number in range(max(len(golden), len(output))):
        wanted = golden[number] if number < len(golden) else None
        have = output[number] if number < len(output) else None
        if wanted == have:
            continue
        if wanted is None or have is None or not (wanted.startswith("#") and have.startswith("#")):
            yield f"line {number + 1}: {have!r} instead of {wanted!r}"
        elif NUMBER.sub("", wanted) != NUMBER.sub("", have):
            yield f"line {number + 1}: {have!r} instead of {wanted!r}"
        else:
            for limit, figure in zip(NUMBER.findall(wanted), NUMBER.findall(have)):
                if int(figure) > int(limit) * ALLOWED:
                    yield f"line {number + 1}: {figure} is more than a tenth above {limit}"


def main() -> int:
    golden, output = (open(name, encoding="utf-8").read().splitlines() for name in sys.argv[1:3])
    found = list(differences(golden, output))
    for difference in found:
        print(difference, file=sys.stderr)
    return 1 if found else 0


if __name__ == "__main__":
    sys.exit(main())
