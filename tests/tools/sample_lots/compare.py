"""Two folders with the same files: texts equal, numbers equal but for the last digits that a tool may change."""

import re
from pathlib import Path

# A comma always parts two numbers, though some files have it as the decimal sign: the digits behind it
# are then compared as a number of their own.
NUMBER = re.compile(r"[-+]?[0-9]+(?:\.[0-9]+)?(?:[eE][-+]?[0-9]+)?")
RELATIVE = 1e-5
ABSOLUTE = 1e-12


def _text(path):
    raw = path.read_bytes()
    for encoding in ("utf-16" if raw[:2] == b"\xff\xfe" else "utf-8", "cp1252"):
        try:
            return raw.decode(encoding)
        except UnicodeDecodeError:
            continue
    raise ValueError(f"{path}: neither UTF-8, UTF-16 nor Windows-1252")


def _close(a, b):
    x, y = float(a), float(b)
    return abs(x - y) <= RELATIVE * max(abs(x), abs(y)) + ABSOLUTE


def same_content(first, second):
    """Whether two files differ in nothing but last digits."""
    if first.read_bytes() == second.read_bytes():
        return True
    a, b = _text(first), _text(second)
    if NUMBER.split(a) != NUMBER.split(b):
        return False
    return all(map(_close, NUMBER.findall(a), NUMBER.findall(b)))


def differing(made: Path, kept: Path):
    """Names of files that are in one folder only, or differ."""
    names = [{str(p.relative_to(root)) for p in root.rglob("*") if p.is_file()} for root in (made, kept)]
    alone = names[0] ^ names[1]
    return sorted(alone) + sorted(n for n in names[0] & names[1] if not same_content(made / n, kept / n))
