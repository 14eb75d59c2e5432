"""Sampling by variables: plans against the published tables, estimates against scipy and statsmodels."""

import numpy
import scipy
import statsmodels
from scipy import special, stats
from statsmodels.stats.diagnostic import normal_ad

from .page import Check, Section, tiny
from .plans import LEVELS
from .program import STATION, Site, rows, table

SCIPY, STATSMODELS = f"scipy {scipy.__version__}", f"statsmodels {statsmodels.__version__}"
AQLS = ("0.040", "0.065", "0.10", "0.15", "0.25", "0.40", "0.65", "1.0", "1.5", "2.5", "4.0", "6.5", "10.0")
PARTS = 200


def lots(site):
    """A lot for each code letter, in turn of normal and of skewed values, with a class for every AQL."""
    where = {}
    for row in rows("statistics/s1_code_letters.csv"):
        for level in LEVELS:
            where[row[level]] = (level, int(row["lot_max"] or 2_000_000))
    order = numpy.random.default_rng(3951).permutation(PARTS)
    share = (order + 0.5) / PARTS
    made = []
    for number, (letter, (level, quantity)) in enumerate(sorted(where.items())):
        values = 10 + (stats.norm.ppf(share) if number % 3 else stats.expon.ppf(share))
        bounds = []
        for i in range(len(AQLS)):
            bound = {"at": f"{100 + 10 * i} kHz", "max": f"{11.2 + 0.2 * i:.1f} Ω", "class": f"c{i}"}
            bounds.append(bound | ({"min": f"{9.0 - 0.2 * i:.1f} Ω"} if i % 2 else {}))
        part = f"V{letter}"
        site.limits(part, characteristics={"esr": bounds},
                    acceptance={"variables": {"level": level, "aql": {f"c{i}": float(a) for i, a in enumerate(AQLS)}}})
        made.append(site.lot(part, part, quantity, table(values)))
    return made


def section(program, folder):
    site = Site(program, folder)
    site.station("S", **STATION)
    tables = {(int(r["n"]), float(r["aql_percent"])): (float(r["k_B1"]), float(r["M_B3_percent"]) / 100) for r in rows("statistics/s2_mil414_normal_s_method.csv")}
    seen, right, total, estimate, p_value, decided, verdicts = set(), 0, 0, 0.0, 0.0, 0, 0
    for record in site.judge(lots(site)):
        values = {key: [p["readings"][key]["value"] for p in record["parts"]] for key in record["statistics"]}
        for i, aql in enumerate(AQLS):
            for found in record["sampling"]["classes"][f"c{i}"]["variables"]:
                cell = found["n"], float(aql)
                total += 1
                right += cell in tables and (found["k"], found["m"]) == tables[cell]
                seen.add(cell)
                x = numpy.array(values[found["key"]][: found["n"]])
                p_normal = normal_ad(x)[1] if len(x) >= 8 else None
                if p_normal is not None and found["normality_p_value"] is not None:
                    p_value = max(p_value, abs(found["normality_p_value"] - p_normal))
                if found["estimated_share"] is None:
                    continue
                bound = next(b for b in record["limits"]["characteristics"] if b["key"] == found["key"])
                mean, s, n = x.mean(), x.std(ddof=1), len(x)
                q = [d / s for d in (bound["upper"] - mean, *([mean - bound["lower"]] if bound["lower"] is not None else []))]
                half = n / 2 - 1
                shares = [special.betainc(half, half, min(1, max(0, 0.5 * (1 - one * numpy.sqrt(n) / (n - 1))))) for one in q]
                estimate = max(estimate, abs(found["estimated_share"] - sum(shares)))
                if found["verdict"] != "hold":
                    verdicts += 1
                    accepted = sum(shares) <= found["m"] if bound["lower"] is not None else q[0] >= found["k"]
                    decided += accepted == (found["verdict"] == "accept")
    return Section(
        "Sampling by variables",
        "A lot for each code letter, normal or skewed, with a class for each AQL and one limit or two.",
        [
            Check(f"n, k, M: {len(seen)} cells", "MIL-STD-414 tables B-1 and B-3, s method; how the reference was had and checked stands in its file, "
                  "[s2_mil414_normal_s_method.csv](../tests/reference/statistics/s2_mil414_normal_s_method.csv)", "none may differ", "a table",
                  f"{right} of {total} agree", right == total > 0),
            Check("estimated share nonconforming", f"`betainc` of {SCIPY}", "1e-10", "both are double precision", tiny(estimate, 1e-11), estimate < 1e-10),
            Check("p of Anderson-Darling", f"`normal_ad` of {STATSMODELS}", "1e-6", "the statistic is in the exponent of a fitted formula", tiny(p_value, 1e-8), p_value < 1e-6),
            Check("decisions of characteristics", f"Q ≥ k, p̂ ≤ M with {SCIPY}", "none may differ", "a verdict is no matter of degree",
                  f"{decided} of {verdicts} agree", decided == verdicts > 0),
        ],
    )
