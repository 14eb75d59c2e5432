"""Scattering parameters computed by scikit-rf from its own circuit elements."""

import warnings

import skrf
from skrf.media import DefinedGammaZ0
from skrf.network import connect, innerconnect

warnings.filterwarnings("ignore", module="skrf")


def _medium(frequency, z0):
    return DefinedGammaZ0(skrf.Frequency.from_f(frequency, unit="hz"), z0=z0)


def _element(medium, kind, value):
    return {"R": medium.resistor, "L": medium.inductor, "C": medium.capacitor}[kind](value)


def _side_by_side(medium, first, second):
    """Two two-ports in parallel, between a splitter at either end."""
    fork = medium.tee()
    # A two-port put on a port of the splitter keeps that port's place: (in, first, second).
    half = connect(connect(fork, 1, first, 0), 2, second, 0)
    # (in, second, free, out) once the first branch has reached the other splitter.
    return innerconnect(connect(half, 1, fork, 0), 1, 2)


def _cascade(medium, network):
    """Two-port of the network as a series arm; a parallel group within it has two members."""
    kind, content = network
    if kind in "RLC":
        return _element(medium, kind, content)
    if kind == "p":
        first, second = (_cascade(medium, child) for child in content)
        return _side_by_side(medium, first, second)
    result = medium.thru()
    for child in content:
        result = result ** _cascade(medium, child)
    return result


def _to_ground(medium, network):
    """One-port of the network between the line and ground."""
    kind, content = network
    if kind == "p":
        row = medium.thru()
        for child in content:
            row = row ** medium.shunt(_to_ground(medium, child))
        return row ** medium.open()
    if kind == "s" and content[-1][0] == "p":
        return _cascade(medium, ("s", content[:-1])) ** _to_ground(medium, content[-1])
    return _cascade(medium, network) ** medium.short()


def shunt_through(network, frequency, z0=50.0, arm=(0.0, 0.0)):
    """Part in shunt; each port reaches it through an arm of (ohm, henry)."""
    medium = _medium(frequency, z0)
    side = medium.resistor(arm[0]) ** medium.inductor(arm[1])
    return side ** medium.shunt(_to_ground(medium, network)) ** side


def series_through(network, frequency, z0=50.0):
    """Part in series between the ports."""
    return _cascade(_medium(frequency, z0), network)


def reflection(network, frequency, z0=50.0):
    """Part terminating port 1."""
    return _to_ground(_medium(frequency, z0), network)


def write(network, path, comment, form="ri", version="1.0", digits=9):
    """Touchstone text by the library's own writer."""
    network.comments = f" {comment}"
    spec = f"{{:.{digits}g}}"
    text = network.write_touchstone(
        path.stem, form=form, version=version, return_string=True, skrf_comment=False,
        format_spec_A=spec, format_spec_B=spec, format_spec_freq="{:.7g}",
        r_ref=float(network.z0[0, 0].real),
    )
    path.write_text(text, encoding="ascii")
