"""Dumps what scikit-rf reads from the Touchstone files that its own package ships.

One JSON object on standard output: for every file its path, number of ports, frequencies in
hertz, and S and Z (ohm) as [re, im] in row-major order. Z is computed by scikit-rf from S and the
resistance of the option line, because scikit-rf takes complex port impedances from comments of
some files, which are no part of the file format.
"""
import json
import math
import pathlib
import re
import sys
import warnings

import numpy
import skrf

warnings.filterwarnings("ignore")


def pairs(array):
    flat = numpy.asarray(array).reshape(-1)
    if not numpy.all(numpy.isfinite(flat)):
        return None
    return [[float(v.real), float(v.imag)] for v in flat]


def main():
    package = pathlib.Path(skrf.__file__).parent
    paths = sorted(p for p in package.rglob("*") if re.fullmatch(r"\.(s\d+p|ts)", p.suffix.lower()))
    files = []
    for path in paths:
        network = skrf.Network(str(path))
        text = path.read_text(encoding="latin-1")
        option = next(line for line in text.splitlines() if line.strip().startswith("#"))
        resistance = re.search(r"\bR\s+([0-9.eE+-]+)", option.split("!")[0], re.IGNORECASE)
        reference = float(resistance.group(1)) if resistance else 50.0
        assert math.isfinite(reference)
        with numpy.errstate(all="ignore"):
            try:
                z = pairs(skrf.network.s2z(network.s, z0=reference))
            except numpy.linalg.LinAlgError:
                z = None
        files.append(
            {
                "path": str(path),
                "ports": int(network.nports),
                "frequency": [float(f) for f in network.f],
                "s": pairs(network.s),
                "z": z,
            }
        )
    json.dump({"version": skrf.__version__, "files": files}, sys.stdout)


if __name__ == "__main__":
    main()
