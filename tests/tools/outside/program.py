"""The program under test, run as a user runs it, on sites and lots made for one check."""

import json
import math
import shutil
import subprocess
from pathlib import Path

import yaml

ROOT = Path(__file__).resolve().parents[3]
REFERENCE = ROOT / "tests" / "reference"


class Site:
    """A site in a folder of its own."""

    def __init__(self, program, folder):
        self.program, self.folder = Path(program).resolve(), Path(folder)
        for kind in ("parts", "stations"):
            (self.folder / "limits" / kind).mkdir(parents=True, exist_ok=True)

    def use_sample_limits(self):
        shutil.copytree(ROOT / "limits", self.folder / "limits", dirs_exist_ok=True)

    def limits(self, part, **content):
        self._write(f"limits/parts/{part}.yaml", {"part": part, "revision": 1, **content})

    def station(self, name, **content):
        self._write(f"limits/stations/{name}.yaml", {"station": name, **content})

    def lot(self, name, part, quantity, table):
        """A lot folder whose sweeps are one table; its path."""
        self._write(f"{name}/lot.yaml", {
            "lot": name, "part": part, "quantity": quantity, "station": "S",
            "measured": "2026-10-05T09:00:00+02:00", "sweeps": "table.csv",
        })
        (self.folder / name / "table.csv").write_text(table, encoding="utf-8")
        return self.folder / name

    def _write(self, name, content):
        path = self.folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(yaml.safe_dump(content, allow_unicode=True, sort_keys=False), encoding="utf-8")

    def judge(self, lots):
        """The records of lot folders, in their order."""
        run = subprocess.run(
            [self.program, "--site", self.folder, "--format", "json", "judge", "--now", "2026-11-02T08:00:00+01:00", *lots],
            capture_output=True, check=False,
        )
        records = json.loads(run.stdout) if run.stdout else []
        records = records if isinstance(records, list) else [records]
        if len(records) != len(lots):
            raise SystemExit(f"{len(records)} records of {len(lots)} lots:\n{run.stderr.decode()}")
        return records


def rows(name):
    """A reference table as a list of dictionaries; comment lines begin with #."""
    lines = [line for line in (REFERENCE / name).read_text(encoding="utf-8").splitlines() if not line.startswith("#")]
    head = lines[0].split(",")
    return [dict(zip(head, line.split(","), strict=False)) for line in lines[1:]]


def table(resistances):
    """Sweeps of resistors in series with one capacitance: a part for each resistance in ohm."""
    capacitance = 1 / (2 * math.pi * 1e3 * 20 * float(max(resistances)))  # capacitive at the low end
    frequencies = [1e3 * 10 ** (i / 5) for i in range(16)]
    lines = ["part,Frequency (Hz),R (Ohm),X (Ohm)"]
    for number, resistance in enumerate(resistances, 1):
        for f in frequencies:
            lines.append(f"{number},{f!r},{float(resistance)!r},{-1 / (2 * math.pi * f * capacitance)!r}")
    return "\n".join(lines) + "\n"


STATION = {
    "method": "direct",
    "layout": {"columns": {"frequency": "Frequency (Hz)", "resistance": "R (Ohm)", "reactance": "X (Ohm)"}},
}
