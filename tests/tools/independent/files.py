"""Reads limit, station and lot files and every form of sweep file, in the plainest way that works."""

import math
import re
from pathlib import Path

import numpy as np
import yaml

PREFIX = {"": 1.0, "p": 1e-12, "n": 1e-9, "µ": 1e-6, "μ": 1e-6, "u": 1e-6, "m": 1e-3, "k": 1e3, "M": 1e6}
LETTER = {"G": 0.02, "J": 0.05, "K": 0.10, "M": 0.20}  # IEC 60062, capacitance of 10 pF and above
UNITS = r"(Vrms|V|Hz|Ω|[oO]hm|F|H|h|°C|°|%|)"


class Unreadable(Exception):
    """A sweep file that holds no sweep; the text is the kind of fault."""


def quantity(text):
    """A number with prefix and unit to SI; percent to a ratio, degrees of arc to radian."""
    found = re.fullmatch(r"\s*([-+0-9.eE]+?)\s*([pnµμumkM]?)" + UNITS + r"\s*", str(text))
    if not found:
        raise ValueError(f"not a quantity: {text!r}")
    number, prefix, unit = found.groups()
    scale = {"%": 0.01, "°": math.pi / 180, "h": 3600.0}.get(unit, 1.0)
    return float(number) * PREFIX[prefix] * scale


def window(text):
    """`a .. b` or `a ± 20 %` to (low, high)."""
    if ".." in text:
        return tuple(quantity(t) for t in text.split(".."))
    middle, half = text.split("±")
    return quantity(middle) * (1 - quantity(half)), quantity(middle) * (1 + quantity(half))


def load(path):
    """A YAML file as plain values."""
    return yaml.safe_load(Path(path).read_text(encoding="utf-8"))


def bounds_of(limits):
    """List of (characteristic, frequencies in Hz, lower, upper, class)."""
    result = []
    for name, entry in limits["characteristics"].items():
        for bound in entry if isinstance(entry, list) else [entry]:
            if "at" in bound:
                place = (quantity(bound["at"]),)
            else:
                place = tuple(quantity(f) for f in bound.get("between", ()))
            low = quantity(bound["min"]) if "min" in bound else None
            high = quantity(bound["max"]) if "max" in bound else None
            if "nominal" in bound:
                nominal = quantity(bound["nominal"])
                tolerance = bound["tolerance"]
                ratio = LETTER[tolerance] if tolerance in LETTER else quantity(tolerance.replace("±", ""))
                low, high = nominal * (1 - ratio), nominal * (1 + ratio)
            result.append((name, place, low, high, bound.get("class", "A")))
    return result


def text_of(path):
    """The file's text, whatever its encoding."""
    raw = path.read_bytes()
    if not raw:
        raise Unreadable("empty_file")
    if raw[:2] in (b"\xff\xfe", b"\xfe\xff"):
        return raw.decode("utf-16")
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError:
        return raw.decode("cp1252")


def table(path, headings):
    """Rows of texts below the line that holds all the headings, as dictionaries by heading."""
    text = text_of(path)
    lines = text.splitlines()
    for delimiter in (";", "\t", ",", None):
        for start, line in enumerate(lines):
            cells = [c.strip() for c in line.split(delimiter)]
            if all(h in cells for h in headings):
                rows = [[c.strip() for c in row.split(delimiter)] for row in lines[start + 1 :] if row.strip()]
                if rows and (len(rows[-1]) != len(cells) or not text.endswith("\n")):
                    raise Unreadable("truncated_file")
                return [dict(zip(cells, row, strict=True)) for row in rows], delimiter
    raise Unreadable("no_heading")


def number(text, delimiter):
    """A finite number with decimal point, or comma where that is not the delimiter."""
    try:
        value = float(text if delimiter == "," else text.replace(",", "."))
    except ValueError:
        raise Unreadable("text_in_number_column") from None
    if not math.isfinite(value):
        raise Unreadable("text_in_number_column")
    return value


def scale(heading):
    """What the unit in a heading multiplies by."""
    found = re.search(r"[(\[]([pnµμumkM]?)(Hz|[oO]hm|Ω|F|V|dB|deg)[)\]]", heading)
    return PREFIX[found.group(1)] if found else 1.0


def columns(rows, layout, delimiter):
    """Quantity name to array in SI (degrees and decibels as they are)."""
    return {
        name: np.array([number(row[h], delimiter) for row in rows]) * scale(h) for name, h in layout.items()
    }


def sweeps(folder, lot, station):
    """Ordered (part, try, raw columns or Unreadable) of a lot."""
    source = folder / lot["sweeps"]
    if source.is_file():
        layout = station["layout"]["columns"]
        rows, delimiter = table(source, ["part", *layout.values()])
        parts = {}
        for row in rows:
            parts.setdefault(row["part"], []).append(row)
        return [(part, 1, columns(rows, layout, delimiter)) for part, rows in sorted(parts.items())]
    result = []
    for path in sorted(source.iterdir()):
        part, _, attempt = path.stem.partition("~")
        try:
            raw = touchstone(path) if path.suffix in (".s1p", ".s2p") else from_csv(path, station)
        except Unreadable as fault:
            raw = fault
        result.append((part, int(attempt or 1), raw))
    return sorted(result, key=lambda r: (r[0], r[1]))


def duplicates(source):
    """Part to the earlier part whose file has the same bytes."""
    result, seen = {}, {}
    for path in sorted(source.iterdir()) if source.is_dir() else []:
        content = path.read_bytes()
        if content in seen:
            result[path.stem] = seen[content]
        seen.setdefault(content, path.stem)
    return result


def from_csv(path, station):
    layout = station["layout"]["columns"]
    rows, delimiter = table(path, list(layout.values()))
    return columns(rows, layout, delimiter)


def touchstone(path):
    """Frequency, S-matrix and reference resistance of a one- or two-port file, version 1 or 2."""
    unit, form, z0, values = 1e9, "MA", 50.0, []
    for line in path.read_text(encoding="ascii").splitlines():
        line = line.split("!")[0].strip()
        if line.startswith("#"):
            words = line[1:].upper().split()
            unit = {"HZ": 1.0, "KHZ": 1e3, "MHZ": 1e6, "GHZ": 1e9}[words[0]]
            form, z0 = words[2], float(words[4])
        elif line and not line.startswith("["):
            values.append([float(v) for v in line.split()])
    data = np.array(values)
    first, second = data[:, 1::2], data[:, 2::2]
    if form == "RI":
        s = first + 1j * second
    else:
        magnitude = first if form == "MA" else 10 ** (first / 20)
        s = magnitude * np.exp(1j * np.radians(second))
    return {"frequency": data[:, 0] * unit, "s": s, "z0": z0}
