#!/usr/bin/env python3
"""Runs the fuzz targets of tests/fuzz: every parser, on bytes that nobody would write.

    fuzz.py [--runs N] [--long N] [--only TARGETS] [--at-once K] [--sanitizer KIND] [--keep] [--built DIR]

Builds the targets with cargo-fuzz (`cargo install cargo-fuzz`) on the stable toolchain, and runs
each N times from its corpus, K targets at a time, at the lowest priority, with at most 512 MB of
memory and five seconds (`--timeout`) for an input; then a share of that with inputs as long as the parser takes
them. Prints a table with date, commit, executions and coverage, and writes it to
target/fuzz-report.md. An input that broke something stands in target/fuzz-found/<target>/: mend the
parser and keep the input in tests/fuzz/corpus/<target>/, where tests/fuzz_corpus.rs replays it.
`--keep` takes the smallest set of inputs with the same coverage into that folder. Answers 1 where a
target found something. Needs Linux, cargo-fuzz and a C++ compiler.

`--sanitizer address` watches the memory of the libraries that are not written in safe Rust; slower.
"""

import argparse
import concurrent.futures
import datetime
import os
import re
import shutil
import subprocess
import sys
import threading

HOME = os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
CRATE = os.path.join(HOME, "tests", "fuzz")
OUT = os.environ.get("CARGO_TARGET_DIR", os.path.join(HOME, "target"))
# Longest input of the many, of the few long ones, and the words that the parser knows.
TARGETS = {
    "record": (2048, 256 << 10, "record"),
    "entry": (512, 64 << 10, "record"),
    "note": (512, 64 << 10, "note"),
    "label": (256, 16 << 10, "label"),
    "quantity": (48, 1024, "quantity"),
    "touchstone": (256, 256 << 10, "touchstone"),
    "delimited": (256, 256 << 10, "delimited"),
    "site": (384, 64 << 10, "yaml"),
    "lot": (256, 64 << 10, "yaml"),
    "station": (384, 64 << 10, "yaml"),
    "limits": (384, 64 << 10, "yaml"),
}
# Kept inputs are at most so long, and so many for each target.
KEPT_LENGTH, KEPT_INPUTS = 2048, 160


def build(sanitizer):
    environment = {**os.environ, "RUSTC_BOOTSTRAP": "1"}
    folder = os.path.join(OUT, "fuzz-" + sanitizer)
    # Recording every comparison halves the speed; the dictionaries stand in for it.
    subprocess.run(["nice", "-n", "10", "cargo", "fuzz", "build", "--fuzz-dir", CRATE, "--sanitizer", sanitizer,
                    "--no-trace-compares", "--codegen-units", "8", "--target-dir", folder],
                   check=True, env=environment, cwd=HOME)
    host = re.search(r"host: (\S+)", subprocess.run(["rustc", "-vV"], check=True, capture_output=True, text=True).stdout)
    return os.path.join(folder, host[1], "release")


def runner(programs, name, corpus, options):
    found = os.path.join(OUT, "fuzz-found", name)
    os.makedirs(found, exist_ok=True)
    words = os.path.join(CRATE, "dict", TARGETS[name][2])
    return ["nice", "-n", "19", os.path.join(programs, name), "-rss_limit_mb=512", "-print_final_stats=1",
            f"-artifact_prefix={found}/", f"-dict={words}", *options, *corpus]


def run(programs, name, runs, longest, seconds, log):
    """One run; executions, edges, features and how many inputs are kept, or what was found."""
    corpus = os.path.join(OUT, "fuzz-corpus", name)
    os.makedirs(corpus, exist_ok=True)
    # Weighing inputs by rarity (-entropic=1) costs three times as much as reading them.
    command = runner(programs, name, [corpus, os.path.join(CRATE, "corpus", name)],
                     [f"-runs={runs}", f"-max_len={longest}", f"-timeout={seconds}", "-reload=0", "-entropic=0"])
    with open(log, "w", encoding="utf-8") as out:
        code = subprocess.run(command, stdout=out, stderr=out).returncode
    with open(log, encoding="utf-8", errors="replace") as file:
        text = file.read()
    done = re.search(r"number_of_executed_units: (\d+)", text)
    peak = re.search(r"peak_rss_mb: +(\d+)", text)
    last = re.findall(r"cov: (\d+) ft: (\d+) corp: (\d+)", text)
    edges, features, inputs = map(int, last[-1]) if last else (0, 0, 0)
    wrong = None if code == 0 else (re.findall(r"panicked at .*|SUMMARY: .*|ERROR: .*", text) or ["see " + log])[0]
    return {"executions": int(done[1]) if done else 0, "edges": edges, "features": features,
            "inputs": inputs, "memory": int(peak[1]) if peak else 0, "wrong": wrong}


def keep(programs, name):
    """The smallest inputs that reach what all of them together reach, as the corpus."""
    kept = os.path.join(CRATE, "corpus", name)
    merged = os.path.join(OUT, "fuzz-merged", name)
    shutil.rmtree(merged, ignore_errors=True)
    os.makedirs(merged)
    sources = [merged, kept, os.path.join(OUT, "fuzz-corpus", name)]
    command = runner(programs, name, sources, ["-set_cover_merge=1", f"-max_len={KEPT_LENGTH}"])
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    digests = sorted(os.listdir(merged), key=lambda digest: (os.path.getsize(os.path.join(merged, digest)), digest))
    # Where there are too many, some of every size.
    every = max(1, -(-len(digests) // KEPT_INPUTS))
    for digest in digests[::every]:
        shutil.copy(os.path.join(merged, digest), os.path.join(kept, digest[:16]))


def commit():
    def git(*args):
        return subprocess.run(["git", "-C", HOME, *args], capture_output=True, text=True).stdout.strip()
    changed = git("status", "--porcelain", "--", "src", "tests/fuzz/entry", "tests/fuzz/targets")
    return git("rev-parse", "--short", "HEAD") + ("+" if changed else "")


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--runs", type=int, default=10_000_000)
    parser.add_argument("--long", type=int, default=20_000, help="executions with long inputs")
    parser.add_argument("--only", help="only these targets: limits,label")
    parser.add_argument("--at-once", type=int, default=2)
    parser.add_argument("--sanitizer", default="none", choices=["none", "address"])
    parser.add_argument("--timeout", type=int, default=5,
                        help="seconds by the clock for one input; more on a machine that is busy otherwise")
    parser.add_argument("--keep", action="store_true")
    parser.add_argument("--built", help="folder with targets that were built before")
    arguments = parser.parse_args()
    if not arguments.built and not shutil.which("cargo-fuzz"):
        sys.exit("cargo-fuzz is not on the PATH: cargo install cargo-fuzz")
    names = arguments.only.split(",") if arguments.only else list(TARGETS)
    programs = arguments.built or build(arguments.sanitizer)
    logs = os.path.join(OUT, "fuzz-logs")
    os.makedirs(logs, exist_ok=True)
    head = (f"{datetime.date.today()}, commit {commit()}, sanitizer {arguments.sanitizer}\n\n"
            "| target | executions | edges | features | inputs kept | memory | found |\n|---|---|---|---|---|---|---|\n")
    rows, print_lock = [], threading.Lock()

    def one(name):
        short, long, _ = TARGETS[name]
        rows_of = []
        for what, count, longest in (("", arguments.runs, short), (f", inputs to {long >> 10} KiB", arguments.long, long)):
            if count == 0:
                continue
            done = run(programs, name, count, longest, arguments.timeout, os.path.join(logs, f"{name}{longest}.log"))
            row = (f"| {name}{what} | {done['executions']:,} | {done['edges']:,} | {done['features']:,} | "
                   f"{done['inputs']:,} | {done['memory']} MB | {done['wrong'] or 'nothing'} |")
            rows_of.append((row, done["wrong"]))
            with print_lock:
                print(row, flush=True)
            if done["wrong"]:
                break
        return rows_of

    print(head, end="", flush=True)
    with concurrent.futures.ThreadPoolExecutor(arguments.at_once) as pool:
        for rows_of in pool.map(one, names):
            rows.extend(rows_of)
    if arguments.keep:
        for name in names:
            keep(programs, name)
    with open(os.path.join(OUT, "fuzz-report.md"), "w", encoding="utf-8") as file:
        file.write(head + "\n".join(row for row, _ in rows) + "\n")
    return 1 if any(wrong for _, wrong in rows) else 0


if __name__ == "__main__":
    sys.exit(main())
