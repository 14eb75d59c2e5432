"""Touchstone sweeps: what the program reads against what scikit-rf reads from the same files."""

import shutil

import numpy
import skrf
import yaml

from .page import Check, Section, tiny
from .program import ROOT, Site

METHODS = {
    "VNA-1": ("shunt_through", "Z21", lambda n: n.z[:, 1, 0]),
    "VNA-2": ("series_through", "-1/Y21", lambda n: -1 / n.y[:, 1, 0]),
    "VNA-3": ("reflection", "Z11", lambda n: n.z[:, 0, 0]),
}
POINTS = 12


def section(program, folder):
    """|Z| at points of the sweep itself, lot by lot."""
    site, checks = Site(program, folder), []
    for lot in sorted(p.parent for p in (ROOT / "sample-lots").glob("*/lot.yaml")):
        content = yaml.safe_load((lot / "lot.yaml").read_text(encoding="utf-8"))
        if content["station"] not in METHODS:
            continue
        method, words, impedance = METHODS[content["station"]]
        networks = {p.stem: skrf.Network(str(p)) for p in sorted((lot / "sweeps").iterdir())}
        grid = next(iter(networks.values())).f
        at = numpy.linspace(3, len(grid) - 4, POINTS).round().astype(int)
        site.station(content["station"], method=method)
        site.limits(content["part"], characteristics={"impedance": [{"at": f"{float(grid[i])!r} Hz", "max": "1 GΩ"} for i in at]},
                    acceptance={"fixed": {"sample": 1, "accept": 0}})
        shutil.copytree(lot, site.folder / lot.name)
        worst = count = 0
        for part in site.judge([site.folder / lot.name])[0]["parts"]:
            tried = next(a for a in part["attempts"] if a["counts"])["file"]
            theirs = abs(impedance(networks[tried.rpartition("/")[2].rpartition(".")[0]])[at])
            for reading, wanted in zip(part["readings"].values(), theirs, strict=True):
                count += 1
                worst = max(worst, numpy.inf if reading["value"] is None else abs(reading["value"] / wanted - 1))
        first = next((lot / "sweeps").iterdir()).read_text(encoding="utf-8")
        option = next(line for line in first.splitlines() if line.startswith("#")).strip()
        version = "2.0" if "[Version]" in first else "1"
        checks.append(Check(f"{lot.name}: version {version}, `{option}`, {method}", f"{words} of scikit-rf {skrf.__version__}", "1e-4",
                            "a reading is the local fit, not the point; it passes within this of clean sweeps", f"{tiny(worst, 1e-7)} over {count} readings", worst < 1e-4))
    return Section("Touchstone", "\\|Z\\| of every part at twelve points of its sweep, relative difference. Every Touchstone file that the scikit-rf package ships is compared by\n"
                   "[tests/sweep_touchstone_scikit_rf.rs](../tests/sweep_touchstone_scikit_rf.rs).", checks)
