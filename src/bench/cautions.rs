//! What a person should be careful of with this part, from what its limit file says.
//!
//! Common practice, no source; local rules and qualified staff come first, and the words say so.

use super::words;
use crate::limits::Limits;
use crate::quantity::{Dimension, engineering, parse};
use crate::readings::Characteristic;

/// Words of a description that name a polarised kind.
const POLARISED: [&str; 6] = [
    "electrolytic",
    "aluminium",
    "aluminum",
    "tantalum",
    "niobium",
    "polymer",
];

/// The cautions that apply, most general first.
pub fn cautions(limits: &Limits) -> Vec<String> {
    let description = limits.description.as_deref().unwrap_or_default();
    let lower = description.to_lowercase();
    let mut all = vec![match stored(limits, description) {
        Some((volts, joules)) => words::charge_of(&volts, &joules),
        None => words::CHARGE.to_owned(),
    }];
    if POLARISED.iter().any(|word| lower.contains(word)) {
        all.push(words::POLARISED.to_owned());
    }
    if lower.contains("bias") {
        all.push(words::BIAS.to_owned());
    }
    all
}

/// The energy at the voltage that the description names: its words for voltage and energy.
fn stored(limits: &Limits, description: &str) -> Option<(String, String)> {
    let capacitance = limits
        .bounds
        .iter()
        .find(|b| b.characteristic == Characteristic::Capacitance)?
        .nominal?;
    let words: Vec<&str> = description
        .split(|c: char| c.is_whitespace() || c == ',')
        .filter(|w| !w.is_empty())
        .collect();
    let volts = words.windows(2).find_map(|pair| {
        let [number, unit] = pair else { return None };
        let text = if *unit == "V" {
            format!("{number} V")
        } else {
            (*number).to_owned()
        };
        parse(&text, Dimension::Voltage).ok()
    })?;
    let joules = 0.5 * capacitance * volts * volts;
    // Less than a tenth of a joule startles; its number would only distract.
    (joules >= 0.1).then(|| (engineering(volts, "V", 3), engineering(joules, "J", 2)))
}
