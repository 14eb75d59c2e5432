"""The parts of the scenario: how one is built from its spread, and where its characteristics are read.

The bounds here name characteristics and frequencies only; the limits stand in limits/parts/.
"""

from collections.abc import Callable
from dataclasses import dataclass

from . import circuits, truth


@dataclass
class Family:
    """One part number."""

    nominal: float  # F
    build: Callable  # (capacitance scale, resistance scale, inductance scale, loss scale) -> network
    bounds: tuple  # (characteristic, frequencies in Hz)
    equivalent: str = "series"
    ageing: tuple | None = None  # (relative loss per decade, referee hours)

    def test_frequency(self):
        return next(f for name, f in self.bounds if name == "capacitance")[0]

    def part(self, spread, age_factor=1.0):
        """The network whose capacitance, referred to the referee time, deviates by spread.c from nominal."""
        target = self.nominal * (1 + spread.c) / age_factor
        ohm = spread.r

        def at_scale(scale):
            network = self.build(scale, ohm, spread.l, spread.d)
            return network if spread.leak is None else circuits.parallel(network, circuits.resistor(spread.leak))

        for _ in range(1 if spread.esr is None else 4):
            scale = truth.scale_for(
                at_scale, lambda n: truth.capacitance(n, self.test_frequency(), self.equivalent), target
            )
            if spread.esr is not None:
                hertz = next(f for name, f in self.bounds if name == "esr")[0]
                ohm = truth.scale_for(
                    lambda r: self.build(scale, r, spread.l, spread.d),
                    lambda n: float(circuits.impedance(n, hertz).real), spread.esr,
                )
        return at_scale(scale)

    def true_values(self, network, sweep):
        """By key, in SI; None where the sweep does not hold the characteristic."""
        return {
            truth.key(name, *f): truth.value(network, name, f, sweep, self.equivalent) for name, f in self.bounds
        }


FAMILIES = {
    "RG-0475-X7R": Family(
        4.7e-6, lambda c, r, l, d: circuits.ceramic_class2(4.7e-6 * c, 0.041 * d, 3.4e-3 * r, 0.53e-9 * l),
        (("capacitance", (1e3,)), ("esr_minimum", ()), ("srf", ()), ("dissipation_factor", (1e3,)),
         ("impedance", (1e5,)), ("impedance", (7e5, 4e6))),
        ageing=(0.025, 1000),
    ),
    "RG-0104-X7R": Family(
        100e-9, lambda c, r, l, d: circuits.ceramic_class2(100e-9 * c, 0.029 * d, 21e-3 * r, 0.34e-9 * l),
        (("capacitance", (1e3,)), ("esr_minimum", ()), ("srf", ()), ("dissipation_factor", (1e3,))),
        ageing=(0.025, 1000),
    ),
    "RG-0226-X5R": Family(
        22e-6, lambda c, r, l, d: circuits.ceramic_class2(22e-6 * c, 0.05 * d, 2.6e-3 * r, 0.9e-9 * l),
        (("capacitance", (1e3,)), ("esr_minimum", ()), ("srf", ()), ("impedance", (5e6,))),
    ),
    "RG-0102-C0G": Family(
        1e-9, lambda c, r, l, d: circuits.series_rlc(1e-9 * c, 0.09 * r, 0.36e-9 * l),
        (("capacitance", (1e6,)), ("dissipation_factor", (1e6,)), ("esr", (1e8,)), ("srf", ())),
    ),
    "RG-0103-C0G": Family(
        10e-9, lambda c, r, l, d: circuits.series_rlc(10e-9 * c, 0.03 * r, 1.0e-9 * l),
        (("capacitance", (1e6,)), ("impedance", (2e7,))),
    ),
    "RG-0476-POL": Family(
        47e-6, lambda c, r, l, d: circuits.polymer(47e-6 * c, r, 1.5e-9 * l),
        (("capacitance", (120.0,)), ("esr", (1e5,)), ("dissipation_factor", (120.0,))),
    ),
    "RG-0337-ALU": Family(
        330e-6, lambda c, r, l, d: circuits.electrolytic(330e-6 * c, 1.5 * r, 13e-9 * l),
        (("capacitance", (120.0,)), ("esr", (1e5,)), ("dissipation_factor", (120.0,))),
    ),
    "RG-0105-PET": Family(
        1e-6, lambda c, r, l, d: circuits.film(1e-6 * c, 0.0065 * d, 8e-3 * r, 5e-9 * l),
        (("capacitance", (1e3,)), ("dissipation_factor", (1e3,)), ("dissipation_factor", (1e4,))),
        equivalent="parallel",
    ),
    "RG-0206-MKP": Family(
        20e-6, lambda c, r, l, d: circuits.film(20e-6 * c, 0.0003 * d, 2.4e-3 * r, 18e-9 * l),
        (("capacitance", (1e3,)), ("esr", (1e5,)), ("srf", ()), ("esl", ())),
    ),
}
