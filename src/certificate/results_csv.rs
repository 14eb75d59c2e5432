//! The readings as a CSV table (RFC 4180) for other programs: SI values, not rounded.

use crate::record::LotRecord;

const HEAD: [&str; 12] = [
    "part",
    "part_verdict",
    "characteristic",
    "value",
    "standard_uncertainty",
    "unit",
    "lower",
    "upper",
    "margin",
    "verdict",
    "above",
    "below",
];

/// One row a reading.
pub(super) fn results(record: &LotRecord) -> Vec<u8> {
    let mut out = HEAD.join(",");
    out.push_str("\r\n");
    for part in &record.parts {
        for (key, r) in &part.readings {
            let number = |v: Option<f64>| v.map_or_else(String::new, |v| format!("{v:e}"));
            let row = [
                field(&part.part),
                super::section::part_word(part.verdict).to_owned(),
                field(key),
                number(r.value),
                number(r.standard_uncertainty),
                field(&r.unit),
                number(r.lower),
                number(r.upper),
                number(r.margin),
                super::section::part_word(r.verdict).to_owned(),
                number(r.above),
                number(r.below),
            ];
            out.push_str(&row.join(","));
            out.push_str("\r\n");
        }
    }
    out.into_bytes()
}

/// A text field. One that a spreadsheet would take for a formula gets an apostrophe in front.
fn field(text: &str) -> String {
    let formula = text.starts_with(['=', '+', '-', '@', '\t', '\r']);
    let guarded = if formula {
        format!("'{text}")
    } else {
        text.to_owned()
    };
    if guarded.contains([',', '"', '\r', '\n']) {
        return format!("\"{}\"", guarded.replace('"', "\"\""));
    }
    guarded
}

#[cfg(test)]
mod tests {
    use super::field;

    #[test]
    fn text_cannot_act_as_a_formula_or_break_the_row() {
        assert_eq!(field("017"), "017");
        assert_eq!(field("=1+1"), "'=1+1");
        assert_eq!(field("a,\"b\"\n"), "\"a,\"\"b\"\"\n\"");
    }
}
