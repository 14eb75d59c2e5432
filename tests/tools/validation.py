#!/usr/bin/env python3
"""Runs the program against what others published or computed, and writes docs/validation.md.

    .venv/bin/python tests/tools/validation.py            writes the page anew
    .venv/bin/python tests/tools/validation.py --check    compares it with the page as it stands

Status 1 where a check fails or, with --check, where the page says something else.
"""

import argparse
import sys
import tempfile
from pathlib import Path

from outside import elsewhere, plans, sample_lots, statistics, touchstone, variables
from outside.program import ROOT

PAGE = ROOT / "docs" / "validation.md"
TITLE = """# Validation

Every check of Reelgate against the outside: what, against which source, what is allowed and why, and what came out. This page is made by

    .venv/bin/python tests/tools/validation.py

which runs the program as a user does; `tests/run` installs what that needs and fails where a check fails or this page is not what the command
makes. Reference data with their sources are in `tests/reference/`. Where a reference comes from memory of a standard, its file says so. How well noisy sweeps are
read has a page of its own, [measured-accuracy.md](measured-accuracy.md); the formulas are in [methods.md](methods.md)."""


def make(program):
    """The page, and whether every check passed."""
    with tempfile.TemporaryDirectory() as folder:
        place = Path(folder)
        found = sample_lots.records(program, place / "samples")
        truth, true = sample_lots.truth(found)
        sections = [
            truth, sample_lots.verdicts(found), touchstone.section(program, place / "touchstone"),
            statistics.section(program, place / "statistics", found), plans.section(program, place / "plans", found),
            variables.section(program, place / "variables"), elsewhere.section(),
        ]
    passed = true and all(check.passed for section in sections for check in section.checks)
    return "\n\n".join([TITLE, *(section.markdown() for section in sections)]) + "\n", passed


def main():
    arguments = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    arguments.add_argument("--check", action="store_true", help="only compare with the page as it stands")
    arguments.add_argument("--program", default=ROOT / "target" / "debug" / "reelgate", help="the program to run")
    options = arguments.parse_args()
    page, passed = make(options.program)
    if options.check:
        same = PAGE.read_text(encoding="utf-8") == page
        if not same:
            print(f"{PAGE} is not what this command makes: run it without --check", file=sys.stderr)
    else:
        PAGE.write_text(page, encoding="utf-8")
        same = True
    if not passed:
        print("a check failed: look for `fails` in the page, or for a worst error above what is allowed", file=sys.stderr)
    return 0 if same and passed else 1


if __name__ == "__main__":
    sys.exit(main())
