"""Equivalent circuits fitted by scipy.optimize.least_squares, apart from the program.

Reads JSON on standard input: a list of cases, each with `frequency` (Hz), `re`, `im` (ohm),
`elements` (names), `start` (values). Writes JSON: for each case `values`, `covariance`
(s^2 (J^T J)^-1, s^2 = sum r^2/(2n-p)) and `square_sum`, the elements in the order given.

Residuals are (Z(f) - Z)/|Z|, real and imaginary part apart. Elements that are not named are absent:
  r_0, l            in series with all
  r_skin_1mhz       Rs sqrt(f/1 MHz) (1 + j)
  r_eddy, l_eddy    in parallel with one another
  c_1, dispersion   (j f/1 kHz)^-(1-a) / (2 pi 1 kHz C1)
  c_1, r_1, c_2, ...  a ladder: each C in parallel with its R and all that follows
"""
import json
import sys

import numpy as np
from scipy.optimize import least_squares


def impedance(f, element, ladder):
    s = 2j * np.pi * f
    z = element.get("r_0", 0) + s * element.get("l", 0)
    z = z + element.get("r_skin_1mhz", 0) * np.sqrt(f / 1e6) * (1 + 1j)
    if "r_eddy" in element:
        z = z + 1 / (1 / element["r_eddy"] + 1 / (s * element["l_eddy"]))
    if not ladder:
        exponent = -(1 - element.get("dispersion", 0))
        return z + (1j * f / 1e3) ** exponent / (2 * np.pi * 1e3 * element["c_1"])
    stages = sum(name.startswith("c_") for name in element)
    rest = 1 / (s * element["c_%d" % stages])
    for k in range(stages - 1, 0, -1):
        rest = 1 / (s * element["c_%d" % k] + 1 / (element["r_%d" % k] + rest))
    return z + rest


def fit(case):
    f = np.array(case["frequency"])
    z = np.array(case["re"]) + 1j * np.array(case["im"])
    names, start = case["elements"], np.array(case["start"])
    ladder = "c_2" in names

    def residuals(x):
        r = (impedance(f, dict(zip(names, x * start)), ladder) - z) / abs(z)
        return np.concatenate([r.real, r.imag])

    found = least_squares(
        residuals, np.ones(len(start)), jac="3-point", method="trf", x_scale="jac",
        xtol=1e-15, ftol=1e-15, gtol=1e-15, max_nfev=2000,
    )
    square_sum = 2 * found.cost
    variance = square_sum / (2 * len(f) - len(start))
    covariance = variance * np.linalg.inv(found.jac.T @ found.jac) * np.outer(start, start)
    return {
        "values": list(found.x * start),
        "covariance": covariance.tolist(),
        "square_sum": square_sum,
    }


json.dump([fit(case) for case in json.load(sys.stdin)], sys.stdout)
