#!/usr/bin/env python3
"""Makes sample-lots/ and limits/stations/compensation/ anew, the same bytes every time.

Needs the packages of tests/requirements.txt and ngspice. Run it with
`.venv/bin/python tests/tools/make_sample_lots.py`; with `--check` it changes nothing and says, with
status 1, which files are not what it would make.
"""

import json
import math
import shutil
import sys
import tempfile
from datetime import datetime
from pathlib import Path

import numpy as np

from sample_lots import analyser, circuits, compare, forms, simulator, truth
from sample_lots.families import FAMILIES
from sample_lots.scenario import LOTS

ROOT = Path(__file__).resolve().parents[2]
SEED = 20261005

# Low and high end in Hz and points a decade of each bench's sweep.
GRIDS = {
    "BENCH-1": (1e3, 40e6, 40), "BENCH-3": (1e3, 100e6, 40), "LCR-1": (20.0, 2e6, 30), "LCR-2": (20.0, 200e3, 30),
    "LCR-3": (100.0, 1e6, 30), "LCR-4": (0.1e6, 100e6, 40), "VNA-1": (1e3, 30e6, 30), "VNA-2": (100e3, 500e6, 30), "VNA-3": (100e3, 100e6, 30),
}
# Standard deviations of a single point: of ln|Z|, of the phase in degrees.
NOISE = {
    "BENCH-1": (1.0e-3, 0.03), "LCR-1": (1.0e-3, 0.03), "LCR-2": (2.0e-3, 0.05), "LCR-3": (4e-4, 0.015), "LCR-4": (3e-4, 0.01),
}


def grid(station, part):
    low, high, per_decade = GRIDS[station]
    if part == "RG-0476-POL" and station == "BENCH-1":
        low, high = 20.0, 2e6  # the analyser's low-frequency range
    points = round(per_decade * math.log10(high / low)) + 1
    return np.geomspace(low, high, points)


def noisy(rng, z, station):
    """Multiplies by a random gain and phase, independent at each point."""
    gain, degrees = NOISE[station]
    return z * np.exp(gain * rng.standard_normal(z.size) + 1j * np.radians(degrees) * rng.standard_normal(z.size))


def texts(*columns):
    """Columns of numbers to rows of texts."""
    return [[forms.number(v) for v in row] for row in zip(*columns, strict=True)]


def two_channel(network, emf):
    f, a, b = simulator.sweep(network, emf)
    return (f, a.real, a.imag, b.real, b.imag), (f[0], f[-1])


TWO_CHANNEL = ["Frequency (Hz)", "ChA Re (V)", "ChA Im (V)", "ChB Re (V)", "ChB Im (V)"]
HEADINGS = {
    "BENCH-1": ["Frequency (Hz)", "|Z| (mOhm)", "Phase (deg)"],
    "BENCH-2": TWO_CHANNEL,
    "BENCH-3": ["Frequency (kHz)", "Gain (dB)", "Phase (deg)"],
    "LCR-1": ["f[Hz]", "R[ohm]", "X[ohm]"],
    "LCR-2": ["Frequenz (Hz)", "Cs (µF)", "Rs (Ohm)"],
    "LCR-3": ["Freq (Hz)", "C (nF)", "tan δ"],
    "LCR-4": ["Frequency (MHz)", "Impedance (Ohm)", "Theta (deg)"],
}


def faulty_impedance(rng, f, z, kind):
    """What the jig shows instead of the part."""
    if kind == "open":
        return np.full(f.size, np.inf + 0j)
    if kind == "short":
        return 0.4e-3 + 2j * math.pi * f * 0.1e-9
    if kind == "intermittent_contact":
        bad = rng.choice(f.size, 14, replace=False)
        z = z.copy()
        z[bad] += rng.uniform(0.5, 40.0, bad.size) * np.maximum(1.0, np.abs(z[bad]) / 20)
    return z


def bench_3_ratio(f, z):
    """B over A: the part and the stray of the jig beside it (12 pF, 1 GΩ) below 100 Ω and 0.8 nH."""
    w = 2 * math.pi * f
    stray = 1j * w * 12e-12 + 1e-9
    seen = 1 / (np.where(np.isinf(z), 0, 1 / z) + stray)
    return seen / (seen + 100.0 + 1j * w * 0.8e-9)


def bench_3_rows(f, ratio, decimals):
    return [
        [forms.number(hz / 1e3), f"{20 * math.log10(abs(r)):.{decimals}f}", f"{math.degrees(np.angle(r)):.{decimals}f}"]
        for hz, r in zip(f, ratio, strict=True)
    ]


def measured_rows(rng, lot, network, kind):
    """Rows of texts as the station exports them, and the sweep's ends in Hz."""
    if lot.station == "BENCH-2":
        columns, ends = two_channel(network, lot.emf)
        return texts(*columns), ends
    f = grid(lot.station, lot.part)
    z = faulty_impedance(rng, f, circuits.impedance(network, f), kind)
    ends = (f[0], f[-1])
    if lot.station == "BENCH-3":
        ratio = bench_3_ratio(f, z)
        ratio = ratio * np.exp(2e-5 * (rng.standard_normal(f.size) + 1j * rng.standard_normal(f.size)))
        ratio = ratio + 2e-7 * (rng.standard_normal(f.size) + 1j * rng.standard_normal(f.size))
        rows = bench_3_rows(f, ratio, 6)
        return rows, ends
    z = noisy(rng, z, lot.station)
    x = 2 * math.pi * f * z.imag
    if lot.station == "BENCH-1":
        return texts(f, abs(z) * 1e3, np.degrees(np.angle(z))), ends
    if lot.station == "LCR-4":
        return texts(f / 1e6, abs(z), np.degrees(np.angle(z))), ends
    if lot.station == "LCR-1":
        return texts(f, z.real, z.imag), ends
    if lot.station == "LCR-2":
        return texts(f, -1e6 / x, z.real), ends
    return texts(f, -1e9 / x, -z.real / z.imag), ends


def spoil_file(path, kind):
    """Faults of the file, not of the contact."""
    if kind == "truncated_file":
        forms.cut_short(path, 90, 17)


def spoil_rows(rows, kind):
    if kind == "text_in_number_column":
        for row in rows[60:68]:
            row[1] = "----"


def write_touchstone(lot, network, stem, folder):
    f = grid(lot.station, lot.part)
    comment = f"lot {lot.lot}, part {stem}; invented"
    form, version = lot.touchstone
    if lot.station == "VNA-1":
        ports = analyser.shunt_through(network, f, arm=(15e-3, 0.3e-9))
    elif lot.station == "VNA-2":
        ports = analyser.series_through(network, f)
    else:
        ports = analyser.reflection(network, f, 75.0)
    suffix = "s1p" if ports.nports == 1 else "s2p"
    analyser.write(ports, folder / f"{stem}.{suffix}", comment, form, version)
    return f[0], f[-1]


def age_factor(lot, family):
    """C at the referee time over C as measured; 1 where nothing is referred."""
    if family.ageing is None or lot.last_heat is None:
        return 1.0
    since = datetime.fromisoformat(lot.measured).replace(tzinfo=None) - datetime.fromisoformat(lot.last_heat)
    return truth.ageing_factor(family.ageing[0], since.total_seconds() / 3600, family.ageing[1])


def lot_yaml(lot):
    label = lot.label
    if label is None:
        label = (
            f"[)>\x1e06\x1dP{lot.part}\x1dQ{lot.quantity}\x1d1T{lot.lot}\x1d10D{lot.date_code}"
            f"\x1dK{lot.order}\x1dV{lot.supplier}\x1e\x04"
        )
    for code in (0x1D, 0x1E, 0x04):
        label = label.replace(chr(code), f"\\x{code:02x}")
    lines = [
        "# Invented; see sample-lots/README.md.",
        f"lot: {lot.lot}", f"part: {lot.part}", f"supplier: {lot.supplier}", f"quantity: {lot.quantity}",
        f'date_code: "{lot.date_code}"', f"order: {lot.order}", f'label: "{label}"', f"operator: {lot.operator}",
        f"station: {lot.station}", f"measured: {lot.measured}",
        f"ambient: {{temperature: {lot.temperature} °C, humidity: {lot.humidity} %}}",
    ]
    if lot.drive:
        lines.append(f"drive: {lot.drive}")
    if lot.last_heat:
        lines.append(f"last_heat: {lot.last_heat}")
    lines.append(f"sweeps: {lot.sweeps}")
    return "\n".join(lines) + "\n"


def expected(lot, presented):
    unmeasured = {k: v for k, v in lot.faults.items() if f"{k}~2" not in lot.retests}
    return {
        "shows": lot.shows,
        "verdict": lot.verdict,
        "reasons": lot.reasons,
        "also_possible": lot.also_possible,
        "sampling": {
            "required": lot.required,
            "presented": presented,
            "classes": {
                name: dict(zip(("n", "ac", "re", "nonconforming", "undecided"), counts, strict=True))
                for name, counts in lot.classes.items()
            },
        },
        "nonconforming": lot.nonconforming,
        "undecided": lot.undecided,
        "unmeasured": unmeasured,
        "outliers": lot.outliers,
        "duplicates": lot.duplicates,
        "retested": sorted(k.split("~")[0] for k in lot.retests),
        "tolerance": TOLERANCE[lot.station],
    }


# Largest relative deviation of a reading from its true value: a few times what noise, rounding and
# the definition of the reading leave on that bench.
TOLERANCE = {
    "BENCH-1": {"capacitance": 4e-3, "esr_minimum": 0.02, "srf": 2e-3, "dissipation_factor": 0.08, "impedance": 4e-3, "esr": 5e-3},
    "BENCH-2": {"capacitance": 2e-4, "esr_minimum": 0.01, "srf": 1e-3, "dissipation_factor": 5e-3, "impedance": 1e-3, "esr": 5e-3},
    "BENCH-3": {"capacitance": 1e-3, "esr_minimum": 0.02, "srf": 2e-3, "dissipation_factor": 0.08},
    "LCR-1": {"capacitance": 3e-3, "esr": 5e-3, "dissipation_factor": 0.08},
    "LCR-2": {"capacitance": 6e-3, "esr": 8e-3, "dissipation_factor": 0.04},
    "LCR-3": {"capacitance": 1.5e-3, "dissipation_factor": 0.12},
    "LCR-4": {"capacitance": 1e-3, "impedance": 3e-3},
    "VNA-1": {"capacitance": 2e-4, "esr_minimum": 0.01, "srf": 1e-3, "impedance": 2e-3},
    "VNA-2": {"capacitance": 2e-4, "esr": 0.01, "srf": 1e-3, "dissipation_factor": 0.01},
    "VNA-3": {"capacitance": 2e-4, "impedance": 2e-3},
}


def sweep_of(rng, lot, network, stem, folder, kind):
    """Writes one sweep file; answers the sweep's ends in Hz."""
    if lot.touchstone:
        return write_touchstone(lot, network, stem, folder)
    rows, ends = measured_rows(rng, lot, network, kind)
    spoil_rows(rows, kind)
    path = folder / f"{stem}.csv"
    forms.table(path, HEADINGS[lot.station], rows, lot.form)
    spoil_file(path, kind)
    return ends


def make(lot, index, root):
    rng = np.random.default_rng([SEED, index])
    family = FAMILIES[lot.part]
    factor = age_factor(lot, family)
    folder = root / lot.lot
    (folder / lot.sweeps if not lot.long_table else folder).mkdir(parents=True)
    parts, measured, table = {}, {}, []
    spreads = lot.parts(rng)
    for number, values in enumerate(spreads, 1):
        stem = f"{number:03}"
        network = family.part(values, factor)
        if lot.long_table:
            rows, ends = measured_rows(rng, lot, network, None)
            table += [[stem, *row] for row in rows]
        else:
            ends = sweep_of(rng, lot, network, stem, folder / lot.sweeps, lot.faults.get(stem))
            again = f"{stem}~2"
            if again in lot.retests:
                other = lot.retests[again]
                second = network if other is None else family.part(other, factor)
                sweep_of(rng, lot, second, again, folder / lot.sweeps, None)
        values = family.true_values(network, ends)
        if factor != 1.0:
            key = truth.key("capacitance", family.test_frequency())
            measured[stem] = {key: values[key]}
            values[key] *= factor
        parts[stem] = values
    for copy, original in lot.duplicates.items():
        shutil.copyfile(folder / lot.sweeps / f"{original}.csv", folder / lot.sweeps / f"{copy}.csv")
        parts[copy], measured[copy] = parts[original], measured[original]
    if lot.long_table:
        forms.table(folder / lot.sweeps, ["part", *HEADINGS[lot.station]], table, lot.form)
    (folder / "lot.yaml").write_text(lot_yaml(lot), encoding="utf-8")
    write_json(folder / "truth.json", {
        "about": "true values of the part models, SI; capacitance referred to the referee time where the limit file refers it",
        "parts": parts, "as_measured": measured,
    })
    write_json(folder / "expected.json", expected(lot, len(spreads)))


def write_json(path, content):
    """One part a line where there are many."""
    text = json.dumps(content, ensure_ascii=False, indent=1)
    if "parts" in content:
        head = {k: v for k, v in content.items() if k not in ("parts", "as_measured")}
        blocks = []
        for name in ("parts", "as_measured"):
            lines = ",\n".join(f"  {json.dumps(k)}: {json.dumps(v)}" for k, v in content[name].items())
            blocks.append(f' "{name}": {{\n{lines}\n }}' if lines else f' "{name}": {{}}')
        text = json.dumps(head, ensure_ascii=False, indent=1)[:-2] + ",\n" + ",\n".join(blocks) + "\n}"
    path.write_text(text + "\n", encoding="utf-8")


def make_standards(folder):
    """Open, short and load of the two-channel bench in the same simulated jig; the open of BENCH-3."""
    folder.mkdir(parents=True, exist_ok=True)
    standards = {
        "open": None,
        "short": circuits.series(circuits.resistor(0.12e-3), circuits.inductor(0.15e-9)),
        "load": circuits.resistor(1.0),
    }
    for name, network in standards.items():
        columns, _ = two_channel(network, 2.0)
        rows = [[forms.number(v, 13) for v in row] for row in zip(*columns, strict=True)]
        forms.table(folder / f"bench-2-{name}.csv", TWO_CHANNEL, rows, forms.Form())
    f = grid("BENCH-3", "")
    rows = bench_3_rows(f, bench_3_ratio(f, np.full(f.size, np.inf + 0j)), 12)
    forms.table(folder / "bench-3-open.csv", HEADINGS["BENCH-3"], rows, forms.Form())


def make_all(lots, standards):
    """All lots and the standards' sweeps, into two folders."""
    make_standards(standards)
    for index, lot in enumerate(LOTS):
        make(lot, index, lots)


def check(lots, standards):
    """Makes everything in a temporary folder and compares; the names of files that differ."""
    with tempfile.TemporaryDirectory() as folder:
        made = Path(folder)
        make_all(made / "lots", made / "standards")
        shutil.copy(lots / "README.md", made / "lots")
        return compare.differing(made / "lots", lots) + compare.differing(made / "standards", standards)


def main():
    lots, standards = ROOT / "sample-lots", ROOT / "limits" / "stations" / "compensation"
    if sys.argv[1:] == ["--check"]:
        wrong = check(lots, standards)
        for name in wrong:
            print(f"not what the generator makes: {name}")
        print(f"{len(LOTS)} lots made anew, {len(wrong)} files differ")
        sys.exit(1 if wrong else 0)
    for old in lots.iterdir():
        if old.is_dir():
            shutil.rmtree(old)
    make_all(lots, standards)
    print(f"{len(LOTS)} lots made")


if __name__ == "__main__":
    main()
