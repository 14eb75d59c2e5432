"""From a lot folder to a verdict with its reasons."""

import datetime
import math
import re

import numpy as np
from scipy.stats import t as student

from . import files, plan, readings

GUARD = 0.4 / math.sqrt(3)  # relative standard uncertainty of a stated ageing rate


def key(name, place):
    def text(hertz):
        size, prefix = next((s, p) for s, p in ((1e6, "M"), (1e3, "k"), (1.0, "")) if hertz >= s)
        return f"{hertz / size:g}{prefix}Hz"

    return name + ("@" + "..".join(text(f) for f in place) if place else "")


def naive(moment):
    if isinstance(moment, datetime.datetime):
        return moment.replace(tzinfo=None)
    return datetime.datetime.combine(moment, datetime.time())


def age_hours(lot):
    if "last_heat" not in lot:
        return None
    return (naive(lot["measured"]) - naive(lot["last_heat"])).total_seconds() / 3600


def uncertainty(station, name, value, x):
    """Standard uncertainty from what the station states."""
    stated = station["uncertainty"]
    tolerance = files.quantity(station.get("reference", {}).get("tolerance", "0 %")) / math.sqrt(3)
    magnitude = math.hypot(files.quantity(stated["magnitude"]), tolerance) * value
    if name in ("dissipation_factor", "srf"):
        magnitude = 0.0
    phase = files.quantity(stated["phase"]) * abs(x)
    repeat = stated.get("repeatability", {}).get(name, "0 %")
    repeat = files.quantity(repeat) * (value if "%" in repeat else 1.0)
    return math.sqrt(magnitude**2 + phase**2 + repeat**2)


class Site:
    """A lot with its limit and station files and the standards of its jig."""

    def __init__(self, root, folder):
        self.lot = files.load(folder / "lot.yaml")
        self.limits = files.load(root / "limits" / "parts" / f"{self.lot['part']}.yaml")
        stations = root / "limits" / "stations"
        self.station = files.load(stations / f"{self.lot['station']}.yaml")
        self.bounds = files.bounds_of(self.limits)
        self.tries = files.sweeps(folder, self.lot, self.station)
        self.duplicates = files.duplicates(folder / self.lot["sweeps"])
        self.standards = self._standards(stations)
        self.age = age_hours(self.lot)

    def _standards(self, stations):
        stated = self.station.get("compensation")
        if not stated:
            return None
        result = []
        for name in [n for n in ("open", "short", "load") if n in stated]:
            entry = stated[name]
            entry = {"sweep": entry} if isinstance(entry, str) else entry
            raw = files.from_csv(stations / entry["sweep"], self.station)
            _, z, _ = readings.impedance(raw, self.station)
            true = tuple(files.quantity(entry.get(k, "0 H")) for k in ("resistance", "inductance"))
            result.append((z, true))
        return result

    def ageing(self):
        """Factor to the referee time and its relative standard uncertainty; None where the age is unknown."""
        rule = self.limits["conditions"].get("ageing")
        if rule is None:
            return 1.0, 0.0
        if self.age is None:
            return None
        rate, hours = files.quantity(rule["per_decade"]), files.quantity(rule["refer_to"]) / 3600
        factor = (1 - rate * math.log10(hours)) / (1 - rate * math.log10(self.age))
        return factor, GUARD * rate * math.log10(self.age / hours)

    def test_place(self):
        """Frequency and nominal capacitance of the capacitance bound."""
        name, place, low, high, _ = next(b for b in self.bounds if b[0] == "capacitance")
        return place[0], (low + high) / 2


def within(value, window):
    """Whether a value is in the closed window of a condition; printed rounding is allowed for."""
    low, high = files.window(window) if window else (-math.inf, math.inf)
    return low - 1e-6 * abs(low) <= value <= high + 1e-6 * abs(high)


def judge_try(site, raw):
    """One sweep: {"verdict", "fault", "readings": key -> value, "zones": key -> verdict}."""
    if isinstance(raw, files.Unreadable):
        return {"verdict": "unmeasured", "fault": str(raw), "readings": {}, "zones": {}}
    f, z, level = readings.impedance(raw, site.station, site.standards)
    at, nominal = site.test_place()
    fault = readings.contact_fault(f, z, nominal, at)
    if fault:
        return {"verdict": "unmeasured", "fault": fault, "readings": {}, "zones": {}}
    equivalent = site.limits["conditions"].get("equivalent", "series")
    k = site.limits.get("decision_rule", {}).get("coverage_factor", 0)
    result = {"fault": None, "readings": {}, "zones": {}, "drive": None}
    if level is not None:
        result["drive"] = float(np.interp(at, f, level))
        if not within(result["drive"], site.limits["conditions"].get("drive")):
            return {**result, "verdict": "unmeasured", "fault": "drive_out_of_range"}
    for name, place, low, high, _ in site.bounds:
        value, x = readings.read(f, z, name, place, equivalent)
        zone, value = judge_value(site, name, value, x, low, high, k, f[-1])
        result["readings"][key(name, place)] = value
        result["zones"][key(name, place)] = zone
    order = ("conforming", "undecided", "unmeasured", "nonconforming")
    result["verdict"] = max(result["zones"].values(), key=order.index)
    if any(name == "capacitance" for name, *_ in site.bounds) and site.ageing() is None:
        result["fault"] = "ageing_unknown"
    return result


def judge_value(site, name, value, x, low, high, k, top):
    """Zone and the value as judged: capacitance referred where the limit file refers it."""
    if value is None:  # only a resonance beyond the sweep comes here
        return ("conforming" if high is None and top >= low else "unmeasured"), None
    u = uncertainty(site.station, name, value, x)
    if name == "capacitance":
        ageing = site.ageing()
        if ageing is None:
            return "unmeasured", None
        value, u = value * ageing[0], math.hypot(u * ageing[0], value * ageing[1])
    margin = min(value - low if low is not None else math.inf, high - value if high is not None else math.inf)
    if margin < 0:
        return "nonconforming", value
    return ("conforming" if margin >= k * u else "undecided"), value


def parts_of(site):
    """Part number to the try that counts, and the parts whose further try does not."""
    allowed = site.limits.get("retest", {})
    counted, refused = {}, []
    used = {}
    for part, _, raw in site.tries:
        judged = judge_try(site, raw)
        before = counted.get(part)
        if before is None:
            counted[part] = judged
        elif used.get(part, 0) < allowed.get(before["verdict"], 0):
            used[part] = used.get(part, 0) + 1
            counted[part] = judged
        else:
            refused.append(part)
    return counted, refused


def generalized_esd(values, alpha, most=10):
    """Indices of outliers (Rosner 1983)."""
    left, removed, count = list(range(len(values))), [], 0
    n = len(values)
    for i in range(1, min(most, n // 2) + 1):
        x = np.array([values[j] for j in left])
        deviation = np.abs(x - x.mean())
        worst = int(np.argmax(deviation))
        r = deviation[worst] / x.std(ddof=1)
        quantile = student.isf(alpha / (2 * (n - i + 1)), n - i - 1)
        critical = (n - i) * quantile / math.sqrt((n - i - 1 + quantile**2) * (n - i + 1))
        removed.append(left.pop(worst))
        if r > critical:
            count = i
    return removed[:count]


def capability(values, low, high, index):
    x = np.array(values)
    sigma = x.std(ddof=1) if index in ("pp", "ppk") else np.abs(np.diff(x)).mean() / (2 / math.sqrt(math.pi))
    sides = [s for s in (x.mean() - low if low is not None else None, high - x.mean() if high is not None else None) if s is not None]
    return min(sides) / (3 * sigma)


def label_fields(label):
    """Data identifiers to values (ISO/IEC 15434); None where the fields cannot be told apart."""
    for word, code in (("<GS>", "\x1d"), ("<RS>", "\x1e"), ("<EOT>", "\x04")):
        label = label.replace(word, code)
    if "\x1d" not in label:
        return None
    fields = {}
    for text in re.split("[\x1d\x1e\x04]", label)[2:]:
        if text:
            identifier = re.match(r"[0-9]{0,3}[A-Z]", text).group()
            fields[identifier] = text[len(identifier) :]
    return fields


def conditions(site, counted):
    """Reason codes of conditions that are not as demanded."""
    lot, demanded, station, found = site.lot, site.limits["conditions"], site.station, []
    temperature = files.quantity(lot["ambient"]["temperature"])
    if not within(temperature, demanded["temperature"]):
        found.append("temperature_out_of_range")
    if "drive" in demanded:
        shown = [p["drive"] for p in counted.values() if p.get("drive") is not None]
        levels = shown or [files.quantity(lot["drive"])]
        if not all(within(level, demanded["drive"]) for level in levels):
            found.append("drive_out_of_range")
    measured = naive(lot["measured"])
    if measured.date() > station["instrument"]["due"]:
        found.append("calibration_expired")
    hours = files.quantity(station["jig"]["valid_for"]) / 3600
    if measured > naive(station["jig"]["checked"]) + datetime.timedelta(hours=hours):
        found.append("jig_check_expired")
    fields = label_fields(lot["label"])
    if fields is None:
        found.append("label_unreadable")
    elif (fields["P"], fields["Q"], fields["1T"]) != (lot["part"], str(lot["quantity"]), lot["lot"]):
        found.append("label_mismatch")
    if "ageing" in demanded and site.age is None:
        found.append("ageing_unknown")
    return found


def plans(site):
    """Class to (n, Ac, Re)."""
    acceptance = site.limits["acceptance"]
    quantity = site.lot["quantity"]
    if "fixed" in acceptance:
        return {"all": (min(acceptance["fixed"]["sample"], quantity), acceptance["fixed"]["accept"], acceptance["fixed"]["accept"] + 1)}
    rule = acceptance["attributes"]
    return {name: plan.single(quantity, rule["level"], aql) for name, aql in rule["aql"].items()}


def classes_of(site, judged, zone):
    """The most serious class among a part's characteristics in that zone, as a set of at most one."""
    hit = sorted(c for (name, place, _, _, c) in site.bounds if judged["zones"].get(key(name, place)) == zone)
    return set(hit[:1])


def sampling(site, counted):
    """Counts of each class within its n."""
    result = {}
    for name, (n, ac, re_) in plans(site).items():
        first = list(counted.values())[:n]

        def count(zone, name=name, first=first):
            return sum(p["verdict"] == zone and (name == "all" or name in classes_of(site, p, zone)) for p in first)

        result[name] = {"n": n, "ac": ac, "re": re_, "nonconforming": count("nonconforming"), "undecided": count("undecided")}
    return result


def values(counted, name):
    """Part and value of every part that has one."""
    return [(p, j["readings"][name]) for p, j in counted.items() if j["readings"].get(name) is not None]


def outliers_of(site, counted):
    """By key of every bound: parts that the generalized ESD test finds, where it applies (n of 15 and more)."""
    alpha = site.limits.get("lot_rules", {}).get("outliers", {}).get("alpha", 0.01)
    result = {}
    for name, place, _, _, _ in site.bounds:
        series = values(counted, key(name, place))
        hit = generalized_esd([v for _, v in series], alpha) if len(series) >= 15 else []
        if hit:
            result[key(name, place)] = sorted(series[i][0] for i in hit)
    return result


def lot_rule_reasons(site, counted, outliers):
    """Reasons from the lot rules."""
    rules, found = site.limits.get("lot_rules", {}), []
    if "capability" in rules:
        rule = rules["capability"]
        name, place, low, high, _ = next(b for b in site.bounds if b[0] == rule["of"])
        series = [v for _, v in values(counted, key(name, place))]
        if len(series) < 8:
            found.append("capability_not_available")
        elif capability(series, low, high, rule["index"]) < rule["min"]:
            found.append("capability_below_min")
    if "outliers" in rules:
        rule = rules["outliers"]
        if any(len(v) > rule["allowed"] for k, v in outliers.items() if k.partition("@")[0] in rule["of"]):
            found.append("outliers_found")
    return found


def judge(root, folder):
    """Everything that expected.json states, and the readings."""
    site = Site(root, folder)
    counted, refused = parts_of(site)
    counts = sampling(site, counted)
    required = max(c["n"] for c in counts.values())
    reasons = conditions(site, counted)
    outliers = outliers_of(site, counted)
    reasons += lot_rule_reasons(site, counted, outliers)
    if site.duplicates:
        reasons.append("duplicate_sweep")
    if refused:
        reasons.append("retest_not_allowed")
    if any(p["verdict"] == "unmeasured" for p in counted.values()):
        reasons.append("unmeasured_parts")
    if sum(p["verdict"] != "unmeasured" for p in counted.values()) < required:
        reasons.append("sample_too_small")
    if any(c["nonconforming"] <= c["ac"] < c["nonconforming"] + c["undecided"] for c in counts.values()):
        reasons.append("undecided_parts")
    if any(p["verdict"] == "nonconforming" for p in list(counted.values())[required:]):
        reasons.append("nonconforming_beyond_sample")
    rejected = any(c["nonconforming"] >= c["re"] for c in counts.values())
    if rejected:
        reasons.insert(0, "nonconforming_over_ac")
    verdict = "reject" if rejected else "hold" if reasons else "accept"
    return {
        "verdict": verdict, "reasons": reasons or ["accepted_by_plan"],
        "sampling": {"required": required, "presented": len(counted), "classes": counts},
        "parts": counted, "outliers": outliers, "duplicates": site.duplicates,
        "retested": sorted({part for part, attempt, _ in site.tries if attempt > 1}),
    }
