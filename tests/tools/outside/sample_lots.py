"""The sample lots: readings against exact truth, verdicts against a judge written apart."""

import json

import numpy
from independent.judge import judge

from .page import Check, Section, share
from .program import ROOT, Site

# How the sweeps of a station's lots came to be; see sample-lots/README.md.
ORIGIN = {"BENCH-2": "circuit simulator (ngspice)", "VNA": "network library (scikit-rf)"}
TITLES = {
    "capacitance": "capacitance", "dissipation_factor": "dissipation factor", "esr": "ESR", "impedance": "impedance",
    "esr_minimum": "ESR minimum", "srf": "SRF", "esl": "ESL",
}


def records(program, folder):
    """Folder and record of every sample lot."""
    site = Site(program, folder)
    site.use_sample_limits()
    lots = sorted(p.parent for p in (ROOT / "sample-lots").glob("*/lot.yaml"))
    return list(zip(lots, site.judge(lots), strict=True))


def origin(station):
    return ORIGIN.get(station) or ORIGIN.get(station.split("-")[0]) or "model with noise and rounding"


def errors(found):
    """By origin and characteristic: relative error, allowed error, error over standard uncertainty of each reading."""
    result = {}
    for folder, record in found:
        truth = json.loads((folder / "truth.json").read_text(encoding="utf-8"))["parts"]
        allowed = json.loads((folder / "expected.json").read_text(encoding="utf-8"))["tolerance"]
        for part in record["parts"]:
            if part["verdict"] == "unmeasured":
                continue
            for key, reading in part["readings"].items():
                true, name = truth[part["part"]].get(key), key.partition("@")[0]
                if reading["value"] is None or true is None:
                    continue
                error, u = abs(reading["value"] - true), reading["standard_uncertainty"]
                group = result.setdefault((origin(record["station"]["station"]), name), [])
                group.append((error / true, allowed[name], error / u if u else numpy.inf))
    return result


def truth(found):
    section = Section(
        "Readings against exact truth",
        "Every measured part of the nineteen sample lots, judged by the program. The true values are those of the finite networks of resistors, inductors\n"
        "and capacitors behind the sweeps (`truth.json`; [sample-lots/README.md](../sample-lots/README.md)); the sweeps of the first two kinds were computed by no code of this\n"
        "project. Allowed is what `expected.json` of each lot states (here the largest of them): what the bench's stated uncertainty and noise let one expect. *Within 2 u*: the share of readings\n"
        "within twice their own standard uncertainty of the truth; 95 % would be right for normal errors, and more is usual, as the stations state more than\n"
        "the sweeps' noise.",
        head=("sweeps from", "characteristic", "readings", "rms error", "worst", "allowed", "within 2 u"),
    )
    passed = True
    for (kind, name), values in sorted(errors(found).items()):
        error, allowed, in_u = (numpy.array(column) for column in zip(*values, strict=True))
        passed &= bool(numpy.all(error <= allowed))
        section.lines.append((
            kind, TITLES[name], len(error), share(numpy.sqrt(numpy.mean(error**2))), share(error.max()),
            share(allowed.max()), f"{100 * numpy.mean(in_u <= 2):.0f} %",
        ))
    return section, passed


def verdicts(found):
    """The program against the judge in tests/tools/independent, which shares no code with it."""
    lots = parts = classes = outliers = 0
    right = dict.fromkeys(("lots", "parts", "classes", "outliers"), 0)
    for folder, record in found:
        other = judge(ROOT, folder)
        lots += 1
        right["lots"] += other["verdict"] == record["verdict"]
        for part in record["parts"]:
            parts += 1
            right["parts"] += other["parts"][part["part"]]["verdict"] == part["verdict"]
        for name, counts in record["sampling"]["classes"].items():
            classes += 1
            right["classes"] += all(counts[k] == v for k, v in other["sampling"]["classes"][name].items())
        for key, of in record["statistics"].items():
            outliers += 1
            right["outliers"] += sorted(of["outliers"]) == other["outliers"].get(key, [])
    source = "a judge in Python (numpy, scipy) that shares no code with the program, [tests/tools/independent](../tests/tools/independent)"
    totals = {"lots": lots, "parts": parts, "classes": classes, "outliers": outliers}
    names = {
        "lots": "verdicts on lots", "parts": "verdicts on parts", "classes": "plans and counts of classes (n, Ac, Re, nonconforming, undecided)",
        "outliers": "outliers of characteristics",
    }
    checks = [
        Check(names[k], source, "none may differ", "a verdict is no matter of degree", f"{right[k]} of {totals[k]} agree", right[k] == totals[k])
        for k in names
    ]
    return Section("Verdicts on the sample lots", "Each lot of `sample-lots/`, judged by the program and apart from it.", checks)
