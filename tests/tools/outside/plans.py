"""Sampling plans: every cell of the tables through the program, operating characteristics against scipy."""

import scipy
from scipy import stats

from .page import Check, Section, tiny
from .program import STATION, Site, rows, table

SCIPY = f"scipy {scipy.__version__}"
LEVELS = ("S-1", "S-2", "S-3", "S-4", "I", "II", "III")


def cells(site):
    """Lots of each size range and level, with a class for every AQL: code letters, and n, Ac, Re after arrows."""
    letters, plans = rows("statistics/s1_code_letters.csv"), rows("statistics/s1_single_normal.csv")
    aqls = sorted({row["aql_percent"] for row in plans}, key=float)
    names = {aql: f"c{i}" for i, aql in enumerate(aqls)}
    bounds = [{"at": f"{2 + i} kHz", "max": "1 MΩ", "class": names[aql]} for i, aql in enumerate(aqls)]
    lots, meant = [], []
    for level in LEVELS:
        site.limits(f"L{level}", characteristics={"impedance": bounds}, acceptance={"attributes": {"level": level, "aql": {names[a]: float(a) for a in aqls}}})
        for row in letters:
            quantity = int(row["lot_max"] or 2_000_000)
            lots.append(site.lot(f"{level}-{quantity}", f"L{level}", quantity, table([1.0])))
            meant.append((quantity, row[level]))
    plan = {(row["letter"], row["aql_percent"]): row for row in plans}
    right_letters = right_cells = 0
    records = site.judge(lots)
    for (quantity, letter), record in zip(meant, records, strict=True):
        right_letters += record["sampling"]["code_letter"] == letter
        for aql in aqls:
            cell, found = plan[letter, aql], record["sampling"]["classes"][names[aql]]
            wanted = (min(int(cell["n"]), quantity), int(cell["resolved_ac"]), int(cell["resolved_re"]))
            right_cells += (found["n"], found["ac"], found["re"]) == wanted
    total, used = len(lots) * len(aqls), {(letter, a) for _, letter in meant for a in aqls}
    return [
        Check("code letters, 15 lot sizes × 7 levels", "ISO 2859-1:1999 Table 1 (= MIL-STD-105E Table I)", "none may differ", "a table",
              f"{right_letters} of {len(lots)} agree", right_letters == len(lots)),
        Check(f"n, Ac, Re after arrows, at the largest lot of each size range: {len(used)} of the {len(plans)} cells of the table, each as often as a lot size leads to it",
              "ISO 2859-1:1999 Table 2-A (= MIL-STD-105E Table II-A); how the reference was had and checked stands in its file, "
              "[s1_single_normal.csv](../tests/reference/statistics/s1_single_normal.csv)",
              "none may differ", "a table", f"{right_cells} of {total} agree", right_cells == total),
    ], records


def zero_acceptance(site):
    """Samples with Ac 0 against exact rational arithmetic."""
    reference = rows("statistics/s1_zero_acceptance_ltpd.csv")
    lots = []
    for i, row in enumerate(reference):
        part = f"Z{row['ltpd_percent']}-{row['beta']}".replace(".", "_")
        site.limits(part, characteristics={"impedance": {"at": "2 kHz", "max": "1 MΩ"}}, acceptance={"zero_acceptance": {
            "quality_limit": f"{row['ltpd_percent']} %", "consumers_risk": f"{100 * float(row['beta']):g} %"}})
        lots.append(site.lot(f"zero-{i}", part, int(row["N"]), table([1.0])))
    found = site.judge(lots)
    right = sum(record["sampling"]["classes"]["all"]["n"] == int(row["n"]) for row, record in zip(reference, found, strict=True))
    return Check("sample sizes with Ac 0", "hypergeometric law in exact rational arithmetic (Python `fractions`)", "none may differ", "a whole number",
                 f"{right} of {len(reference)} agree", right == len(reference)), found


def accepted(law, lot, counts, share):
    """Probability that a lot is accepted."""
    if law == "binomial":
        return stats.binom.cdf(counts["ac"], counts["n"], share)
    return stats.hypergeom.cdf(counts["ac"], lot, round(share * lot), counts["n"])


def characteristic(records):
    """Every operating-characteristic point of the records."""
    worst = dict.fromkeys(("binomial", "hypergeometric"), 0.0)
    points, plans, edge = dict.fromkeys(worst, 0), dict.fromkeys(worst, 0), 0.0
    for record in records:
        lot = record["lot"]["quantity"]
        for c in record["sampling"]["classes"].values():
            curve = c["operating_characteristic"]
            if curve is None:
                continue
            law = curve["law"]
            plans[law] += 1
            for p, probability in curve["points"]:
                points[law] += 1
                worst[law] = max(worst[law], abs(probability - accepted(law, lot, c, p)))
            if law == "binomial":
                for name, wanted in (("producers_risk_quality", 0.95), ("consumers_risk_quality", 0.10)):
                    edge = max(edge, abs(accepted(law, lot, c, curve[name]) - wanted))
    functions = {"binomial": "`binom.cdf`", "hypergeometric": "`hypergeom.cdf`"}
    why = "both are double precision"
    return [
        *(Check(f"probability of acceptance, {law}, {plans[law]} plans", f"{functions[law]} of {SCIPY}", "1e-10", why,
                f"{tiny(worst[law], 1e-11)} over {points[law]} points", worst[law] < 1e-10) for law in worst),
        Check("qualities accepted with 95 % and 10 %", f"`binom.cdf` of {SCIPY} there", "1e-10", why, tiny(edge, 1e-11), edge < 1e-10),
    ]


def section(program, folder, found):
    site = Site(program, folder)
    site.station("S", **STATION)
    tables, records = cells(site)
    zero, more = zero_acceptance(site)
    everything = [record for _, record in found] + records + more
    return Section("Sampling plans", "Lots of one part, judged for the sake of the plan in their records.", [*tables, zero, *characteristic(everything)])
