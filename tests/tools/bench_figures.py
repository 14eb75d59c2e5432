#!/usr/bin/env python3
"""Figures of the operator's run: how soon a verdict comes, and what interruptions do.

    bench_figures.py latency [--files 1000] [--program PATH]
    bench_figures.py kill    [--times 500] [--seed 1] [--program PATH]

`latency` saves files into a watched folder one after the other, each written whole beside it and renamed, and takes
the time until the verdict on it is printed; the median and the 99th percentile are also given as ratios to reading the
same file. `kill` kills the program (SIGKILL) at random moments while an analyser keeps saving sweeps, starts it again
each time, and looks at the end whether each sweep is kept once, whole, under one part, and the ledger proves the
record. Answers 1 where anything is lost or twice. Sweeps are those of sample lot 26K-0457, each a little scaled, so
that no two files are the same.
"""

import argparse
import hashlib
import json
import os
import random
import shutil
import statistics
import subprocess
import sys
import tempfile
import threading
import time

HOME = os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
LABEL = "[)>\x1e06\x1dPRG-9475-X7R\x1dQ100000\x1d1T26K-9001\x1d10D2638\x1dKPO-9\x1dVSUP-041\x1e\x04"
NOW = "2026-10-05T09:12:00+02:00"


def site(parts):
    folder = tempfile.mkdtemp(prefix="reelgate-bench-")
    for name in ("limits/parts", "limits/stations", "incoming"):
        os.makedirs(os.path.join(folder, name))
    with open(os.path.join(folder, "limits/parts/RG-9475-X7R.yaml"), "w", encoding="utf-8") as file:
        file.write("part: RG-9475-X7R\nrevision: 1\ncharacteristics:\n"
                   "  capacitance: {at: 1 kHz, nominal: 4.7 µF, tolerance: ±20 %}\n"
                   "  esr_minimum: {max: 60 mΩ}\n  srf: {min: 1 MHz, max: 9 MHz}\n"
                   f"acceptance: {{fixed: {{sample: {parts}, accept: {parts - 1}}}}}\n"
                   "retest: {unmeasured: 1, nonconforming: 0}\n")
    with open(os.path.join(folder, "limits/stations/BENCH-9.yaml"), "w", encoding="utf-8") as file:
        file.write("station: BENCH-9\nmethod: direct\nlayout:\n"
                   '  columns: {frequency: "Frequency (Hz)", magnitude: "|Z| (mOhm)", phase: "Phase (deg)"}\n'
                   "uncertainty: {magnitude: 0.2 %, phase: 0.05 °}\n"
                   f"watch: {{folder: incoming, settle: 0.2 s, points: {points()}}}\n")
    return folder


def original(k):
    path = os.path.join(HOME, "sample-lots", "26K-0457", "sweeps", f"{k % 120 + 2:03}.csv")
    with open(path, encoding="utf-8") as file:
        return file.read().splitlines()


def rows(lines):
    for line in lines:
        cells = line.split(",")
        try:
            yield line, [float(cell) for cell in cells] if len(cells) == 3 else None
        except ValueError:
            yield line, None


def points():
    return sum(row is not None for _, row in rows(original(0)))


def sweep(k):
    """A part of the sample lot with every |Z| scaled by up to one percent, no two alike."""
    factor = 1 + 1e-5 * (k % 1000) + 1e-8 * (k // 1000)
    text = []
    for line, row in rows(original(k)):
        text.append(line if row is None else f"{line.split(',')[0]},{row[1] * factor:.9g},{line.split(',')[2]}")
    return ("\n".join(text) + "\n").encode()


def save(folder, name, data):
    beside = os.path.join(folder, "incoming", name + ".tmp")
    with open(beside, "wb") as file:
        file.write(data)
    os.rename(beside, beside[: -len(".tmp")])


def begins(journal):
    """Whether the journal has a whole line."""
    if not os.path.exists(journal):
        return False
    with open(journal, "rb") as file:
        return b"\n" in file.read()


class Program:
    """The program line by line; what it prints wakes whoever waits."""

    def __init__(self, folder, path):
        environment = {**os.environ, "REELGATE_NOW": NOW}
        self.process = subprocess.Popen(
            [path, "bench", "--plain", "--seed", "7", "--operator", "OP-17", "--station", "BENCH-9"], cwd=folder,
            env=environment, stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.STDOUT)
        self.lines, self.news = [], threading.Condition()
        threading.Thread(target=self.listen, daemon=True).start()

    def listen(self):
        for line in self.process.stdout:
            now = time.perf_counter()
            with self.news:
                self.lines.append((now, line.decode(errors="replace")))
                self.news.notify_all()

    def type(self, text):
        self.process.stdin.write((text + "\n").encode())
        self.process.stdin.flush()

    def see(self, text, patience=300):
        """When a line with this text came."""
        at, end = 0, time.monotonic() + patience
        with self.news:
            while True:
                for when, line in self.lines[at:]:
                    if text in line:
                        return when
                at = len(self.lines)
                if not self.news.wait(end - time.monotonic()):
                    raise SystemExit(f"{text!r} did not come; the last lines were {self.lines[-5:]}")


def latency(args):
    folder = site(args.files)
    program = Program(folder, args.program)
    program.type(LABEL)
    program.see("Enter to begin")
    program.type("")
    program.see("Part 001 of" if args.files < 1000 else "Part 0001 of")
    width = max(3, len(str(args.files)))
    took, reading = [], []
    for k in range(args.files):
        data, name = sweep(k), f"s{k:06}.csv"
        beside = os.path.join(folder, "incoming", name + ".tmp")
        with open(beside, "wb") as file:
            file.write(data)
        with program.news:
            program.lines.clear()
        begin = time.perf_counter()
        os.rename(beside, beside[: -len(".tmp")])
        took.append(program.see(f"Part {k + 1:0{width}}: ") - begin)
        begin = time.perf_counter()
        with open(os.path.join(folder, "incoming", name), "rb") as file:
            file.read()
        reading.append(time.perf_counter() - begin)
    program.process.kill()
    shutil.rmtree(folder)
    took.sort()
    floor = statistics.median(reading)
    median, last = statistics.median(took), took[int(0.99 * (len(took) - 1))]
    print(f"{len(took)} files: from the complete file to the printed verdict, median {1e3 * median:.1f} ms "
          f"({median / floor:.0f} times reading the file), 99th percentile {1e3 * last:.1f} ms ({last / floor:.0f} times); "
          f"reading {1e6 * floor:.0f} µs")
    return 0


def kill(args):
    dice = random.Random(args.seed)
    parts = args.times
    folder = site(parts)
    files = [sweep(k) for k in range(parts)]
    saved, stop = [0], threading.Event()

    def analyser():
        while saved[0] < parts and not stop.is_set():
            if begun.wait(0.1):
                save(folder, f"s{saved[0]:06}.csv", files[saved[0]])
                saved[0] += 1
                time.sleep(0.25 * feeder.random())

    begun, feeder = threading.Event(), random.Random(args.seed + 1)
    thread = threading.Thread(target=analyser, daemon=True)
    thread.start()
    journal = os.path.join(folder, "lots", "26K-9001", "run.jsonl")
    for _ in range(args.times):
        program = Program(folder, args.program)
        program.type(LABEL)
        if begins(journal):
            begun.set()
        else:
            program.type("")
        time.sleep(dice.uniform(0.0, 0.6))
        program.process.kill()
        program.process.wait()
    begun.set()
    program = Program(folder, args.program)
    program.type(LABEL)
    program.see("All parts are measured", 1800)
    program.type("")
    program.see("Record: ", 600)
    program.type("p")
    program.process.wait()
    stop.set()
    wrong = []
    lot = os.path.join(folder, "lots", "26K-9001")
    kept = {}
    for name in sorted(os.listdir(os.path.join(lot, "sweeps"))):
        with open(os.path.join(lot, "sweeps", name), "rb") as file:
            kept.setdefault(hashlib.sha256(file.read()).hexdigest(), []).append(name)
    wanted = {hashlib.sha256(data).hexdigest() for data in files}
    lost, twice = wanted - set(kept), [names for names in kept.values() if len(names) > 1]
    wrong += [f"{len(lost)} sweeps lost"] if lost else []
    wrong += [f"kept twice: {twice}"] if twice else []
    wrong += ["sweeps that were never saved"] if set(kept) - wanted else []
    with open(journal, encoding="utf-8") as file:
        events = [json.loads(line) for line in file]
    swept = [event["sha256"] for event in events if event["event"] == "swept"]
    wrong += ["judged twice"] if len(swept) != len(set(swept)) else []
    resumed = sum(event["event"] == "resumed" for event in events)
    done = subprocess.run([args.program, "records", "verify"], cwd=folder, capture_output=True, text=True)
    wrong += [f"records verify: {done.stdout}"] if done.returncode else []
    print(f"{args.times} times killed, {resumed} resumptions, {parts} sweeps saved, {len(kept)} kept, {len(swept)} judged: "
          + ("; ".join(wrong) or "none lost, none twice"))
    if not wrong:
        shutil.rmtree(folder)
    return 1 if wrong else 0


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("what", choices=["latency", "kill"])
    parser.add_argument("--files", type=int, default=1000)
    parser.add_argument("--times", type=int, default=500)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--program", default=os.path.join(HOME, "target", "release", "reelgate"))
    args = parser.parse_args()
    args.program = os.path.abspath(args.program)
    return {"latency": latency, "kill": kill}[args.what](args)


if __name__ == "__main__":
    sys.exit(main())
