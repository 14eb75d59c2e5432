#!/usr/bin/env python3
"""Lets several processes judge at once into one ledger, and looks whether all is there, once.

    judge_together.py [--processes N] [--records N] [--program PATH]

Each process judges its share of the lots, one command a lot. Afterwards every lot has one record,
the entries are numbered without a gap, a record's entry has the number that the ledger gives it, and
`records verify` proves all of them. Answers 1 where anything is wrong.
"""

import argparse
import concurrent.futures
import json
import os
import re
import shutil
import subprocess
import sys
import tempfile

HOME = os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
SAMPLE = os.path.join(HOME, "sample-lots", "26K-0457")


def lot_number(n):
    return f"26T-{n:04}"


def make_lot(site, n):
    """A lot of one part, whose sweep is its own: the frequency of its last point differs."""
    folder = os.path.join(site, "lots", lot_number(n))
    os.makedirs(os.path.join(folder, "sweeps"))
    with open(os.path.join(SAMPLE, "lot.yaml"), encoding="utf-8") as file:
        text = file.read().replace("26K-0457", lot_number(n))
    with open(os.path.join(folder, "lot.yaml"), "w", encoding="utf-8") as file:
        file.write(text)
    with open(os.path.join(SAMPLE, "sweeps", f"{n % 100 + 1:03}.csv"), encoding="utf-8") as file:
        sweep = file.read().rstrip("\n")
    # A line that is no datum, so that no two files are the same.
    with open(os.path.join(folder, "sweeps", "001.csv"), "w", encoding="utf-8") as file:
        file.write(f"Lot {lot_number(n)}\n{sweep}\n")


def judge(program, site, numbers):
    """Judges these lots one after the other; exit status and record of each."""
    done = []
    environment = {**os.environ, "RAYON_NUM_THREADS": "1", "REELGATE_NOW": "2026-11-02T08:00:00+01:00"}
    for n in numbers:
        run = subprocess.run([program, "judge", "--format", "json", os.path.join("lots", lot_number(n))],
                             cwd=site, env=environment, capture_output=True, text=True)
        record = re.search(r'"record": "([^"]+)"', run.stdout)
        done.append((n, run.returncode, record[1] if record else None, run.stderr))
    return done


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--processes", type=int, default=8)
    parser.add_argument("--records", type=int, default=1000)
    parser.add_argument("--program", default=os.path.join(HOME, "target", "release", "reelgate"))
    arguments = parser.parse_args()
    site = tempfile.mkdtemp(prefix="reelgate-together-")
    try:
        program = shutil.copy(arguments.program, os.path.join(site, "reelgate"))
        shutil.copytree(os.path.join(HOME, "limits"), os.path.join(site, "limits"))
        for n in range(arguments.records):
            make_lot(site, n)
        shares = [range(k, arguments.records, arguments.processes) for k in range(arguments.processes)]
        with concurrent.futures.ThreadPoolExecutor(arguments.processes) as pool:
            said = [line for lines in pool.map(lambda share: judge(program, site, share), shares) for line in lines]

        def ask(*args):
            run = subprocess.run([program, "records", *args, "--format", "json"], cwd=site, capture_output=True, text=True)
            return json.loads(run.stdout)

        found, listed = ask("verify"), ask("list")
    finally:
        shutil.rmtree(site, ignore_errors=True)
    wrong = [f"{lot_number(n)}: exit status {status}: {error}" for n, status, record, error in said
             if status not in (0, 1, 3) or record is None]
    records = [line["record"] for line in listed]
    if sorted(records) != sorted(record for _, _, record, _ in said if record):
        wrong.append("the list is not what was said")
    if len(set(records)) != arguments.records or found["records"] != arguments.records:
        wrong.append(f"{len(set(records))} records, {found['records']} verified")
    entries = sorted(line["entry"] for line in listed)
    if len(set(entries)) != len(entries) or max(entries) >= found["entries"]:
        wrong.append("entries have the same number, or numbers beyond the end")
    if not found["proven"]:
        wrong.append(f"not proven: {json.dumps(found)[:2000]}")
    for line in wrong:
        print("WRONG", line)
    print(f"{arguments.processes} processes, {len(said)} lots: {found['records']} records in {found['entries']} entries, "
          f"{found['certificates']} certificates, {'all proven' if found['proven'] else 'not proven'}; {len(wrong)} wrong")
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main())
