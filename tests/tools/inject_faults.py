#!/usr/bin/env python3
"""Lets each system call of recording a lot fail, and kills the process at each, with strace.

    inject_faults.py [--limit N] [--every K] [--only CALLS]

A ledger with two entries is copied; a third is recorded while strace makes the n-th call of one
kind fail or kills the process there, once or for ever after. Afterwards: the ledger verifies and
holds the entry or does not; an entry that was acknowledged is there; recording again succeeds and
leaves exactly three entries. Prints one line for each kind of fault and a total; answers 1 where
anything went wrong. Needs Linux, strace and cargo; about a second for each fault.
"""

import argparse
import collections
import json
import os
import re
import shutil
import subprocess
import sys
import tempfile

# Calls on the way of a record, and the errors that the manual page of each names.
FAULTS = {
    "openat": ["KILL", "EACCES", "EMFILE", "ENOSPC"],
    "mkdir": ["KILL", "ENOSPC", "EROFS"],
    "write": ["KILL", "ENOSPC", "EIO"],
    "pwrite64": ["KILL", "ENOSPC", "EIO"],
    "fsync": ["KILL", "EIO", "ENOSPC"],
    "fdatasync": ["KILL", "EIO"],
    "rename": ["KILL", "EACCES", "ENOSPC"],
    "unlink": ["KILL", "EIO", "EACCES"],
    "ftruncate": ["KILL", "EIO"],
    "fcntl": ["KILL", "ENOLCK", "EAGAIN"],
    "flock": ["KILL", "ENOLCK"],
    "pread64": ["KILL", "EIO"],
}


def binary():
    """The test program that holds the writer and the checker: built now, or named."""
    if named := os.environ.get("REELGATE_TEST_PROGRAM"):
        return named
    out = subprocess.run(
        ["cargo", "test", "--no-run", "--test", "ledger", "--message-format=json"],
        check=True, capture_output=True, text=True).stdout
    for line in out.splitlines():
        message = json.loads(line)
        if message.get("executable") and message["target"]["name"] == "ledger":
            return message["executable"]
    sys.exit("cargo names no test program")


class Bench:
    def __init__(self):
        self.folder = tempfile.mkdtemp(prefix="reelgate-faults-")
        # A copy: the program may be built anew while this runs.
        self.program = shutil.copy(binary(), os.path.join(self.folder, "program"))
        self.prepared = os.path.join(self.folder, "prepared")
        for name in ("one", "two"):
            assert self.write(self.prepared, name)[0] == 0

    def run(self, test, variables, before=()):
        command = [*before, self.program, "--exact", test, "--nocapture", "--test-threads=1"]
        # A writer that is refused a lock waits for it as long as a person would.
        return subprocess.run(command, env={**os.environ, **variables}, text=True, timeout=300,
                              stdout=subprocess.PIPE, stderr=subprocess.PIPE)

    def write(self, records, name, before=()):
        done = self.run("many::writer", {"REELGATE_TEST_WRITER": f"{records}|{name}|1"}, before)
        return done.returncode, done.stdout, done.stderr

    def check(self, records):
        done = self.run("many::checker", {"REELGATE_TEST_CHECKER": records})
        match = re.search(r"checked (\d+) (\w+)", done.stdout)
        if not match:
            return None, done.stdout + done.stderr
        return int(match[1]), match[2] == "true"

    def fresh(self):
        records = os.path.join(self.folder, "records")
        shutil.rmtree(records, ignore_errors=True)
        shutil.copytree(self.prepared, records)
        return records

    def counts(self):
        """How often each call is made while a lot is recorded."""
        log = os.path.join(self.folder, "log")
        trace = "trace=" + ",".join(FAULTS)
        assert self.write(self.fresh(), "three", ["strace", "-f", "-o", log, "-e", trace])[0] == 0
        with open(log, encoding="utf-8", errors="replace") as lines:
            names = [m[1] for line in lines if (m := re.match(r"\d+ +(\w+)\(", line))]
        return collections.Counter(names)

    def attempt(self, call, fault, when):
        """One fault; what is wrong, and how it ended."""
        records = self.fresh()
        kind = "signal=KILL" if fault == "KILL" else f"error={fault}"
        inject = f"inject={call}:{kind}:when={when}"
        log = os.path.join(self.folder, "log")
        _, out, err = self.write(
            records, "three", ["strace", "-f", "-o", log, "-e", f"trace={call}", "-e", inject])
        with open(log, encoding="utf-8", errors="replace") as lines:
            trace = lines.read()
        # strace counts the calls of each thread for itself.
        if "(INJECTED)" not in trace and "+++ killed by SIGKILL" not in trace:
            return None, "untouched"
        said = "recorded 26K-three" in out
        if "panicked" in err and "library/" not in err and "many.rs" not in err:
            return f"panic: {err[-300:]}", "panic"
        size, proven = self.check(records)
        if size not in (2, 3) or proven is not True:
            return f"size {size}, {proven}", "broken"
        if said and size != 3:
            return "acknowledged and not there", "lost"
        again, text, _ = self.write(records, "three")
        if again != 0:
            return f"again: {text[-300:]}", "stuck"
        size_again, proven = self.check(records)
        if (size_again, proven) != (3, True):
            return f"after again: {size_again}, {proven}", "double"
        if said:
            return None, "recorded"
        return None, "unsaid" if size == 3 else "nothing"


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--limit", type=int, default=10**9, help="stop after so many faults")
    parser.add_argument("--only", help="only these calls: openat,write")
    parser.add_argument("--every", type=int, default=1, help="only every K-th call")
    arguments = parser.parse_args()
    bench = Bench()
    counts = bench.counts()
    wrong, total, endings = [], 0, collections.Counter()
    calls = arguments.only.split(",") if arguments.only else list(FAULTS)
    for call in calls:
        for fault in FAULTS[call]:
            seen = collections.Counter()
            for n in range(1, counts[call] + 1, arguments.every):
                # A process dies once; a lock that is never free is waited for a minute.
                once = fault in ("KILL", "EAGAIN", "ENOLCK")
                for when in (str(n),) if once else (str(n), f"{n}+"):
                    if total >= arguments.limit:
                        break
                    why, ending = bench.attempt(call, fault, when)
                    if ending == "untouched":
                        break
                    total += 1
                    seen[ending] += 1
                    if why:
                        wrong.append(f"{call} {fault} {when}: {why}")
                        print("WRONG", wrong[-1], flush=True)
            endings += seen
            print(f"{call:10} {fault:7} {counts[call]:4} calls: {dict(sorted(seen.items()))}", flush=True)
    shutil.rmtree(bench.folder, ignore_errors=True)
    print(f"{total} faults: {dict(sorted(endings.items()))}; wrong: {len(wrong)}")
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main())
