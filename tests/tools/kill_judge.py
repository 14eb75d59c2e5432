#!/usr/bin/env python3
"""Kills `reelgate judge` at each write, sync and rename, and lets each of them fail, with strace.

    kill_judge.py [--every K] [--only CALLS] [--random N] [--disk] [--at-once K] [--program PATH]

A fresh site judges a lot of three parts while strace kills the process at the n-th call of one
kind, or makes the call fail, once or for ever after. `--random N` kills it N times at any moment,
without strace. `--disk` judges on file systems with too little room, on one that is read-only, and with a
standard output that is full or closed (needs root). Afterwards: no panic; an exit status that the program has, and 2 where nothing
was recorded; `records verify` proves the ledger, or there is none yet; a verdict that was printed
is in it; judging again gives the record and both files, as the only record. Prints a line for each
kind of fault and a total; answers 1 where anything went wrong. Needs Linux and strace.
"""

import argparse
import collections
import concurrent.futures
import json
import os
import queue
import random
import shutil
import signal
import subprocess
import sys
import tempfile
import time

HOME = os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
# Calls on the way of a record, and the errors that the manual page of each names.
FAULTS = {
    "openat": ["KILL", "EACCES", "EMFILE", "ENOSPC", "EROFS"],
    "mkdir": ["KILL", "ENOSPC", "EROFS", "EACCES"],
    "write": ["KILL", "ENOSPC", "EIO"],
    "pwrite64": ["KILL", "ENOSPC", "EIO"],
    "fsync": ["KILL", "EIO", "ENOSPC"],
    "fdatasync": ["KILL", "EIO"],
    "rename": ["KILL", "EACCES", "ENOSPC", "EROFS"],
    "unlink": ["KILL", "EIO", "EACCES"],
    "ftruncate": ["KILL", "EIO"],
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
    """A site of its own, in memory, that is made anew for each fault."""

    def __init__(self, program, number):
        memory = "/dev/shm" if os.path.isdir("/dev/shm") else None
        self.folder = tempfile.mkdtemp(prefix=f"reelgate-kill-{number}-", dir=memory)
        self.program = shutil.copy(program, os.path.join(self.folder, "reelgate"))
        self.fresh = os.path.join(self.folder, "fresh")
        make_site(self.fresh)

    def leave(self):
        shutil.rmtree(self.folder, ignore_errors=True)

    def environment(self):
        return {**os.environ, "RAYON_NUM_THREADS": "1", "REELGATE_NOW": "2026-11-02T08:00:00+01:00"}

    def run(self, site, args, before=(), stdout=subprocess.PIPE):
        return subprocess.run([*before, self.program, *args], cwd=site, env=self.environment(), text=True,
                              stdout=stdout, stderr=subprocess.PIPE, timeout=300)

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
        """One fault; what is wrong afterwards, or None, and how it ended."""
        site = self.site()
        how = "signal=KILL" if kind == "KILL" else f"error={kind}"
        done = self.run(site, ["judge", "--format", "json", LOT],
                        ["strace", "-f", "-o", "/dev/null", "-e", f"trace={call}",
                         "-e", f"inject={call}:{how}:when={when}"])
        if "error while loading shared libraries" in done.stderr:
            return None, "not begun"
        # Where nothing can be written, nothing can be said.
        err = done.stderr or ("(no word can be written)" if call == "write" else "")
        return self.after(site, done.returncode, done.stdout, err, kind == "KILL", call == "openat")

    def random_kill(self, usual, dice):
        """A kill at any moment of a run, which takes `usual` seconds."""
        site = self.site()
        process = subprocess.Popen([self.program, "judge", "--format", "json", LOT], cwd=site, env=self.environment(),
                                   stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
        time.sleep(dice.uniform(0, usual))
        process.send_signal(signal.SIGKILL)
        out, err = process.communicate()
        wrong, ending = self.after(site, process.returncode, out, err, process.returncode == -signal.SIGKILL, False)
        return wrong, ending if process.returncode == -signal.SIGKILL else "over before"

    def after(self, site, status, out, err, killed, other_record):
        """What is wrong after a run that was disturbed, and how it ended."""
        if "panicked" in err:
            return "panic: " + err, "panic"
        if not killed and status not in (2, 3, 4):
            return f"exit status {status}: {err}", "odd"
        verified = self.run(site, ["records", "verify", "--format", "json"])
        there = verified.returncode == 0 and json.loads(verified.stdout)["records"] == 1
        if verified.returncode not in (0, 2) or (verified.returncode == 2 and "no ledger" not in verified.stderr):
            return f"verify: {verified.stdout}{verified.stderr}", "broken"
        if out.endswith("}\n") and not there:
            return "a verdict was printed that is not in the ledger", "lost"
        if not killed and status in (3, 4) and not there:
            return f"exit status {status}, and no record", "lost"
        if not killed and status == 2 and not err.strip():
            return "exit status 2 without a word", "mute"
        if "no entry was made" in err and "recorded, but" not in err and there:
            return f"recorded, and said not to be: {err}", "untrue"
        again = self.run(site, ["judge", LOT])
        if again.returncode != 3:
            return f"judging again: {again.returncode} {again.stderr}", "stuck"
        found = json.loads(self.run(site, ["records", "verify", "--format", "json"]).stdout)
        files = os.listdir(os.path.join(site, "records", "certificates"))
        # A sweep file that could not be opened is an unmeasured part: another record, which the next one names.
        records = found["records"] if other_record and not killed and found["records"] == 2 else 1
        if (found["proven"], found["records"], found["certificates"]) != (True, records, records):
            return f"after judging again: {found}", "broken"
        if sum(name.endswith((".pdf", ".json")) for name in files) != 2 * records or len(files) != 2 * records:
            return f"files after judging again: {files}", "left over"
        if killed:
            return None, "killed, recorded" if there else "killed, nothing recorded"
        return None, f"exit {status}, {'recorded' if there else 'nothing recorded'}"


class Benches:
    """So many at once, each busy with one fault."""

    def __init__(self, program, count):
        self.count = count
        self.free = queue.Queue()
        self.all = [Bench(program, number) for number in range(count)]
        for bench in self.all:
            self.free.put(bench)
        self.total = self.bad = 0

    def each(self, title, tasks):
        """Does (name, work of a bench) for all tasks, and says how they ended."""
        def one(task):
            bench = self.free.get()
            try:
                return task[0], *task[1](bench)
            finally:
                self.free.put(bench)

        endings = collections.Counter()
        with concurrent.futures.ThreadPoolExecutor(self.count) as pool:
            for name, wrong, ending in pool.map(one, tasks):
                endings[ending] += 1
                if wrong:
                    self.bad += 1
                    print(f"WRONG {name}: {wrong}", flush=True)
        self.total += len(tasks)
        ends = ", ".join(f"{count} {ending}" for ending, count in sorted(endings.items()))
        print(f"{title:24} {len(tasks):5}: {ends}", flush=True)


def injected(benches, every, only):
    for call, kinds in FAULTS.items():
        if only and call not in only:
            continue
        count = benches.all[0].calls(call)
        for kind in kinds:
            tasks = []
            for first in range(1, count + 1, every):
                # Locks that are refused for ever are waited for, a minute each time.
                once = kind in ("KILL", "ENOLCK")
                for when in (str(first),) if once else (str(first), f"{first}+"):
                    tasks.append((f"{call} {kind} when={when}",
                                  lambda bench, call=call, kind=kind, when=when: bench.fault(call, kind, when)))
            if tasks:
                benches.each(f"{call} {kind}, {count} calls", tasks)


def at_random(benches, count, seed):
    bench = benches.all[0]
    times = []
    for _ in range(5):
        site = bench.site()
        began = time.monotonic()
        bench.run(site, ["judge", LOT])
        times.append(time.monotonic() - began)
    usual = max(times)
    dice = [random.Random(f"{seed} {number}") for number in range(count)]
    benches.each(f"any moment, seed {seed}", [
        (f"random {number}", lambda bench, number=number: bench.random_kill(usual, dice[number])) for number in range(count)])


def disks(benches):
    """Room for so many KiB, none at all, and a standard output that takes nothing."""
    bench = benches.all[0]

    def small(bench, room):
        site = bench.site()
        records = os.path.join(site, "records")
        os.mkdir(records)
        subprocess.run(["mount", "-t", "tmpfs", "-o", f"size={room}k", "none", records], check=True)
        try:
            done = bench.run(site, ["judge", "--format", "json", LOT])
            if "panicked" in done.stderr or done.returncode not in (2, 3, 4):
                return f"exit status {done.returncode}: {done.stderr}", "odd"
            subprocess.run(["mount", "-o", "remount,size=64m", records], check=True)
            return bench.after(site, done.returncode, done.stdout, done.stderr, False, False)
        finally:
            subprocess.run(["umount", "-l", records], check=True)

    def read_only(bench):
        site = bench.site()
        subprocess.run(["mount", "--bind", site, site], check=True)
        try:
            subprocess.run(["mount", "-o", "remount,bind,ro", site], check=True)
            done = bench.run(site, ["judge", "--format", "json", LOT])
            subprocess.run(["mount", "-o", "remount,bind,rw", site], check=True)
            if done.returncode != 2:
                return f"exit status {done.returncode}: {done.stderr}", "odd"
            return bench.after(site, done.returncode, done.stdout, done.stderr, False, False)
        finally:
            subprocess.run(["umount", "-l", site], check=True)

    def no_output(bench, how, form):
        site = bench.site()
        if how == "full":
            stdout = os.open("/dev/full", os.O_WRONLY)
        else:
            reader, stdout = os.pipe()
            os.close(reader)
        try:
            done = bench.run(site, ["judge", "--format", form, LOT], stdout=stdout)
        finally:
            os.close(stdout)
        if done.returncode != 4:
            return f"exit status {done.returncode}: {done.stderr}", "odd"
        return bench.after(site, done.returncode, "", done.stderr, False, False)

    needed = [*range(4, 400, 4)]
    benches.each("room for 4 to 396 KiB", [
        (f"room {room}", lambda bench, room=room: small(bench, room)) for room in needed])
    benches.each("read-only", [("read-only", read_only)])
    benches.each("output full or closed", [
        (f"{how} {form}", lambda bench, how=how, form=form: no_output(bench, how, form))
        for how in ("full", "closed") for form in ("text", "json")])


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--every", type=int, default=1, help="only every K-th call; 0: no injected faults")
    parser.add_argument("--only", help="only these calls: openat,write")
    parser.add_argument("--random", type=int, default=0, help="so many kills at any moment")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--disk", action="store_true", help="small and read-only file systems")
    parser.add_argument("--at-once", type=int, default=2)
    parser.add_argument("--program", default=os.path.join(HOME, "target", "release", "reelgate"))
    arguments = parser.parse_args()
    benches = Benches(arguments.program, arguments.at_once)
    try:
        if arguments.every:
            injected(benches, arguments.every, arguments.only.split(",") if arguments.only else None)
        if arguments.random:
            at_random(benches, arguments.random, arguments.seed)
        if arguments.disk:
            disks(benches)
    finally:
        for bench in benches.all:
            bench.leave()
    print(f"{benches.total} faults, {benches.bad} wrong")
    return 1 if benches.bad or not benches.total else 0


if __name__ == "__main__":
    sys.exit(main())
