"""Impedance by each method and readings by plain local fits."""

import math

import numpy as np


def reference(station):
    """Resistance in ohm and inductance in henry of the series reference."""
    from .files import quantity

    stated = station.get("reference", {})
    return quantity(stated.get("resistance", "1 Ω")), quantity(stated.get("inductance", "0 nH"))


def impedance(raw, station, standards=None):
    """Frequency in Hz, Z in ohm, voltage across the part or None."""
    f = raw["frequency"]
    w = 2 * math.pi * f
    method = station["method"]
    if method == "direct":
        return f, direct(raw, w), None
    if method == "series_reference":
        ohm, henry = reference(station)
        zref = ohm + 1j * w * henry
        if "ratio_db" in raw:
            h = 10 ** (raw["ratio_db"] / 20) * np.exp(1j * np.radians(raw["phase"]))
            z = zref * h / (1 - h)
            return f, z if standards is None else compensated(z, w, standards), None
        a, b = raw["a_re"] + 1j * raw["a_im"], raw["b_re"] + 1j * raw["b_im"]
        z = zref * b / (a - b)
        return f, z if standards is None else compensated(z, w, standards), abs(b)
    s, z0 = raw["s"], raw["z0"]
    if method == "reflection":
        return f, z0 * (1 + s[:, 0]) / (1 - s[:, 0]), None
    s11, s21, s12, s22 = s.T
    if method == "shunt_through":
        return f, 2 * z0 * s21 / ((1 - s11) * (1 - s22) - s12 * s21), None
    return f, z0 * ((1 + s11) * (1 + s22) - s12 * s21) / (2 * s21), None


def direct(raw, w):
    if "magnitude" in raw:
        return raw["magnitude"] * np.exp(1j * np.radians(raw["phase"]))
    if "resistance" in raw:
        return raw["resistance"] + 1j * raw["reactance"]
    x = -1 / (w * raw["capacitance"])
    return (raw["esr"] if "esr" in raw else raw["dissipation_factor"] * -x) + 1j * x


def compensated(z, w, standards):
    """Open/short/load with an ideal open and a defined short and load: exact for any linear two-port.

    With an open alone, its admittance is taken off.
    """
    if len(standards) == 1:
        return 1 / (1 / z - 1 / standards[0][0])
    (zo, _), (zs, short), (zl, load) = standards
    s, l = short[0] + 1j * w * short[1], load[0] + 1j * w * load[1]
    return s + (l - s) * (z - zs) * (zl - zo) / ((z - zo) * (zl - zs))


def fit(f, y, at, half=0.2, weight=None):
    """Quadratic in ln f through the points within `half` decade of `at`; value there."""
    near = np.abs(np.log10(f / at)) <= half + 1e-9
    if near.sum() < 6:
        near = np.argsort(np.abs(np.log(f / at)))[:6]
    t = np.log(f[near] / at)
    w = None if weight is None else weight[near]
    return float(np.polyfit(t, y[near], 2, w=w)[-1])


def series_values(f, z, at):
    """R and X at a frequency: both smooth when multiplied by f."""
    return fit(f, z.real * f, at) / at, fit(f, z.imag * f, at) / at


def read(f, z, name, place, equivalent):
    """Value of a characteristic and the reactance that its phase error works on; None where not in the sweep."""
    if name in ("capacitance", "dissipation_factor", "esr"):
        r, x = series_values(f, z, place[0])
        if name == "esr":
            return r, x
        if name == "dissipation_factor":
            return r / -x, 1.0
        c = -1 / (2 * math.pi * place[0] * x)
        d = r / -x
        return (c / (1 + d * d) if equivalent == "parallel" else c), c * d
    if name == "impedance" and len(place) == 1:
        return math.exp(fit(f, np.log(abs(z)), place[0], 0.1)), 0.0
    if name == "impedance":
        ends = [math.exp(fit(f, np.log(abs(z)), p, 0.1)) for p in place]
        inside = abs(z)[(f > place[0]) & (f < place[1])]
        return max([*ends, *inside]), 0.0
    if name == "srf":
        return self_resonance(f, z), 0.0
    if name == "esl":
        return inductance(f, z), 0.0
    return least_resistance(f, z)


def self_resonance(f, z):
    rising = np.flatnonzero((z.imag[:-1] < 0) & (z.imag[1:] >= 0))
    if rising.size == 0:
        return None
    i = rising[0]
    near = np.abs(np.log10(f / f[i])) < 0.15
    t = np.log(f[near] / f[i])
    slope = np.polyfit(t, z.imag[near], 3)
    roots = np.roots(slope)
    real = roots[np.abs(roots.imag) < 1e-9].real
    return float(f[i] * math.exp(real[np.argmin(np.abs(real))]))


def least_resistance(f, z):
    """Quadratic in ln R about the smallest R among points where R is not hidden by X."""
    seen = np.flatnonzero((abs(z) < 10 * np.abs(z.real)) & (z.real > 0))
    i = seen[np.argmin(z.real[seen])]
    near = np.abs(np.log10(f / f[i])) < 0.25
    near &= z.real > 0
    a, b, c = np.polyfit(np.log(f[near] / f[i]), np.log(z.real[near]), 2, w=z.real[near] / abs(z[near]))
    t = float(np.clip(-b / (2 * a), -0.5, 0.5)) if a > 0 else 0.0
    return math.exp(a * t * t + b * t + c), float(np.interp(f[i] * math.exp(t), f, z.imag))


def inductance(f, z):
    """X/ω above resonance with the capacitive share removed: L − 1/(ω²C), linear in 1/f²."""
    srf = self_resonance(f, z)
    band = (f > 3 * srf) & (f < 10 * srf)
    y = z.imag[band] / (2 * math.pi * f[band])
    return float(np.polyfit(1 / f[band] ** 2, y, 1)[-1])


def contact_fault(f, z, nominal, at):
    """What a person sees on the plot: nothing in the jig, a short, a jumping contact; None for a capacitor."""
    wanted = 1 / (2 * math.pi * at * nominal)
    i = int(np.argmin(np.abs(np.log(f / at))))
    typical = float(np.median(abs(z[max(0, i - 4) : i + 5])))
    if typical > 50 * wanted:
        return "open"
    if typical < wanted / 50:
        return "short"
    ln = np.log(abs(z))
    jumps = np.abs(ln[1:-1] - 0.5 * (ln[:-2] + ln[2:]))
    if (jumps > 0.1).sum() > 10:
        return "intermittent_contact"
    return None
