"""The lots: what arrived, how it was measured, what must come out.

Everything here is invented: a contract manufacturer of pump drives, its part numbers RG-…, its
suppliers SUP-…, operators OP-… and assets. Expected outcomes are written down by hand, not computed.
"""

from dataclasses import dataclass, field

from . import spread
from .forms import Form


@dataclass
class Lot:
    """One lot folder."""

    lot: str
    part: str
    supplier: str
    quantity: int
    station: str
    measured: str
    parts: object  # rng -> list of Spread
    shows: str
    verdict: str
    reasons: list
    classes: dict  # class -> (n, Ac, Re, nonconforming, undecided)
    required: int
    date_code: str = "2638"
    order: str = "PO-88120"
    operator: str = "OP-17"
    temperature: float = 22.8
    humidity: int = 41
    drive: str | None = None
    last_heat: str | None = None
    label: str | None = None  # None: the label that the lot should have
    sweeps: str = "sweeps"
    form: Form = field(default_factory=Form)
    long_table: bool = False
    touchstone: tuple = ()  # (format, version)
    emf: float = 2.0  # V rms behind 50 ohm, simulated bench
    faults: dict = field(default_factory=dict)  # file stem -> kind
    retests: dict = field(default_factory=dict)  # stem of the second try -> Spread of it, None: the same part
    nonconforming: dict = field(default_factory=dict)
    undecided: dict = field(default_factory=dict)
    outliers: dict = field(default_factory=dict)
    duplicates: dict = field(default_factory=dict)  # part -> the part whose file it repeats
    also_possible: list = field(default_factory=list)


def _changed(parts, changes):
    """Gives single parts (number from 1) other values."""
    for number, values in changes.items():
        for name, value in values.items():
            setattr(parts[number - 1], name, value)
    return parts


def _x7r(n, c):
    return lambda rng: spread.lot(rng, n, c)


_LOW_C = (
    -0.081, -0.112, -0.075, -0.086, -0.069, -0.079, -0.118, -0.083, -0.062, -0.087, -0.073, -0.107, -0.080,
    -0.066, -0.085, -0.077, -0.071, -0.123, -0.084, -0.078, -0.064, -0.082, -0.109, -0.074, -0.088, -0.070,
    -0.076, -0.115, -0.067, -0.072, -0.081, -0.068,
)


def _low_capacitance(rng):
    parts = spread.lot(rng, len(_LOW_C), (0.0, 0.01))
    return _changed(parts, {i + 1: {"c": c} for i, c in enumerate(_LOW_C)})


_DRY = (2, 5, 9, 10, 14, 17, 21, 26, 30, 31, 38, 42, 47)


def _dried_out(rng):
    parts = spread.lot(rng, 50, (-0.04, 0.02), (0.074, 0.004))
    return _changed(parts, {k: {"esr": 0.1045 + 0.0012 * i, "c": -0.06 - 0.002 * i} for i, k in enumerate(_DRY)})


# In mΩ: the limit is 14, and the guard band begins at about 13.67.
_ESR = (
    12.35, 12.55, 13.82, 12.90, 13.10, 13.88, 12.70, 13.30, 13.79, 13.00,
    12.80, 13.85, 13.20, 12.60, 13.40, 12.95, 13.45, 12.85, 13.15, 13.35,
)


def _near_the_limit(rng):
    parts = spread.lot(rng, len(_ESR), (-0.01, 0.02))
    return _changed(parts, {i + 1: {"esr": ohm * 1e-3} for i, ohm in enumerate(_ESR)})


LOTS = [
    Lot(
        "26K-0457", "RG-0475-X7R", "SUP-041", 3000, "BENCH-1", "2026-10-05T09:12:00+02:00",
        lambda rng: _changed(spread.lot(rng, 125, (-0.015, 0.012)), {88: {"leak": 1100.0}}),
        "A good reel: 125 parts, one of them cracked and leaking (its dissipation factor is too high), which the plan allows.",
        "accept", ["accepted_by_plan"], {"A": (125, 2, 3, 0, 0), "B": (125, 5, 6, 1, 0)}, 125,
        drive="0.98 Vrms", last_heat="2026-07-01",
        form=Form(preamble=("Sweep export;BENCH-1;FA-0101", "Lot;26K-0457", "Level;0.98 Vrms", "")),
        nonconforming={"088": ["dissipation_factor@1kHz"]}, outliers={"dissipation_factor@1kHz": ["088"]},
    ),
    Lot(
        "26K-0458", "RG-0475-X7R", "SUP-052", 240, "BENCH-2", "2026-10-06T09:05:00+02:00", _low_capacitance,
        "Low capacitance: four of the first 20 parts and six of 32 lie below the limit. Sweeps by a circuit simulator.",
        "reject", ["nonconforming_over_ac"], {"A": (20, 0, 1, 4, 0), "B": (32, 1, 2, 0, 0)}, 32,
        drive="1.1 Vrms", last_heat="2026-08-20", order="PO-88131",
        nonconforming={k: ["capacitance@1kHz"] for k in ("002", "007", "012", "018", "023", "028")},
        also_possible=["capability_below_min", "nonconforming_beyond_sample"],
    ),
    Lot(
        "26K-0461", "RG-0476-POL", "SUP-033", 500, "LCR-1", "2026-10-06T10:20:00+02:00",
        lambda rng: spread.lot(rng, 50, (-0.09, 0.034), (0.0118, 0.0004)),
        "Every part is inside its limits, but the lot sits low and wide: Cpk about 1.1 where 1.33 is demanded.",
        "hold", ["capability_below_min"], {"A": (50, 1, 2, 0, 0), "B": (50, 3, 4, 0, 0)}, 50,
        drive="0.5 Vrms", order="PO-88107",
        form=Form(align=True, newline="\r\n", preamble=("# list sweep, LCR-1", "# bias 0 V")),
    ),
    Lot(
        "26K-0466", "RG-0337-ALU", "SUP-019", 450, "LCR-2", "2026-10-07T08:15:00+02:00", _dried_out,
        "Dried-out electrolytics: ESR above the limit in 13 of 50.",
        "reject", ["nonconforming_over_ac"], {"A": (50, 1, 2, 13, 0), "B": (50, 3, 4, 0, 0)}, 50,
        drive="0.5 Vrms", order="PO-88064", date_code="2409",
        form=Form(";", ",", "\r\n", "cp1252", ("Prüfling: Elko 330 µF", "Messgerät;FA-0132", "")),
        nonconforming={f"{k:03}": ["esr@100kHz"] for k in _DRY},
    ),
    Lot(
        "26K-0470", "RG-0105-PET", "SUP-027", 1000, "LCR-3", "2026-10-07T09:40:00+02:00",
        lambda rng: _changed(spread.lot(rng, 32, (0.004, 0.005)), {19: {"c": 0.045}}),
        "All inside the limits, but part 019 does not belong to the others.",
        "hold", ["outliers_found"], {"A": (32, 0, 1, 0, 0), "B": (32, 1, 2, 0, 0)}, 32,
        drive="1.0 Vrms", order="PO-88112", sweeps="sweeps.txt", long_table=True,
        form=Form("\t", ".", "\r\n", "utf-16", ("LCR-3 log", "")),
        outliers={"capacitance@1kHz": ["019"]},
        label="[)><RS>06<GS>PRG-0105-PET<GS>Q1000<GS>1T26K-0470<GS>10D2638<RS><EOT>",
    ),
    Lot(
        "26K-0474", "RG-0104-X7R", "SUP-041", 250, "BENCH-3", "2026-10-06T11:30:00+02:00",
        _x7r(30, (-0.01, 0.015)),
        "Contact faults and broken files in five of 30 sweeps, where the plan demands 32.",
        "hold", ["unmeasured_parts", "sample_too_small"], {"A": (20, 0, 1, 0, 0), "B": (32, 1, 2, 0, 0)}, 32,
        drive="1.0 Vrms", last_heat="2026-08-01", order="PO-88118", operator="OP-08",
        faults={"007": "open", "013": "intermittent_contact", "021": "short", "026": "truncated_file", "029": "text_in_number_column"},
    ),
    Lot(
        "26K-0479", "RG-0102-C0G", "SUP-046", 90, "VNA-2", "2026-10-08T19:40:00+02:00",
        lambda rng: spread.lot(rng, 20, (0.004, 0.008)),
        "Good parts, measured 45 minutes after the jig check had run out. Sweeps by a network library, Touchstone 2.0.",
        "hold", ["jig_check_expired"], {"A": (20, 0, 1, 0, 0), "B": (8, 0, 1, 0, 0)}, 20,
        order="PO-88140", operator="OP-08", touchstone=("ma", "2.0"),
    ),
    Lot(
        "26K-0483", "RG-0103-C0G", "SUP-046", 800, "VNA-3", "2026-10-08T08:05:00+02:00",
        lambda rng: spread.lot(rng, 13, (0.001, 0.004)),
        "The room was at 16.4 °C where at least 18 °C is demanded. One-port sweeps in a 75 Ω system, in decibels.",
        "hold", ["temperature_out_of_range"], {"all": (13, 0, 1, 0, 0)}, 13,
        temperature=16.4, order="PO-88141", touchstone=("db", "1.0"),
    ),
    Lot(
        "26K-0488", "RG-0476-POL", "SUP-033", 140, "BENCH-1", "2026-10-05T11:05:00+02:00",
        _near_the_limit,
        "Marginal: four ESR readings lie inside the limit by less than the measurement can tell.",
        "hold", ["undecided_parts"], {"A": (13, 0, 1, 0, 4), "B": (20, 1, 2, 0, 0)}, 20,
        drive="0.45 Vrms", order="PO-88122",
        undecided={k: ["esr@100kHz"] for k in ("003", "006", "009", "012")},
    ),
    Lot(
        "26K-0492", "RG-0226-X5R", "SUP-052", 2000, "VNA-1", "2026-10-08T09:30:00+02:00",
        lambda rng: spread.lot(rng, 13, (-0.03, 0.03)),
        "A good reel through a network analyser; port arms of 15 mΩ and 0.3 nH. Sweeps by a network library, Touchstone 1.",
        "accept", ["accepted_by_plan"], {"A": (13, 0, 1, 0, 0), "B": (13, 1, 2, 0, 0)}, 13,
        drive="0.45 Vrms", order="PO-88136", touchstone=("ri", "1.0"),
    ),
    Lot(
        "26K-0495", "RG-0105-PET", "SUP-027", 260, "LCR-3", "2026-10-07T13:25:00+02:00",
        lambda rng: spread.lot(rng, 32, (-0.003, 0.006)),
        "Part 017 gave no reading at first and was measured again, once, as the limit file allows.",
        "accept", ["accepted_by_plan"], {"A": (32, 0, 1, 0, 0), "B": (8, 0, 1, 0, 0)}, 32,
        drive="1.0 Vrms", order="PO-88129", form=Form("\t", ",", "\r\n", "utf-8"),
        faults={"017": "text_in_number_column"}, retests={"017~2": None},
    ),
    Lot(
        "26K-0501", "RG-0206-MKP", "SUP-060", 6, "BENCH-2", "2026-10-06T11:35:00+02:00",
        lambda rng: spread.lot(rng, 6, (0.006, 0.008)),
        "Six big film capacitors: the plan's sample is larger than the lot, so all six are inspected. Sweeps by a circuit simulator.",
        "accept", ["accepted_by_plan"], {"A": (6, 0, 1, 0, 0), "B": (6, 0, 1, 0, 0)}, 6,
        drive="0.3 Vrms", order="PO-88143", date_code="2635",
    ),
    Lot(
        "26K-0506", "RG-0337-ALU", "SUP-019", 120, "LCR-2", "2026-10-07T10:50:00+02:00",
        lambda rng: spread.lot(rng, 20, (-0.03, 0.02), (0.073, 0.004)),
        "The label on the reel names another part and another lot than the papers.",
        "hold", ["label_mismatch"], {"A": (13, 0, 1, 0, 0), "B": (20, 1, 2, 0, 0)}, 20,
        drive="0.5 Vrms", order="PO-88066", sweeps="table.csv", long_table=True,
        form=Form(";", ".", "\n", "utf-8"),
        label="[)>\x1e06\x1dPRG-0227-ALU\x1dQ120\x1d1T26K-0560\x1d10D2638\x1e\x04",
    ),
    Lot(
        "26K-0511", "RG-0475-X7R", "SUP-041", 80, "BENCH-2", "2026-10-06T14:10:00+02:00", _x7r(20, (-0.02, 0.01)),
        "The generator was set too low: the sweeps show 0.23 V across parts that must see 0.8 V to 1.2 V. Sweeps by a circuit simulator.",
        "hold", ["drive_out_of_range", "unmeasured_parts"], {"A": (20, 0, 1, 0, 0), "B": (8, 0, 1, 0, 0)}, 20,
        drive="1.0 Vrms", last_heat="2026-07-01", order="PO-88133", emf=0.4, operator="OP-21",
        faults={f"{k:03}": "drive_out_of_range" for k in range(1, 21)},
        also_possible=["sample_too_small", "capability_not_available", "outliers_not_available"],
    ),
    Lot(
        "26K-0515", "RG-0475-X7R", "SUP-041", 60, "BENCH-1", "2026-10-05T13:20:00+02:00", _x7r(20, (-0.02, 0.01)),
        "Nobody wrote down when these class 2 parts were last heated, so their capacitance cannot be referred to 1000 h.",
        "hold", ["ageing_unknown"], {"A": (20, 0, 1, 0, 0), "B": (8, 0, 1, 0, 0)}, 20,
        drive="0.98 Vrms", order="PO-88134", faults={f"{k:03}": "ageing_unknown" for k in range(1, 21)},
        also_possible=["unmeasured_parts", "sample_too_small", "capability_not_available", "outliers_not_available"],
    ),
    Lot(
        "26K-0519", "RG-0337-ALU", "SUP-019", 20, "LCR-2", "2026-10-07T15:05:00+02:00",
        lambda rng: _changed(spread.lot(rng, 15, (-0.02, 0.02), (0.071, 0.003)), {15: {"esr": 0.116}}),
        "Two parts more than the plan's 13 were measured, and the last of them is nonconforming.",
        "hold", ["nonconforming_beyond_sample"], {"A": (13, 0, 1, 0, 0), "B": (5, 0, 1, 0, 0)}, 13,
        drive="0.5 Vrms", order="PO-88067", form=Form(",", ".", "\r\n", "utf-8-sig"),
        nonconforming={"015": ["esr@100kHz"]},
        outliers={"esr@100kHz": ["015"], "dissipation_factor@120Hz": ["015"]},
    ),
    Lot(
        "26K-0522", "RG-0226-X5R", "SUP-052", 1500, "VNA-1", "2026-10-08T10:40:00+02:00",
        lambda rng: _changed(spread.lot(rng, 13, (-0.02, 0.03)), {4: {"l": 2.4, "c": 0.01}}),
        "Part 004 resonated too low and was measured again until it passed, which the limit file does not allow.",
        "hold", ["retest_not_allowed"], {"A": (13, 0, 1, 0, 0), "B": (13, 1, 2, 1, 0)}, 13,
        drive="0.45 Vrms", order="PO-88137", operator="OP-08", touchstone=("db", "1.0"),
        retests={"004~2": spread.Spread(c=0.01)},
        nonconforming={"004": ["srf", "impedance@5MHz"]},
    ),
    Lot(
        "26K-0526", "RG-0103-C0G", "SUP-046", 500, "LCR-4", "2026-10-09T08:20:00+02:00",
        lambda rng: spread.lot(rng, 13, (-0.002, 0.003)),
        "The instrument's calibration ran out nine days before, and the scanner dropped the label's separators.",
        "hold", ["calibration_expired", "label_unreadable"], {"all": (13, 0, 1, 0, 0)}, 13,
        order="PO-88144", operator="OP-21", form=Form(newline="\r\n"),
        label="[)>06PRG-0103-C0GQ5001T26K-052610D2638",
    ),
    Lot(
        "26K-0529", "RG-0104-X7R", "SUP-041", 40, "BENCH-3", "2026-10-06T15:45:00+02:00", _x7r(20, (0.005, 0.015)),
        "Part 011 is part 010 stored a second time, byte for byte.",
        "hold", ["duplicate_sweep"], {"A": (20, 0, 1, 0, 0), "B": (8, 0, 1, 0, 0)}, 20,
        drive="1.0 Vrms", last_heat="2026-08-01", order="PO-88119", duplicates={"011": "010"},
        also_possible=["unmeasured_parts", "sample_too_small"],
    ),
]
