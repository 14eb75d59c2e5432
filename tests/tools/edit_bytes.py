#!/usr/bin/env python3
"""Changes one byte at a time in everything that a site keeps, and asks whether it is found.

    edit_bytes.py [--edits N] [--seed S] [--program PATH]

A site judges a lot and a person disposes of it. Then, each time from that state, one byte at a random place is
set to another value: in an archived object of each role (as it is kept, compressed), in each column of
a ledger row, in the database file, in the PDF and in the JSON record. `records verify` must say that
something is wrong wherever what is kept is not what it was; where nothing that anybody reads has
changed (a field of a gzip header, a free page of the database), it may say so or not. Between them it must prove
the site as it was. Prints a line for each kind; answers 1 where a change was missed or a false alarm given.
"""

import argparse
import collections
import concurrent.futures
import contextlib
import gzip
import json
import os
import random
import shutil
import sqlite3
import subprocess
import sys
import tempfile
import zlib

from kill_judge import LOT, make_site

HOME = os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
COLUMNS = {"body": "TEXT", "peaks": "BLOB", "checkpoint": "TEXT"}


class Site:
    def __init__(self, program, number):
        memory = "/dev/shm" if os.path.isdir("/dev/shm") else None
        self.folder = tempfile.mkdtemp(prefix=f"reelgate-edit-{number}-", dir=memory)
        self.program = program
        make_site(self.folder)
        assert self.run("judge", LOT).returncode == 3
        said = self.run("records", "dispose", "26K-0001", "--decision", "sort", "--reason", "one part", "--by", "QE-03")
        assert said.returncode == 0, said.stderr
        self.database = self.path("records", "ledger.sqlite")
        self.kinds = self.files()

    def path(self, *parts):
        return os.path.join(self.folder, *parts)

    def run(self, *args):
        environment = {**os.environ, "RAYON_NUM_THREADS": "1", "REELGATE_NOW": "2026-11-02T08:00:00+01:00"}
        return subprocess.run([self.program, *args], cwd=self.folder, env=environment, capture_output=True, text=True)

    def proven(self):
        """True, False, or None where it could not look, which is an alarm too."""
        status = self.run("records", "verify", "--format", "json").returncode
        return {0: True, 1: False}.get(status)

    def files(self):
        """What there is of each kind: paths, or columns of rows."""
        kinds = collections.defaultdict(list)
        with contextlib.closing(sqlite3.connect(f"file:{self.database}?mode=ro", uri=True)) as database:
            rows = [json.loads(body) for (body,) in database.execute("SELECT body FROM entry ORDER BY position")]
        for index, entry in enumerate(rows):
            for thing in entry["objects"]:
                path = self.path("records", "raw", thing["sha256"][:2], thing["sha256"])
                kinds["archived " + thing["role"]].append(path)
            for column in COLUMNS:
                kinds["row: " + column].append((column, index))
        kinds["database file"].append(self.database)
        certificates = self.path("records", "certificates")
        for name in sorted(os.listdir(certificates)):
            kinds[name.rsplit(".", 1)[1].upper() + " beside the ledger"].append(os.path.join(certificates, name))
        return dict(sorted(kinds.items()))


def other_byte(data, dice):
    place = dice.randrange(len(data))
    value = dice.choice([v for v in range(256) if v != data[place]])
    return data[:place] + bytes([value]) + data[place + 1:], place


def content(path):
    """What a reader gets of a kept file."""
    with open(path, "rb") as file:
        data = file.read()
    if os.sep + "raw" + os.sep not in path:
        return data
    try:
        return gzip.decompress(data)
    except (OSError, EOFError, zlib.error, ValueError):
        return None


def rows(path):
    """Everything that a query sees, and the schema; None where it cannot be read."""
    try:
        with contextlib.closing(sqlite3.connect(f"file:{path}?mode=ro", uri=True)) as database:
            tables = ["sqlite_schema", "entry", "object"]
            return [sorted(map(repr, database.execute(f"SELECT * FROM {table}"))) for table in tables]
    except (sqlite3.Error, UnicodeDecodeError):
        return None


def edit_file(site, path, dice):
    """One edit; whether content changed, whether it was found, and where it was."""
    with open(path, "rb") as file:
        good = file.read()
    seen = rows if path == site.database else content
    before = seen(path)
    bad, place = other_byte(good, dice)
    with open(path, "wb") as file:
        file.write(bad)
    changed = seen(path) != before
    found = site.proven() is not True
    with open(path, "wb") as file:
        file.write(good)
    return changed, found, f"{os.path.relpath(path, site.folder)} byte {place}"


def edit_row(site, column, index, dice):
    """One byte of a column, as somebody with another tool would change it."""
    with open(site.database, "rb") as file:
        good = file.read()
    with contextlib.closing(sqlite3.connect(site.database, isolation_level=None)) as database:
        triggers = database.execute("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'").fetchall()
        database.execute("PRAGMA foreign_keys=OFF")
        database.execute("BEGIN")
        for name, _ in triggers:
            database.execute(f"DROP TRIGGER {name}")
        (value,) = database.execute(
            f"SELECT CAST({column} AS BLOB) FROM entry WHERE position = ?", (index,)).fetchone()
        bad, place = other_byte(value, dice)
        try:
            database.execute(f"UPDATE entry SET {column} = CAST(? AS {COLUMNS[column]}) WHERE position = ?", (bad, index))
            for _, sql in triggers:
                database.execute(sql)
            database.execute("COMMIT")
            refused = False
        except sqlite3.Error:
            # A body that is no JSON is refused by the table itself.
            database.execute("ROLLBACK")
            refused = True
    found = refused or site.proven() is not True
    with open(site.database, "wb") as file:
        file.write(good)
    return True, found, f"{column} of row {index}, byte {place}"


def work(program, number, edits, seed):
    """A share of the edits on a site of its own: counts for each kind, and what was missed."""
    dice = random.Random(f"{seed} {number}")
    site = Site(program, number)
    counts, missed = collections.Counter(), []
    try:
        assert site.proven() is True
        kinds = list(site.kinds)
        for k in range(edits):
            kind = kinds[k % len(kinds)]
            thing = dice.choice(site.kinds[kind])
            changed, found, place = edit_row(site, *thing, dice) if isinstance(thing, tuple) else edit_file(site, thing, dice)
            counts[kind, "edits"] += 1
            counts[kind, "changed"] += changed
            counts[kind, "found"] += changed and found
            counts[kind, "harmless, named"] += found and not changed
            if changed and not found:
                missed.append(f"{kind}: {place}")
            if k % 50 == 49:
                counts["clean", "edits"] += 1
                if site.proven() is not True:
                    missed.append("a false alarm on the site as it was")
    finally:
        shutil.rmtree(site.folder, ignore_errors=True)
    return counts, missed


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--edits", type=int, default=10_000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--at-once", type=int, default=2)
    parser.add_argument("--program", default=os.path.join(HOME, "target", "release", "reelgate"))
    arguments = parser.parse_args()
    with tempfile.TemporaryDirectory(prefix="reelgate-edit-") as folder:
        program = shutil.copy(arguments.program, os.path.join(folder, "reelgate"))
        with concurrent.futures.ThreadPoolExecutor(arguments.at_once) as pool:
            shares = list(pool.map(lambda number: work(program, number, arguments.edits // arguments.at_once, arguments.seed),
                                   range(arguments.at_once)))
    counts, missed = collections.Counter(), []
    for share, lost in shares:
        counts += share
        missed += lost
    total = collections.Counter()
    print(f"{'':26} {'edits':>6} {'changed':>8} {'found':>6} {'harmless':>9}")
    for kind in sorted({kind for kind, _ in counts} - {"clean"}):
        edits, changed, found = (counts[kind, what] for what in ("edits", "changed", "found"))
        print(f"{kind:26} {edits:6} {changed:8} {found:6} {edits - changed:9}")
        total.update(edits=edits, changed=changed, found=found)
    for line in missed:
        print("MISSED", line)
    print(f"{total['edits']} edits, {total['changed']} changed something, {total['found']} of them found; "
          f"{counts['clean', 'edits']} times looked at unchanged; {len(missed)} wrong")
    return 1 if missed or not total["edits"] else 0


if __name__ == "__main__":
    sys.exit(main())
