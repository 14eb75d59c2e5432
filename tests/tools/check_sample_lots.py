#!/usr/bin/env python3
"""Judges every sample lot apart from the program and confirms expected.json and truth.json.

Run it with `.venv/bin/python tests/tools/check_sample_lots.py [LOT…]`; status 1 if anything differs.
"""

import json
import sys
from pathlib import Path

from independent.judge import judge

ROOT = Path(__file__).resolve().parents[2]


def zones(found, zone):
    """Part to the keys of its readings in that zone."""
    return {
        part: sorted(k for k, z in judged["zones"].items() if z == zone)
        for part, judged in found["parts"].items()
        if judged["verdict"] == zone and judged["zones"]
    }


def differences(folder, found, expected):
    """Sentences on everything that is not as expected."""
    result = []

    def compare(what, got, wanted):
        if got != wanted:
            result.append(f"{what}: found {got}, expected {wanted}")

    compare("verdict", found["verdict"], expected["verdict"])
    missing = set(expected["reasons"]) - set(found["reasons"])
    surplus = set(found["reasons"]) - set(expected["reasons"]) - set(expected["also_possible"])
    if missing or surplus:
        result.append(f"reasons: missing {sorted(missing)}, not expected {sorted(surplus)}")
    compare("sampling", found["sampling"], expected["sampling"])
    for zone in ("nonconforming", "undecided"):
        compare(zone, zones(found, zone), {k: sorted(v) for k, v in expected[zone].items()})
    faults = {p: j["fault"] for p, j in found["parts"].items() if j["fault"]}
    compare("unmeasured", faults, expected["unmeasured"])
    compare("outliers", found["outliers"], expected["outliers"])
    compare("duplicates", found["duplicates"], expected["duplicates"])
    compare("retested", found["retested"], expected["retested"])
    return result


def deviations(folder, found, expected):
    """Largest relative deviation of readings from the true values by characteristic; sentences on those too large."""
    truth = json.loads((folder / "truth.json").read_text(encoding="utf-8"))["parts"]
    largest, result = {}, []
    for part, judged in found["parts"].items():
        for key, value in judged["readings"].items():
            true = truth[part].get(key)
            if value is None or true is None or part in expected["unmeasured"]:
                continue
            name = key.partition("@")[0]
            deviation = abs(value / true - 1)
            largest[name] = max(largest.get(name, 0.0), deviation)
            if deviation > expected["tolerance"][name]:
                result.append(f"part {part} {key}: read {value:.6g}, true {true:.6g}, {deviation:.2%} apart")
    return largest, result


def check(name):
    folder = ROOT / "sample-lots" / name
    expected = json.loads((folder / "expected.json").read_text(encoding="utf-8"))
    found = judge(ROOT, folder)
    wrong = differences(folder, found, expected)
    largest, apart = deviations(folder, found, expected)
    print(f"{name}: {found['verdict']}, {', '.join(found['reasons'])}")
    print("  largest deviation from truth: " + ", ".join(f"{k} {v:.1e}" for k, v in sorted(largest.items())))
    for line in wrong + apart:
        print(f"  WRONG {line}")
    nothing_to_read = len(expected["unmeasured"]) == len(found["parts"])
    return not (wrong or apart) and bool(largest) != nothing_to_read


def main():
    names = sys.argv[1:] or sorted(p.parent.name for p in (ROOT / "sample-lots").glob("*/lot.yaml"))
    good = [check(name) for name in names]
    print(f"{sum(good)} of {len(good)} lots as expected")
    sys.exit(0 if good and all(good) else 1)


if __name__ == "__main__":
    main()
