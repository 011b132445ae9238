"""Flash, memory, stack bound and panic symbols of programs: sizes.py WHOLE PROPAGATION PLANTED.

The stack bound of `screen_entry` is the deepest path through its calls, each function counted with
the stack size the compiler states (`-Z emit-stack-sizes`) or, for assembly routines, with what its
instructions push. It is a bound only because there is no indirect call and no recursion, which is
checked.
"""

import re
import subprocess
import sys
from dataclasses import dataclass, field

ENTRY = "screen_entry"
PANIC = re.compile(r"panic|_fail\b|unwind", re.IGNORECASE)
KIB = 1024
FLASH_LIMITS = {"whole": 64 * KIB, "propagation only": 40 * KIB}
MEMORY_LIMIT = 16 * KIB
STACK_LIMIT = 8 * KIB

HEAD = re.compile(r"^[0-9a-f]+ <(.+)>:$")
INSTRUCTION = re.compile(r"^\s*[0-9a-f]+:\s+(?:[0-9a-f]{2,8} )+\s*(\S+)\s*(.*)$")
GOAL = re.compile(r"<([^+>]+)(\+0x[0-9a-f]+)?>")
# Jumps whose goal is in a register: calls, and jumps other than returns.
INDIRECT = re.compile(r"^(blx\s+r\d+|bx\s+r\d+|mov\s+pc|jalr\s|c\.jalr|jr\s+(?!ra)|c\.jr\s+(?!ra))")
JUMP = re.compile(r"^(b|bl|b[a-z]{2}|cbn?z|j|jal|call|tail|b[a-z]+z?)(\.[nw])?$")


def run(*command: str) -> str:
    return subprocess.run(command, check=True, capture_output=True, text=True).stdout


@dataclass
class Function:
    calls: set[str] = field(default_factory=set)
    indirect: list[str] = field(default_factory=list)
    pushed: int = 0


def functions(elf: str) -> dict[str, Function]:
    """Every function with its calls, from the disassembly."""
    found: dict[str, Function] = {}
    own, name = Function(), ""
    for line in run("llvm-objdump", "-d", elf).splitlines():
        if head := HEAD.match(line):
            name = head[1]
            if not name.startswith("$"):
                own = found.setdefault(name, Function())
            continue
        parts = INSTRUCTION.match(line)
        if not parts:
            continue
        operation, operands = parts[1], parts[2]
        text = f"{operation} {operands}"
        if INDIRECT.match(text):
            own.indirect.append(text)
        goal = GOAL.search(operands)
        if goal and JUMP.match(operation) and not goal[2] and (operation.startswith("bl") or goal[1] != name):
            own.calls.add(goal[1])
        if operation.startswith("push"):
            own.pushed += 4 * len(operands.split(","))
        if size := re.match(r"sub(?:\.w)?\s+sp,(?: sp,)? #(\d+|0x[0-9a-f]+)$", text):
            own.pushed += int(size[1], 0)
    return found


def stack_sizes(elf: str) -> dict[str, int]:
    """Stack of every function as the compiler states it."""
    sizes = {}
    for line in run("llvm-readelf", "--stack-sizes", elf).splitlines():
        parts = line.split(maxsplit=1)
        if len(parts) == 2 and parts[0].isdigit():
            for name in parts[1].split(", "):
                sizes[name] = int(parts[0])
    return sizes


def stack_bound(elf: str) -> tuple[int, list[tuple[str, int]], list[str]]:
    """The deepest path from the entry, and what makes it no bound."""
    calls, sizes = functions(elf), stack_sizes(elf)
    entry = next((name for name in calls if ENTRY in name), None)
    if entry is None:
        return 0, [], [f"no {ENTRY}"]
    trouble: list[str] = []
    best: dict[str, tuple[int, list[tuple[str, int]]]] = {}

    def deepest(name: str, above: tuple[str, ...]) -> tuple[int, list[tuple[str, int]]]:
        if name in above:
            trouble.append(f"recursion: {name}")
            return 0, []
        if name not in best:
            own = calls[name]
            trouble.extend(f"indirect call in {name}: {text}" for text in own.indirect)
            below = [deepest(call, above + (name,)) for call in sorted(own.calls) if call in calls]
            size = sizes.get(name, own.pushed)
            depth, path = max(below, default=(0, []), key=lambda found: found[0])
            best[name] = (size + depth, [(name, size), *path])
        return best[name]

    depth, path = deepest(entry, ())
    return depth, path, trouble


def sections(elf: str) -> tuple[int, int]:
    """Bytes in flash (code and constants) and in memory (data, zeroed data)."""
    flash = memory = 0
    for line in run("llvm-readelf", "-S", "-W", elf).splitlines():
        parts = re.match(r"^\s*\[\s*\d+\]\s+(\S+)\s+(\S+)\s+\S+\s+\S+\s+([0-9a-f]+)\s+\S+\s+(\S*)", line)
        if not parts or "A" not in parts[4]:
            continue
        size = int(parts[3], 16)
        if parts[1] in (".text", ".rodata"):
            flash += size
        elif parts[1] in (".data", ".bss"):
            memory += size
    return flash, memory


def panics(elf: str) -> list[str]:
    return [line for line in run("llvm-nm", "-C", elf).splitlines() if PANIC.search(line)]


def main() -> int:
    whole, propagation, planted = sys.argv[1:4]
    failures = []
    for name, elf in (("whole", whole), ("propagation only", propagation)):
        flash, memory = sections(elf)
        depth, path, trouble = stack_bound(elf)
        found = panics(elf)
        print(f"{name}: flash {flash} bytes, memory beside the stack {memory} bytes, "
              f"stack at most {depth} bytes, {len(found)} panic symbols")
        for function, size in path:
            print(f"    {size:6} {run('llvm-cxxfilt', function).strip()}")
        if flash > FLASH_LIMITS[name]:
            failures.append(f"{name}: flash above {FLASH_LIMITS[name]} bytes")
        if memory > MEMORY_LIMIT:
            failures.append(f"{name}: memory above {MEMORY_LIMIT} bytes")
        if depth > STACK_LIMIT:
            failures.append(f"{name}: stack above {STACK_LIMIT} bytes")
        failures += [f"{name}: {text}" for text in trouble]
        failures += [f"{name}: {symbol}" for symbol in found]
    if not panics(planted):
        failures.append("the planted panic is not found: the look at symbols is worth nothing")
    for failure in failures:
        print(failure, file=sys.stderr)
    return 1 if failures else 0


if __name__ == "__main__":
    sys.exit(main())
