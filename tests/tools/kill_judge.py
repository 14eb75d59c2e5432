#!/usr/bin/env python3
"""Kills `reelgate judge` at each write, sync and rename, and lets each of them fail, with strace.

    kill_judge.py [--every K] [--only CALLS] [--program PATH]

A fresh site judges a lot of three parts while strace kills the process at the n-th call of one
kind, or makes the call fail, once or for ever after. Afterwards: no panic; an exit status that the
program has; `records verify` proves the ledger, or there is none yet; a verdict that was printed
is in it; judging again gives the record and both files, as the only record. Prints a line for each
kind of fault and a total; answers 1 where anything went wrong. Needs Linux and strace.
"""

import argparse
import json
import os
import shutil
import subprocess
import sys
import tempfile

HOME = os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
# Calls on the way of a record, and the errors that the manual page of each names.
FAULTS = {
    "openat": ["KILL", "EACCES", "EMFILE"],
    "mkdir": ["KILL", "ENOSPC", "EROFS"],
    "write": ["KILL", "ENOSPC", "EIO"],
    "pwrite64": ["KILL", "ENOSPC", "EIO"],
    "fsync": ["KILL", "EIO", "ENOSPC"],
    "rename": ["KILL", "EACCES", "ENOSPC"],
    "unlink": ["KILL", "EIO"],
    "fcntl": ["KILL", "ENOLCK"],
    "pread64": ["KILL", "EIO"],
}
LOT = "lots/26K-0001"


def make_site(folder):
    shutil.copytree(os.path.join(HOME, "limits"), os.path.join(folder, "limits"))
    sample = os.path.join(HOME, "sample-lots", "26K-0457")
    os.makedirs(os.path.join(folder, LOT, "sweeps"))
    with open(os.path.join(sample, "lot.yaml"), encoding="utf-8") as file:
        text = file.read().replace("26K-0457", "26K-0001")
    with open(os.path.join(folder, LOT, "lot.yaml"), "w", encoding="utf-8") as file:
        file.write(text)
    for part in ("001", "002", "003"):
        name = os.path.join("sweeps", part + ".csv")
        shutil.copy(os.path.join(sample, name), os.path.join(folder, LOT, name))


class Bench:
    def __init__(self, program):
        memory = "/dev/shm" if os.path.isdir("/dev/shm") else None
        self.folder = tempfile.mkdtemp(prefix="reelgate-kill-", dir=memory)
        self.program = shutil.copy(program, os.path.join(self.folder, "reelgate"))
        self.fresh = os.path.join(self.folder, "fresh")
        make_site(self.fresh)

    def run(self, site, args, before=()):
        environment = {**os.environ, "RAYON_NUM_THREADS": "1", "REELGATE_NOW": "2026-11-02T08:00:00+01:00"}
        return subprocess.run([*before, self.program, *args], cwd=site, env=environment, text=True,
                              capture_output=True, timeout=300)

    def site(self):
        site = os.path.join(self.folder, "site")
        shutil.rmtree(site, ignore_errors=True)
        shutil.copytree(self.fresh, site)
        return site

    def calls(self, call):
        """How often a call comes in a run that nothing disturbs."""
        log = os.path.join(self.folder, "calls")
        self.run(self.site(), ["judge", LOT], ["strace", "-f", "-o", log, "-e", f"trace={call}"])
        with open(log, encoding="utf-8", errors="replace") as file:
            return sum(f"{call}(" in line for line in file)

    def fault(self, call, kind, when):
        """One fault; what is wrong afterwards, or None."""
        site = self.site()
        how = "signal=KILL" if kind == "KILL" else f"error={kind}"
        done = self.run(site, ["judge", "--format", "json", LOT],
                        ["strace", "-f", "-o", "/dev/null", "-e", f"trace={call}",
                         "-e", f"inject={call}:{how}:when={when}"])
        if "panicked" in done.stderr:
            return "panic: " + done.stderr
        if "error while loading shared libraries" in done.stderr:
            return None  # the program did not begin
        if kind != "KILL" and done.returncode not in (2, 3, 4):
            return f"exit status {done.returncode}: {done.stderr}"
        verified = self.run(site, ["records", "verify", "--format", "json"])
        there = verified.returncode == 0 and json.loads(verified.stdout)["records"] == 1
        if verified.returncode not in (0, 2) or (verified.returncode == 2 and "no ledger" not in verified.stderr):
            return f"verify: {verified.stdout}{verified.stderr}"
        if done.stdout.endswith("}\n") and not there:
            return "a verdict was printed that is not in the ledger"
        if done.returncode == 4 and not there:
            return "said to be recorded, and is not"
        again = self.run(site, ["judge", LOT])
        if again.returncode != 3:
            return f"judging again: {again.returncode} {again.stderr}"
        found = json.loads(self.run(site, ["records", "verify", "--format", "json"]).stdout)
        files = os.listdir(os.path.join(site, "records", "certificates"))
        # A sweep file that could not be opened is an unmeasured part: another record, which the next one names.
        records = found["records"] if call == "openat" and kind != "KILL" and found["records"] == 2 else 1
        if (found["proven"], found["records"], found["certificates"]) != (True, records, records):
            return f"after judging again: {found}"
        if sum(name.endswith((".pdf", ".json")) for name in files) != 2 * records:
            return f"files after judging again: {files}"
        return None


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--every", type=int, default=1, help="only every K-th call")
    parser.add_argument("--only", help="only these calls: openat,write")
    parser.add_argument("--program", default=os.path.join(HOME, "target", "release", "reelgate"))
    arguments = parser.parse_args()
    bench = Bench(arguments.program)
    total = bad = 0
    try:
        for call, kinds in FAULTS.items():
            if arguments.only and call not in arguments.only.split(","):
                continue
            count = bench.calls(call)
            for kind in kinds:
                done = 0
                for first in range(1, count + 1, arguments.every):
                    # Locks that are refused for ever are waited for, a minute each time.
                    once = kind in ("KILL", "ENOLCK")
                    for when in (str(first),) if once else (str(first), f"{first}+"):
                        wrong = bench.fault(call, kind, when)
                        done += 1
                        if wrong:
                            bad += 1
                            print(f"WRONG {call} {kind} when={when}: {wrong}", flush=True)
                total += done
                print(f"{call:10} {kind:7} {count:4} calls, {done:4} faults", flush=True)
    finally:
        shutil.rmtree(bench.folder, ignore_errors=True)
    print(f"{total} faults, {bad} wrong")
    return 1 if bad or not total else 0


if __name__ == "__main__":
    sys.exit(main())
