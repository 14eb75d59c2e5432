"""Capacitors as finite networks of ideal R, L and C, so that every true value is exact.

A network is a nested tuple: ("R" | "L" | "C", value in SI) or ("s" | "p", [networks]) for children in
series or parallel. Element values are rounded to six significant digits: what a netlist prints is
what is computed here.

Dispersion is a row of Debye branches (series R-C) one decade apart: capacitance then falls, and the
dissipation factor stays nearly level, with the logarithm of frequency. Skin effect is R and L in
parallel. An electrolytic is a ladder: the pores of the etched foil charge one after another.
"""

import math

import numpy as np


def _six(value):
    return float(f"{value:.6g}")


def resistor(ohm):
    return ("R", _six(ohm))


def inductor(henry):
    return ("L", _six(henry))


def capacitor(farad):
    return ("C", _six(farad))


def series(*children):
    return ("s", list(children))


def parallel(*children):
    return ("p", list(children))


def impedance(network, frequency):
    """Complex impedance in ohm at frequencies in hertz (scalar or array)."""
    jw = 2j * math.pi * np.asarray(frequency, float)
    kind, content = network
    if kind == "R":
        return content + 0 * jw
    if kind == "L":
        return jw * content
    if kind == "C":
        return 1 / (jw * content)
    parts = [impedance(child, frequency) for child in content]
    return sum(parts) if kind == "s" else 1 / sum(1 / z for z in parts)


def netlist(network, upper, lower):
    """Element lines of the network between two nodes, for a circuit simulator."""
    lines, nodes = [], [0]

    def place(part, a, b):
        kind, content = part
        if kind in "RLC":
            lines.append(f"{kind}{len(lines) + 1} {a} {b} {content:.6g}")
        elif kind == "p":
            for child in content:
                place(child, a, b)
        else:
            here = a
            for index, child in enumerate(content):
                if index == len(content) - 1:
                    there = b
                else:
                    nodes[0] += 1
                    there = f"n{nodes[0]}"
                place(child, here, there)
                here = there

    place(network, upper, lower)
    return lines


def _dispersive(farad, share, corner, branches, active):
    """A capacitance of which each Debye branch carries `share`; `active` of them count at the test frequency."""
    step = farad * share
    debye = [
        series(resistor(1 / (2 * math.pi * corner * 10**k * step)), capacitor(step)) for k in range(branches)
    ]
    return parallel(capacitor(farad - active * step), *debye)


def ceramic_class2(farad, share, ohm, henry):
    """Multilayer ceramic of class 2: dispersion, electrode resistance, inductance with skin effect."""
    return series(
        resistor(0.62 * ohm),
        inductor(0.85 * henry),
        parallel(resistor(0.4 * ohm), inductor(0.16 * henry)),
        parallel(resistor(1.1 * ohm), inductor(0.11 * henry)),
        parallel(resistor(4 * ohm), inductor(0.06 * henry)),
        _dispersive(farad, share, 31.6, 8, 6.0),
    )


def series_rlc(farad, ohm, henry):
    """Multilayer ceramic of class 1: losses so low that three elements describe it."""
    return series(resistor(ohm), inductor(henry), capacitor(farad))


def film(farad, share, ohm, henry):
    """Metallised film: little dispersion, leads with skin effect."""
    return series(
        resistor(ohm),
        inductor(0.85 * henry),
        parallel(resistor(0.8 * ohm), inductor(0.15 * henry)),
        _dispersive(farad, share, 31.6, 8, 6.0),
    )


def polymer(farad, ohm, henry):
    """Conductive polymer chip: ladder of the porous body, terminals, skin effect."""
    pores = parallel(
        capacitor(0.27 * farad),
        series(resistor(0.9e-3 * ohm * 7), parallel(
            capacitor(0.28 * farad),
            series(resistor(2.1e-3 * ohm * 7), parallel(
                capacitor(0.25 * farad),
                series(resistor(6e-3 * ohm * 7), capacitor(0.16 * farad)),
            )),
        )),
        series(resistor(5.9e3 * ohm), capacitor(0.02 * farad)),
        series(resistor(0.9e3 * ohm), capacitor(0.02 * farad)),
    )
    return series(
        resistor(6e-3 * ohm),
        inductor(0.9 * henry),
        parallel(resistor(2e-3 * ohm), inductor(0.2 * henry)),
        parallel(resistor(8e-3 * ohm), inductor(0.12 * henry)),
        pores,
    )


def electrolytic(farad, ohm, henry):
    """Liquid aluminium electrolytic: a longer-charging ladder, oxide dispersion, leads."""
    pores = parallel(
        capacitor(0.32 * farad),
        series(resistor(60e-3 * ohm), parallel(
            capacitor(0.33 * farad),
            series(resistor(150e-3 * ohm), parallel(
                capacitor(0.21 * farad),
                series(resistor(0.4 * ohm), capacitor(0.06 * farad)),
            )),
        )),
        series(resistor(4e3), capacitor(0.025 * farad)),
        series(resistor(300), capacitor(0.04 * farad)),
        series(resistor(45), capacitor(0.035 * farad)),
    )
    return series(
        resistor(46e-3 * ohm),
        inductor(0.8 * henry),
        parallel(resistor(30e-3), inductor(0.2 * henry)),
        parallel(resistor(0.1), inductor(0.14 * henry)),
        pores,
    )
