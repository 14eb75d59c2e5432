"""Lot statistics against numpy, scipy, statsmodels and certified data sets."""

import numpy
import scipy
import statsmodels
from scipy import optimize, special, stats
from statsmodels.stats.weightstats import DescrStatsW

from .page import Check, Section, tiny
from .program import REFERENCE, STATION, Site, rows, table

NUMPY, SCIPY, STATSMODELS = f"numpy {numpy.__version__}", f"scipy {scipy.__version__}", f"statsmodels {statsmodels.__version__}"


def moving_range_freedom(n):
    """Degrees of freedom of a chi with the coefficient of variation of the mean moving range, by quadrature."""
    # E|d1 d2| of neighbouring differences, correlation -1/2, each of variance 2.
    pair = (2 / numpy.pi) * (numpy.sqrt(0.75) + 0.5 * numpy.arcsin(0.5)) * 2
    mean, ranges = 2 / numpy.sqrt(numpy.pi), n - 1
    variance = (2 - mean**2 + 2 * (pair - mean**2) * (ranges - 1) / ranges) / ranges
    wanted = variance / mean**2

    def excess(nu):
        ratio = numpy.sqrt(2 / nu) * numpy.exp(special.gammaln((nu + 1) / 2) - special.gammaln(nu / 2))
        return ratio**-2 - 1 - wanted

    return optimize.brentq(excess, 1e-2, 1e6, xtol=1e-13, rtol=1e-14)


def esd(values, most, alpha):
    """Indices of the outliers, Rosner 1983."""
    left, steps = list(enumerate(values)), []
    for _ in range(most):
        x = numpy.array([v for _, v in left])
        if x.std() == 0:
            break
        deviation = abs(x - x.mean())
        at, m = int(deviation.argmax()), len(x)
        t = stats.t.ppf(1 - alpha / (2 * m), m - 2)
        steps.append((left.pop(at)[0], deviation[at] / x.std(ddof=1) > (m - 1) * t / numpy.sqrt(m * (m - 2 + t * t))))
    last = max((i for i, (_, out) in enumerate(steps) if out), default=-1)
    return sorted(i for i, _ in steps[: last + 1])


def again(values, lower, upper):
    """Everything that a record states of a characteristic, recomputed."""
    x, described = numpy.array(values), DescrStatsW(values)
    n, mean, s = len(x), described.mean, float(described.std_ddof(1))
    within = numpy.mean(abs(numpy.diff(x))) * numpy.sqrt(numpy.pi) / 2
    near = min(x.mean() - lower if lower is not None else numpy.inf, upper - x.mean() if upper is not None else numpy.inf)
    z = stats.norm.ppf(0.95)

    def bound(index, nu):
        return index - z * numpy.sqrt(1 / (9 * n) + index**2 / (2 * nu))

    def exact(index):
        """Lower bound of a one-sided index: the noncentral t that makes it as likely as 5 %."""
        scale = 3 * numpy.sqrt(n)
        return optimize.brentq(lambda c: stats.nct.sf(scale * index, n - 1, scale * c) - 0.05, index - 5 * abs(index) - 1, index, xtol=1e-13, rtol=1e-12)

    both = lower is not None and upper is not None
    result = {
        "mean": mean, "standard_deviation": s, "median": numpy.median(x), "minimum": x.min(), "maximum": x.max(), "sigma_within": within,
        "cpk": near / (3 * within), "ppk": near / (3 * s),
        "cpk_lower_95": bound(near / (3 * within), moving_range_freedom(n)), "ppk_lower_95": (lambda index: bound(index, n - 1) if both else exact(index))(near / (3 * s)),
    }
    if both:
        result |= {"cp": (upper - lower) / (6 * within), "pp": (upper - lower) / (6 * s)}
    return result


SOURCES = {
    ("mean", "standard_deviation"): f"`DescrStatsW` of {STATSMODELS}",
    ("median", "minimum", "maximum", "sigma_within"): NUMPY,
    ("cp", "cpk", "pp", "ppk"): f"{NUMPY}; definitions of ISO 22514-2",
    ("cpk_lower_95", "ppk_lower_95"): f"{SCIPY}; Bissell 1990, noncentral t with one limit, degrees of freedom of the moving range solved anew",
}


def sample_lots(found):
    """Statistics of every bound of every sample lot."""
    worst, count, tests, same = {}, {}, 0, 0
    for _, record in found:
        for bound in record["limits"]["characteristics"]:
            of = record["statistics"][bound["key"]]
            parts = [(p["part"], p["readings"].get(bound["key"])) for p in record["parts"]]
            parts = [(p, r["value"]) for p, r in parts if r and r["value"] is not None and r["verdict"] != "unmeasured"]
            values = [v for _, v in parts]
            if len(values) < 2:
                continue
            for name, value in again(values, bound["lower"], bound["upper"]).items():
                if name.startswith(("cp", "pp")) and of[name] is None and (len(values) < 8 or of.get("at_least")):
                    continue  # refused: too few values, or mostly the measurement's spread
                difference = numpy.inf if of[name] is None else abs(of[name] / value - 1)
                worst[name] = max(worst.get(name, 0), difference)
                count[name] = count.get(name, 0) + 1
            if len(values) >= 15:
                alpha = 0.01  # of every sample limit file
                tests += 1
                same += sorted(of["outliers"]) == sorted(parts[i][0] for i in esd(values, min(10, len(values) // 4), alpha))
    checks = [
        Check(", ".join(names).replace("_", " "), source, "1e-9", "both compute in double precision; the values span four digits",
              f"{tiny(max(worst[n] for n in names), 1e-10)} over {sum(count[n] for n in names)} values", max(worst[n] for n in names) < 1e-9)
        for names, source in SOURCES.items()
    ]
    checks.append(Check("outliers (generalized ESD)", f"Rosner 1983 with the t quantile of {SCIPY}", "none may differ", "a set", f"{same} of {tests} agree", same == tests))
    return checks


# Data sets that can be resistances; those with values below zero are shifted by so much.
CERTIFIED = {"Lew": 1000.0, "Lottery": 1000.0, "Mavro": 0.0, "Michelso": 0.0}


def certified(program, folder):
    """Certified data as the series resistances of a lot's parts."""
    site = Site(program, folder)
    site.station("S", **STATION)
    site.limits("STRD", characteristics={"esr": {"at": "100 kHz", "max": "10 kΩ"}}, acceptance={"fixed": {"sample": 1, "accept": 0}})
    site.limits(
        "ROSNER", characteristics={"esr": {"at": "100 kHz", "max": "10 kΩ"}}, acceptance={"fixed": {"sample": 1, "accept": 0}},
        lot_rules={"outliers": {"of": "esr", "method": "generalized_esd", "alpha": 0.05, "allowed": 0}},
    )
    lots = []
    for name, shift in CERTIFIED.items():
        data = [float(line) for line in (REFERENCE / f"statistics/strd/{name}.txt").read_text().splitlines() if not line.startswith("#")]
        lots.append(site.lot(name, "STRD", 1000, table([x + shift for x in data])))
    rosner = [float(row["x"]) for row in rows("statistics/s4_rosner_data.csv")]
    lots.append(site.lot("Rosner", "ROSNER", 1000, table([x + 1 for x in rosner])))
    *found, of_rosner = site.judge(lots)
    truth = {row["name"]: row for row in rows("statistics/s7_strd_univariate_certified.csv")}
    mean = spread = 0.0
    for (name, shift), record in zip(CERTIFIED.items(), found, strict=True):
        of = next(iter(record["statistics"].values()))
        expected = float(truth[name]["mean_certified"]) + shift
        mean = max(mean, abs(of["mean"] / expected - 1))
        spread = max(spread, abs(of["standard_deviation"] / float(truth[name]["sd_certified"]) - 1))
    outliers = [rosner[int(p) - 1] for p in next(iter(of_rosner["statistics"].values()))["outliers"]]
    names = ", ".join(CERTIFIED)
    why = "through a whole sweep: the values pass through the fit of a reading first"
    return [
        Check(f"mean of {names}", "NIST StRD, univariate, certified values", "1e-9", why, tiny(mean, 1e-10), mean < 1e-9),
        Check(f"standard deviation of {names}", "NIST StRD, univariate, certified values", "1e-6", why + "; s of Mavro is 2e-4 of its mean", tiny(spread, 1e-8), spread < 1e-6),
        Check("outliers of Rosner's 54 values, α 0.05", "NIST/SEMATECH e-Handbook 1.3.5.17.3: 6.01, 5.42, 5.34", "none may differ", "a set",
              ", ".join(str(x) for x in outliers), sorted(outliers) == [5.34, 5.42, 6.01]),
    ]


def section(program, folder, found):
    return Section(
        "Lot statistics",
        "First what the records of the sample lots state, recomputed from their readings; then certified data that were made into lots (one part a value: that resistance in\n"
        "series with a capacitance). Relative differences.",
        sample_lots(found) + certified(program, folder),
    )
