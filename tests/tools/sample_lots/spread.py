"""Part-to-part spread: normal quantiles in an order drawn by a fixed seed.

Quantiles instead of draws: a lot then has the mean, the standard deviation and the extremes that
the scenario wants, and no outlier that nobody planned.
"""

from dataclasses import dataclass

import numpy as np
from scipy.stats import norm


@dataclass
class Spread:
    """One part against its family: capacitance deviation, scales of R, L and losses, a wanted ESR and a leak in ohm."""

    c: float = 0.0
    r: float = 1.0
    l: float = 1.0
    d: float = 1.0
    esr: float | None = None
    leak: float | None = None


def quantiles(rng, n, mean, deviation):
    """n values of a normal distribution at its plotting positions, shuffled."""
    return mean + deviation * rng.permutation(norm.ppf((np.arange(n) + 0.5) / n))


def lot(rng, n, c, esr=None):
    """n parts; `c` and `esr` are (mean, standard deviation)."""
    parts = [
        Spread(*values)
        for values in zip(
            quantiles(rng, n, *c), quantiles(rng, n, 1.0, 0.05), quantiles(rng, n, 1.0, 0.03),
            quantiles(rng, n, 1.0, 0.03), strict=True,
        )
    ]
    if esr is not None:
        for part, ohm in zip(parts, quantiles(rng, n, *esr), strict=True):
            part.esr = float(ohm)
    return parts
