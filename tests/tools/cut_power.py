#!/usr/bin/env python3
"""Cuts the power under a ledger that is being written, and looks what is still there.

    cut_power.py [--cycles N] [--controls N]

A file system of its own (ext4 in a file, loop-mounted) is shut down under load, so that everything
not yet synced is lost; it is mounted again and the ledger verified. Before the cut the writer is
frozen and what it has acknowledged is read: all of that must be there. The controls are writers
that are known not to keep their promises (SQLite with synchronous=OFF, and write-ahead log with
synchronous=NORMAL): they must lose acknowledged rows in at least nine cycles of ten, or this run
proves nothing. Answers 1 where an acknowledged entry is gone or a control is not.

Needs Linux, root, mkfs.ext4 and cargo; one to two seconds for each cycle.
"""

import argparse
import contextlib
import fcntl
import os
import random
import re
import shutil
import signal
import sqlite3
import struct
import subprocess
import sys
import tempfile
import time

from inject_faults import binary

# _IOR('X', 125, __u32), and the flag that keeps the journal from being written on the way down.
EXT4_IOC_SHUTDOWN, NO_LOG_FLUSH = 0x8004587D, 2

CONTROLS = {
    "synchronous=OFF": ("DELETE", "OFF"),
    "write-ahead log, synchronous=NORMAL": ("WAL", "NORMAL"),
}


def control_writer(path, journal, synchronous):
    """A plain SQLite writer: a row, a line, a row, a line."""
    database = sqlite3.connect(path, isolation_level=None)
    database.execute(f"PRAGMA journal_mode={journal}")
    database.execute(f"PRAGMA synchronous={synchronous}")
    # A checkpoint syncs; on a slow medium a writer would mostly be found in one.
    database.execute("PRAGMA wal_autocheckpoint=0")
    database.execute("CREATE TABLE row (n INTEGER PRIMARY KEY, x BLOB)")
    for n in range(10**9):
        database.execute("INSERT INTO row VALUES (?, randomblob(500))", (n,))
        print(f"recorded row {n}", flush=True)


def control_count(path):
    """Rows that are there; none where the file is no database any more."""
    try:
        with contextlib.closing(sqlite3.connect(path)) as database:
            return database.execute("SELECT count(*) FROM row").fetchone()[0]
    except sqlite3.Error:
        return 0


class Disk:
    def __init__(self):
        self.folder = tempfile.mkdtemp(prefix="reelgate-power-")
        self.image = os.path.join(self.folder, "image")
        self.mount_point = os.path.join(self.folder, "mounted")
        os.mkdir(self.mount_point)

    def make(self):
        with open(self.image, "wb") as file:
            file.truncate(96 << 20)
        subprocess.run(["mkfs.ext4", "-q", "-F", self.image], check=True)
        self.mount()

    def mount(self):
        subprocess.run(["mount", "-o", "loop", self.image, self.mount_point], check=True)

    def leave(self):
        """Takes everything away, whatever has happened."""
        if os.path.ismount(self.mount_point):
            subprocess.run(["umount", "-l", self.mount_point], check=False)
        shutil.rmtree(self.folder, ignore_errors=True)

    def unmount(self):
        subprocess.run(["umount", self.mount_point], check=True)

    def cut(self):
        folder = os.open(self.mount_point, os.O_RDONLY)
        fcntl.ioctl(folder, EXT4_IOC_SHUTDOWN, struct.pack("I", NO_LOG_FLUSH))
        os.close(folder)


def said_so_far(path):
    with open(path, "rb") as said:
        return said.read().count(b"recorded")


def acknowledged_at_cut(disk, command, environment, at_least):
    """Runs the writer, freezes it, reads its lines, cuts the power; the lines."""
    out_path = os.path.join(disk.folder, "said")
    with open(out_path, "wb") as out:
        writer = subprocess.Popen(command, env={**os.environ, **environment}, stdout=out,
                                  stderr=subprocess.DEVNULL, start_new_session=True)
        # Until it has recorded something, and then some time that differs from cycle to cycle.
        deadline = time.monotonic() + 60
        while said_so_far(out_path) < at_least and time.monotonic() < deadline:
            time.sleep(0.01)
        time.sleep(random.uniform(0.02, 0.6))
        os.killpg(writer.pid, signal.SIGSTOP)
        time.sleep(0.03)
        with open(out_path, encoding="utf-8") as said:
            lines = re.findall(r"recorded (\S+) (\d+)\n", said.read())
        disk.cut()
        os.killpg(writer.pid, signal.SIGKILL)
        writer.wait()
    disk.unmount()
    disk.mount()
    return lines


def ledger_cycle(disk, program):
    """One cut under the ledger: acknowledged entries, those that are gone, what else is wrong."""
    records = os.path.join(disk.mount_point, "records")
    writer = [program, "--exact", "many::writer", "--nocapture", "--test-threads=1"]
    lines = acknowledged_at_cut(disk, writer, {"REELGATE_TEST_WRITER": f"{records}|cut|1000000"}, 1)
    checker = [program, "--exact", "many::checker", "--nocapture", "--test-threads=1"]
    done = subprocess.run(checker, env={**os.environ, "REELGATE_TEST_CHECKER": records},
                          capture_output=True, text=True)
    match = re.search(r"checked (\d+) (\w+)", done.stdout)
    if not match:
        return len(lines), len(lines), done.stdout + done.stderr
    wrong = None if match[2] == "true" else "verification finds something wrong"
    return len(lines), max(0, len(lines) - int(match[1])), wrong


def control_cycle(disk, journal, synchronous):
    path = os.path.join(disk.mount_point, "control.sqlite")
    writer = [sys.executable, __file__, "--writer", path, journal, synchronous]
    # The first row of a write-ahead log is synced with the head of the log.
    lines = acknowledged_at_cut(disk, writer, {}, 50)
    return len(lines), max(0, len(lines) - control_count(path))


def run(disk, cycles, controls):
    program, failed = binary(), False
    for name, (journal, synchronous) in CONTROLS.items():
        lossy = 0
        for _ in range(controls):
            disk.make()
            lossy += control_cycle(disk, journal, synchronous)[1] > 0
            disk.unmount()
        failed |= lossy < 0.9 * controls
        print(f"control {name}: acknowledged rows lost in {lossy} of {controls} cuts", flush=True)
    total, gone, odd = 0, 0, 0
    for cycle in range(cycles):
        disk.make()
        acknowledged, lost, wrong = ledger_cycle(disk, program)
        disk.unmount()
        total, gone, odd = total + acknowledged, gone + lost, odd + bool(wrong)
        if lost or wrong:
            print(f"WRONG cycle {cycle}: {lost} of {acknowledged} acknowledged entries gone; {wrong}", flush=True)
    failed |= bool(gone or odd) or total == 0
    print(f"ledger: {cycles} cuts, {total} entries acknowledged, {gone} gone, {odd} cycles otherwise wrong")
    return 1 if failed else 0


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--cycles", type=int, default=300)
    parser.add_argument("--controls", type=int, default=20)
    parser.add_argument("--writer", nargs=3, help=argparse.SUPPRESS)
    arguments = parser.parse_args()
    if arguments.writer:
        return control_writer(*arguments.writer)
    disk = Disk()
    try:
        return run(disk, arguments.cycles, arguments.controls)
    finally:
        disk.leave()


if __name__ == "__main__":
    sys.exit(main())
