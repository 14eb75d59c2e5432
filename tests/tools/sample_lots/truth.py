"""True values of a network's characteristics, by their definitions, to double precision."""

import math

import numpy as np
from scipy.optimize import brentq, minimize_scalar

from .circuits import impedance


def frequency_text(hertz):
    """`1kHz`, `2.5MHz`, `120Hz`: as keys have it."""
    for scale, prefix in ((1e6, "M"), (1e3, "k"), (1.0, "")):
        if hertz >= scale:
            return f"{hertz / scale:.6g}{prefix}Hz"
    return f"{hertz:.6g}Hz"


def key(characteristic, *frequencies):
    """`capacitance@1kHz`, `impedance@700kHz..4MHz`, `srf`."""
    if not frequencies:
        return characteristic
    return characteristic + "@" + "..".join(frequency_text(f) for f in frequencies)


def capacitance(network, hertz, equivalent="series"):
    """Series or parallel equivalent capacitance in farad (IEC 60384-1)."""
    z = complex(impedance(network, hertz))
    if equivalent == "parallel":
        return (1 / z).imag / (2 * math.pi * hertz)
    return -1 / (2 * math.pi * hertz * z.imag)


def self_resonance(network, low, high):
    """First frequency in Hz where the reactance goes from capacitive to inductive; None if not in the range."""
    grid = np.geomspace(low, high, 4001)
    x = impedance(network, grid).imag
    rising = np.flatnonzero((x[:-1] < 0) & (x[1:] >= 0))
    if rising.size == 0:
        return None
    i = rising[0]
    root = brentq(lambda u: impedance(network, math.exp(u)).imag, math.log(grid[i]), math.log(grid[i + 1]), xtol=1e-14)
    return math.exp(root)


def least_resistance(network, low, high):
    """Smallest Re Z in ohm between two frequencies in Hz."""
    grid = np.geomspace(low, high, 4001)
    i = int(np.argmin(impedance(network, grid).real))
    a, b = grid[max(i - 1, 0)], grid[min(i + 1, grid.size - 1)]
    found = minimize_scalar(
        lambda u: float(impedance(network, math.exp(u)).real),
        bounds=(math.log(a), math.log(b)), method="bounded", options={"xatol": 1e-10},
    )
    return float(found.fun)


def greatest_impedance(network, low, high):
    """Largest |Z| in ohm between two frequencies in Hz: at an end unless the part is anti-resonant."""
    return float(np.abs(impedance(network, np.geomspace(low, high, 4001))).max())


def value(network, characteristic, frequencies, sweep, equivalent):
    """The true value in SI, or None where it is not defined within the sweep (low, high in Hz)."""
    if characteristic == "capacitance":
        return capacitance(network, frequencies[0], equivalent)
    if characteristic == "esr_minimum":
        return least_resistance(network, *sweep)
    if characteristic == "srf":
        return self_resonance(network, *sweep)
    if characteristic == "impedance" and len(frequencies) == 2:
        return greatest_impedance(network, *frequencies)
    if characteristic == "esl":
        return None  # depends on the band: skin effect lowers it with frequency
    z = complex(impedance(network, frequencies[0]))
    if characteristic == "impedance":
        return abs(z)
    if characteristic == "esr":
        return z.real
    if characteristic == "dissipation_factor":
        return z.real / abs(z.imag)
    raise ValueError(f"no such characteristic: {characteristic}")


def ageing_factor(per_decade, hours, referee_hours):
    """C at the referee time over C at `hours` after last heat (IEC 60384-22, annex on ageing)."""
    return (1 - per_decade * math.log10(referee_hours)) / (1 - per_decade * math.log10(hours))


def scale_for(build, wanted, target, low=0.2, high=5.0):
    """The scale at which `wanted(build(scale))` equals `target`."""
    return brentq(lambda scale: wanted(build(scale)) - target, low, high, xtol=1e-13)
