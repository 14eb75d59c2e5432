//! The label against what is known of the lot.

use super::{Found, Label, date_code};

/// What the lot is said to be; a field that is not known is not compared.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Expected<'a> {
    pub part: Option<&'a str>,
    pub lot: Option<&'a str>,
    pub quantity: Option<u64>,
    pub date_code: Option<&'a str>,
    /// The code that the site has given the supplier.
    pub supplier: Option<&'a str>,
    pub order: Option<&'a str>,
}

/// A field in which label and lot differ.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Mismatch {
    /// `part`, `lot`, `quantity`, `date_code`, `supplier`, `order`.
    pub field: &'static str,
    /// With the identifiers: `P 110-00417, 1P EQC0402X7R104K160`.
    pub on_label: String,
    pub expected: String,
}

/// Compares the fields that are on both sides, exactly as written.
///
/// The part agrees where the customer's (`P`) or the supplier's (`1P`) number is the expected one,
/// the lot where the supplier's (`1T`) or the customer's (`T`) is; the supplier is compared with the
/// customer's code (`V`) alone, since a supplier's own name for itself (`1V`) is another thing. Date
/// codes agree where both mean the same week. An identifier that is repeated with different values
/// agrees with nothing: a reel of two lots is not one lot.
pub fn compare(label: &Label, expected: &Expected) -> Vec<Mismatch> {
    let mut out = Vec::new();
    let same = |value: &str, wanted: &str| value == wanted;
    let mut text = |field, identifiers: &[&str], wanted: Option<&str>, agree: Agree| {
        if let Some(wanted) = wanted {
            out.extend(difference(label, field, identifiers, wanted, agree));
        }
    };
    text("part", &["P", "1P"], expected.part, &same);
    text("lot", &["1T", "T"], expected.lot, &same);
    let quantity = expected.quantity.map(|n| n.to_string());
    let pieces = |_: &str, wanted: &str| {
        label.quantity().one().map(|n| n.to_string()).as_deref() == Some(wanted)
    };
    text("quantity", &["Q", "7Q"], quantity.as_deref(), &pieces);
    text(
        "date_code",
        &["10D", "11D", "9D"],
        expected.date_code,
        &same_week,
    );
    text("supplier", &["V"], expected.supplier, &same);
    text("order", &["K"], expected.order, &same);
    out
}

type Agree<'a> = &'a dyn Fn(&str, &str) -> bool;

fn difference(
    label: &Label,
    field: &'static str,
    identifiers: &[&str],
    wanted: &str,
    agree: Agree,
) -> Option<Mismatch> {
    let found: Vec<(&str, Found<&str>)> = identifiers
        .iter()
        .map(|id| (*id, label.first_of(&[id])))
        .filter(|(_, found)| *found != Found::Absent)
        .collect();
    let agrees = found
        .iter()
        .any(|(_, value)| matches!(value, Found::One(one) if agree(one, wanted.trim())));
    if found.is_empty() || agrees {
        return None;
    }
    let words: Vec<String> = found.iter().map(|(id, value)| words(id, value)).collect();
    Some(Mismatch {
        field,
        on_label: words.join(", "),
        expected: wanted.to_owned(),
    })
}

fn words(identifier: &str, found: &Found<&str>) -> String {
    match found {
        Found::One(value) => format!("{identifier} {value}"),
        Found::Several(values) => format!("{identifier} {}", values.join(" and ")),
        Found::Absent | Found::Unreadable(_) => identifier.to_owned(),
    }
}

fn same_week(value: &str, wanted: &str) -> bool {
    let (a, b) = (date_code::weeks(value), date_code::weeks(wanted));
    value == wanted || (a.len() == 1 && a == b)
}
