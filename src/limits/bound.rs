//! Bounds: what is bounded, where, and the absolute window.

use super::Bound;
use crate::diagnostic::Span;
use crate::diagnostic::yaml::{Fields, Node, Reader, Shape, shown};
use crate::quantity::{Dimension, frequency_key, shortest};
use crate::readings::{Characteristic, Place};

/// Lowest frequency at which a bound may stand, Hz. Common practice, no source: below 1 Hz a
/// single point takes longer than goods-in can wait, and no impedance standard for fixed
/// capacitors asks for it (IEC 60384-1 measures at 100 Hz or 120 Hz and above).
pub const LOWEST_FREQUENCY: f64 = 1.0;

/// Highest frequency at which a bound may stand, Hz. Common practice, no source: network analyser
/// jigs for chip capacitors end below 10 GHz.
pub const HIGHEST_FREQUENCY: f64 = 10e9;

const KEYS: [&str; 7] = [
    "at",
    "between",
    "min",
    "max",
    "nominal",
    "tolerance",
    "class",
];

/// What `characteristics` bounds, as far as it can be told.
#[derive(Debug, Default)]
pub struct Bounded {
    /// The bounds without fault, in file order, keys unique.
    pub bounds: Vec<Bound>,
    /// Every key under `characteristics`, whether its bound has faults or not.
    pub names: Vec<String>,
    /// Every class that can be told, with a bound that is in it, whether that has faults or not.
    pub classes: Vec<(String, String)>,
    /// Whether `bounds` is all of it, and not empty.
    pub complete: bool,
}

/// The bounds of a file.
pub fn read_all(reader: &mut Reader<'_>, node: &Node) -> Bounded {
    let names = Characteristic::ALL.map(Characteristic::name);
    let before = reader.count();
    let mut all = Bounded::default();
    let Some(fields) = reader.fields(node, "`characteristics`", &names) else {
        return all;
    };
    all.names = fields.iter().map(|(name, ..)| name.to_owned()).collect();
    let mut complete = true;
    for (name, _, value) in fields.iter() {
        let known = Characteristic::ALL.into_iter().find(|c| c.name() == name);
        let Some(characteristic) = known else {
            continue;
        };
        for item in items(reader, value, name) {
            let class = read_class(reader, item);
            let bound = read(reader, characteristic, item, class.as_deref());
            let shown = bound.as_ref().map_or(name, |bound| bound.key.as_str());
            all.classes
                .extend(class.map(|class| (class, shown.to_owned())));
            match bound {
                Some(bound) => push(reader, &mut all.bounds, bound, item.span),
                None => complete = false,
            }
        }
    }
    if all.bounds.is_empty() && reader.count() == before {
        reader.fault(
            node.span,
            "no_bound",
            "`characteristics` that bound nothing",
            "at least one bound",
            Some("add for example `capacitance: {at: 1 kHz, min: 4.23 µF}`".to_owned()),
        );
    }
    all.complete = complete && reader.count() == before && !all.bounds.is_empty();
    all
}

/// The class of a bound, `A` where it names none.
fn read_class(reader: &mut Reader<'_>, node: &Node) -> Option<String> {
    let Shape::Map(entries) = &node.shape else {
        return None;
    };
    let is_class = |key: &Node| matches!(&key.shape, Shape::Text { text, .. } if text == "class");
    match entries.iter().find(|(key, _)| is_class(key)) {
        Some((_, node)) => class(reader, node),
        None => Some("A".to_owned()),
    }
}

/// The bounds under one name: one map, or a list of maps.
fn items<'n>(reader: &mut Reader<'_>, value: &'n Node, name: &str) -> Vec<&'n Node> {
    match &value.shape {
        Shape::List(list) => {
            if list.is_empty() {
                let found = format!("`{name}` with an empty list");
                reader.fault(value.span, "no_bound", found, "at least one bound", None);
            }
            list.iter().collect()
        }
        _ => vec![value],
    }
}

fn push(reader: &mut Reader<'_>, bounds: &mut Vec<Bound>, bound: Bound, span: Span) {
    if bounds.iter().any(|other| other.key == bound.key) {
        reader.fault(
            span,
            "duplicate_bound",
            format!("`{}` bounded a second time", bound.key),
            "each characteristic once at each frequency or band",
            Some("put both limits into one bound, or correct the frequency".to_owned()),
        );
    } else {
        bounds.push(bound);
    }
}

fn read(
    reader: &mut Reader<'_>,
    characteristic: Characteristic,
    node: &Node,
    class: Option<&str>,
) -> Option<Bound> {
    let what = format!("a bound of `{}`", characteristic.name());
    let fields = reader.fields(node, &what, &KEYS)?;
    let place = place(reader, characteristic, &fields);
    let window = window(reader, characteristic, &fields);
    let (place, window) = (place?, window?);
    Some(Bound {
        key: key(characteristic, place),
        characteristic,
        place,
        lower: window.lower,
        upper: window.upper,
        nominal: window.nominal,
        class: class?.to_owned(),
    })
}

/// The name of a nonconformity class: letters and digits, at most 16.
pub fn class(reader: &mut Reader<'_>, node: &Node) -> Option<String> {
    let name = reader.line(node, "a nonconformity class")?;
    if is_class(&name) {
        return Some(name);
    }
    let found = format!("the class {}", shown(node));
    let expected = "a nonconformity class such as `A`: letters and digits, at most 16";
    reader.fault(node.span, "bad_class", found, expected, None);
    None
}

/// Whether a text can name a nonconformity class.
pub fn is_class(name: &str) -> bool {
    (1..=16).contains(&name.len()) && name.bytes().all(|b| b.is_ascii_alphanumeric())
}

fn key(characteristic: Characteristic, place: Place) -> String {
    let name = characteristic.name();
    match place {
        Place::At(f) => format!("{name}@{}", frequency_key(f)),
        Place::Between(a, b) => format!("{name}@{}..{}", frequency_key(a), frequency_key(b)),
        Place::Anywhere => name.to_owned(),
    }
}

/// Whether a characteristic takes `at` and `between`.
fn takes(characteristic: Characteristic) -> (bool, bool) {
    match characteristic {
        Characteristic::Capacitance | Characteristic::DissipationFactor => (true, false),
        Characteristic::Esr | Characteristic::Impedance => (true, true),
        Characteristic::EsrMinimum => (false, true),
        Characteristic::Srf
        | Characteristic::Esl
        | Characteristic::FittedCapacitance
        | Characteristic::FittedResistance => (false, false),
    }
}

fn place(
    reader: &mut Reader<'_>,
    characteristic: Characteristic,
    fields: &Fields<'_>,
) -> Option<Place> {
    let (takes_at, takes_between) = takes(characteristic);
    let name = characteristic.name();
    let at = fields.entry("at");
    let between = fields.entry("between");
    let mut misplaced = false;
    for (given, taken, word) in [(at, takes_at, "at"), (between, takes_between, "between")] {
        if let (Some((key, _)), false) = (given, taken) {
            misplaced = true;
            let hint = misplaced_hint(characteristic, word);
            let found = format!("`{word}` for `{name}`");
            let expected = format!("`{name}` without `{word}`");
            reader.fault(
                key.span,
                "misplaced_key",
                found,
                expected,
                Some(hint.to_owned()),
            );
        }
    }
    match (at, between) {
        _ if misplaced => None,
        (Some(_), Some((key, _))) => {
            reader.fault(
                key.span,
                "at_and_between",
                "both `at` and `between`",
                "one of the two",
                Some("make two bounds of it, in a list".to_owned()),
            );
            None
        }
        (Some((_, node)), None) => frequency(reader, node, "`at`").map(Place::At),
        (None, Some((_, node))) => band(reader, node),
        (None, None) if takes_at => {
            missing_at(reader, name, takes_between, fields);
            None
        }
        (None, None) => Some(Place::Anywhere),
    }
}

fn misplaced_hint(characteristic: Characteristic, word: &str) -> &'static str {
    match (characteristic, word) {
        (Characteristic::EsrMinimum, _) => {
            "to bound the ESR at a frequency, use `esr`; to say where to look, use `between`"
        }
        (c, _) if takes(c) == (false, false) => "delete it: the whole sweep is looked at",
        _ => "give one frequency with `at`; several in a list of bounds",
    }
}

fn missing_at(reader: &mut Reader<'_>, name: &str, takes_between: bool, fields: &Fields<'_>) {
    let near = |key: &str| matches!(key, "frequency" | "freq" | "f" | "a" | "att" | "At" | "AT");
    if fields.iter().any(|(key, ..)| near(key)) {
        return;
    }
    let expected = if takes_between {
        "`at` with a frequency, or `between` with two"
    } else {
        "`at` with a frequency"
    };
    reader.fault(
        fields.span,
        "missing_at",
        format!("a bound of `{name}` that does not say at which frequency"),
        expected,
        Some("add for example `at: 1 kHz`".to_owned()),
    );
}

fn frequency(reader: &mut Reader<'_>, node: &Node, what: &str) -> Option<f64> {
    let hertz = reader.quantity(node, what, Dimension::Frequency)?;
    if (LOWEST_FREQUENCY..=HIGHEST_FREQUENCY).contains(&hertz) {
        return Some(hertz);
    }
    let low = shortest(LOWEST_FREQUENCY, "Hz");
    let high = shortest(HIGHEST_FREQUENCY, "Hz");
    let hint = if matches!(&node.shape, Shape::Text { text, .. } if text.contains("mHz")) {
        Some("`mHz` is millihertz; megahertz is `MHz`".to_owned())
    } else {
        Some("check the unit".to_owned())
    };
    reader.fault(
        node.span,
        "frequency_outside",
        format!("{} for {what}, outside of any sweep", shown(node)),
        format!("a frequency from {low} to {high}"),
        hint,
    );
    None
}

fn band(reader: &mut Reader<'_>, node: &Node) -> Option<Place> {
    let Shape::List(ends) = &node.shape else {
        band_shape(reader, node, &node.shape.words());
        return None;
    };
    let [low, high] = ends.as_slice() else {
        band_shape(reader, node, &format!("{} frequencies", ends.len()));
        return None;
    };
    let from = frequency(reader, low, "`between`");
    let to = frequency(reader, high, "`between`");
    let (from, to) = (from?, to?);
    if from < to {
        return Some(Place::Between(from, to));
    }
    reader.fault(
        low.span,
        "reversed",
        format!("`between` from {} to {}", shown(low), shown(high)),
        "the lower frequency first, then a higher one",
        Some(format!("write [{}, {}]", bare(high), bare(low))).filter(|_| from > to),
    );
    None
}

fn band_shape(reader: &mut Reader<'_>, node: &Node, found: &str) {
    reader.fault(
        node.span,
        "bad_band",
        format!("`between` with {found}"),
        "two frequencies, the lower one first",
        Some("write for example `between: [700 kHz, 4 MHz]`".to_owned()),
    );
}

fn bare(node: &Node) -> String {
    shown(node).trim_matches('`').to_owned()
}

struct Resolved {
    lower: Option<f64>,
    upper: Option<f64>,
    nominal: Option<f64>,
}

fn window(
    reader: &mut Reader<'_>,
    characteristic: Characteristic,
    fields: &Fields<'_>,
) -> Option<Resolved> {
    let before = reader.count();
    let lower = value(reader, characteristic, fields, "min");
    let upper = value(reader, characteristic, fields, "max");
    let nominal = value(reader, characteristic, fields, "nominal");
    let tolerance = fields.entry("tolerance");
    if let Some((key, node)) = tolerance {
        if let Some(other) = ["min", "max"].into_iter().find(|k| fields.get(k).is_some()) {
            two_ways(reader, key.span, other);
            return None;
        }
        if fields.get("nominal").is_none() {
            tolerance_alone(reader, key.span);
            return None;
        }
        let (lower, upper) = around(reader, characteristic, node, nominal)?;
        return Some(Resolved {
            lower: Some(lower),
            upper: Some(upper),
            nominal,
        })
        .filter(|_| reader.count() == before);
    }
    let resolved = Resolved {
        lower,
        upper,
        nominal,
    };
    check_order(reader, fields, &resolved);
    if reader.count() == before && lower.is_none() && upper.is_none() {
        bounds_nothing(reader, fields);
    }
    (reader.count() == before).then_some(resolved)
}

/// `min`, `max` or `nominal` in SI. A limit that no capacitor can meet or break is a fault.
fn value(
    reader: &mut Reader<'_>,
    characteristic: Characteristic,
    fields: &Fields<'_>,
    key: &str,
) -> Option<f64> {
    let node = fields.get(key)?;
    let what = format!("`{key}`");
    let dimension = dimension(characteristic);
    let name = characteristic.title();
    if dimension == Dimension::Ratio {
        // tan δ = 1 is a phase of 45°: no longer a capacitor to be bounded by its losses.
        let expected = format!("a {name} above 0 and at most 100 %");
        let possible = |v: f64| v > 0.0 && v <= 1.0;
        return reader.quantity_if(node, &what, dimension, possible, &expected);
    }
    let expected = format!("a {name} above zero");
    reader.quantity_if(node, &what, dimension, |v| v > 0.0, &expected)
}

/// The dimension of a characteristic.
pub fn dimension(characteristic: Characteristic) -> Dimension {
    match characteristic {
        Characteristic::Capacitance | Characteristic::FittedCapacitance => Dimension::Capacitance,
        Characteristic::DissipationFactor => Dimension::Ratio,
        Characteristic::Esr
        | Characteristic::Impedance
        | Characteristic::EsrMinimum
        | Characteristic::FittedResistance => Dimension::Resistance,
        Characteristic::Srf => Dimension::Frequency,
        Characteristic::Esl => Dimension::Inductance,
    }
}

fn two_ways(reader: &mut Reader<'_>, span: Span, other: &str) {
    reader.fault(
        span,
        "two_ways",
        format!("`tolerance` beside `{other}`"),
        "either `nominal` with `tolerance`, or `min` and `max`",
        Some(format!("delete `tolerance` or `{other}`")),
    );
}

fn tolerance_alone(reader: &mut Reader<'_>, span: Span) {
    reader.fault(
        span,
        "tolerance_without_nominal",
        "`tolerance` without `nominal`",
        "the value that the tolerance is of",
        Some("add `nominal`, or write `min` and `max` instead".to_owned()),
    );
}

fn bounds_nothing(reader: &mut Reader<'_>, fields: &Fields<'_>) {
    let hint = if fields.get("nominal").is_some() {
        "add `tolerance`, `min` or `max`"
    } else {
        "add `min`, `max`, or `nominal` with `tolerance`"
    };
    let misspelt = |key: &str| !KEYS.contains(&key);
    if fields.iter().any(|(key, ..)| misspelt(key)) {
        return;
    }
    reader.fault(
        fields.span,
        "no_limit",
        "a bound without a limit",
        "`min`, `max`, both, or `nominal` with `tolerance`",
        Some(hint.to_owned()),
    );
}

fn around(
    reader: &mut Reader<'_>,
    characteristic: Characteristic,
    node: &Node,
    nominal: Option<f64>,
) -> Option<(f64, f64)> {
    let tolerance = reader.tolerance(node, dimension(characteristic), nominal)?;
    let nominal = nominal?;
    let (lower, upper) = tolerance.limits(nominal);
    let fault = if !(lower.is_finite() && upper.is_finite() && lower < upper) {
        Some("that leaves no room between its limits")
    } else if lower > nominal || upper < nominal {
        Some("that does not contain the nominal value")
    } else if lower <= 0.0 {
        Some("whose lower limit is not above zero")
    } else {
        None
    };
    let Some(fault) = fault else {
        return Some((lower, upper));
    };
    reader.fault(
        node.span,
        "impossible_tolerance",
        format!("the tolerance {} {fault}", shown(node)),
        "deviations below and above nominal that leave a positive window",
        Some("write for example `±10 %` or `+80 % / -20 %`".to_owned()),
    );
    None
}

fn check_order(reader: &mut Reader<'_>, fields: &Fields<'_>, window: &Resolved) {
    let pairs = [
        ("min", window.lower, "max", window.upper),
        ("min", window.lower, "nominal", window.nominal),
        ("nominal", window.nominal, "max", window.upper),
    ];
    for (low_key, low, high_key, high) in pairs {
        let (Some(low), Some(high)) = (low, high) else {
            continue;
        };
        let strict = (low_key, high_key) == ("min", "max");
        if low < high || (low == high && !strict) {
            continue;
        }
        let (Some(low_node), Some(high_node)) = (fields.get(low_key), fields.get(high_key)) else {
            continue;
        };
        let relation = if low == high { "equal to" } else { "above" };
        reader.fault(
            low_node.span,
            if strict {
                "min_above_max"
            } else {
                "nominal_outside"
            },
            format!(
                "`{low_key}` {} {relation} `{high_key}` {}",
                shown(low_node),
                shown(high_node)
            ),
            format!("`{low_key}` below `{high_key}`"),
            Some("check digits and units of the two".to_owned()),
        );
        return;
    }
}
