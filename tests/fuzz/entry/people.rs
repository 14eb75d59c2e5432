//! Files that people write in YAML.

use reelgate::diagnostic::yaml::{self, Node, Shape};
use reelgate::diagnostic::{Faults, Source, as_json};
use reelgate::{limits as limit_file, lot as lot_file, site as site_file, station as station_file};
use serde_yaml::Value;
use std::sync::atomic::Ordering::Relaxed;

/// A limit file.
pub fn limits(bytes: &[u8]) {
    let Some(limits) = taken(bytes, limit_file::read("a.yaml", bytes)) else {
        return;
    };
    assert!(!limits.part.is_empty() && !limits.bounds.is_empty());
    for bound in &limits.bounds {
        let (lower, upper) = (bound.lower, bound.upper);
        assert!(lower.is_some() || upper.is_some(), "{bound:?}");
        let ends = [lower, upper, bound.nominal];
        assert!(
            ends.iter().flatten().all(|end| end.is_finite()),
            "{bound:?}"
        );
        if let (Some(lower), Some(upper)) = (lower, upper) {
            assert!(lower <= upper, "{bound:?}");
        }
    }
    let mut keys: Vec<&str> = limits.bounds.iter().map(|b| b.key.as_str()).collect();
    keys.sort_unstable();
    keys.dedup();
    assert_eq!(keys.len(), limits.bounds.len(), "keys are unique");
    assert!(limits.decision_rule.coverage_factor.is_finite());
}

/// A station file.
pub fn station(bytes: &[u8]) {
    let Some(station) = taken(bytes, station_file::read("a.yaml", bytes)) else {
        return;
    };
    assert!(!station.name.is_empty());
    let with_reference = station.method == station_file::Method::SeriesReference;
    assert_eq!(station.reference.is_some(), with_reference);
    if let Some(reference) = station.reference {
        assert!(reference.resistance.is_finite() && reference.resistance > 0.0);
        assert!(reference.tolerance.is_finite() && reference.inductance.is_finite());
    }
    let stated = [station.uncertainty.magnitude, station.uncertainty.phase];
    assert!(stated.iter().flatten().all(|u| u.is_finite() && *u >= 0.0));
    for standard in [
        &station.compensation.open,
        &station.compensation.short,
        &station.compensation.load,
    ]
    .into_iter()
    .flatten()
    {
        let is = [
            standard.resistance,
            standard.inductance,
            standard.capacitance,
        ];
        assert!(is.iter().all(|v| v.is_finite()), "{standard:?}");
        assert!(
            !standard.sweep.split('/').any(|part| part == ".."),
            "{standard:?}"
        );
    }
}

/// A lot file.
pub fn lot(bytes: &[u8]) {
    let Some(lot) = taken(bytes, lot_file::read("a.yaml", bytes)) else {
        return;
    };
    assert!(!lot.lot.is_empty() && lot.quantity >= 1);
    let numbers = [lot.temperature, lot.humidity, lot.drive];
    assert!(numbers.iter().flatten().all(|v| v.is_finite()), "{lot:?}");
    assert!(!lot.sweeps.starts_with('/') && !lot.sweeps.split('/').any(|p| p == ".."));
    assert!(lot.age_hours().is_none_or(f64::is_finite));
}

/// A site file.
pub fn site(bytes: &[u8]) {
    let Some(site) = taken(bytes, site_file::read("a.yaml", bytes)) else {
        return;
    };
    for key in &site.trusted_keys {
        assert!(!key.key.name().is_empty());
        assert!(!key.counts_at(0) || key.from_entry == 0, "{key:?}");
        assert_eq!(site.trusted(key.key.name()), Some(key), "names are unique");
    }
}

/// What was read. Where inputs are many, the faults of some alone (chosen by their bytes) are shown and
/// the two YAML readers compared: that costs more than reading them.
fn taken<T>(bytes: &[u8], read: Result<T, Faults>) -> Option<T> {
    let chosen = super::THOROUGH.load(Relaxed)
        || bytes.iter().fold(0_u8, |sum, b| sum.wrapping_add(*b)) < 16;
    match read {
        Ok(value) => {
            if chosen {
                both_readers_agree(bytes);
            }
            Some(value)
        }
        Err(faults) => {
            assert!(faults.count() > 0);
            if chosen {
                show(&faults);
            }
            None
        }
    }
}

fn show(faults: &Faults) {
    for line in faults.to_string().lines() {
        assert!(!line.chars().any(char::is_control), "{line:?}");
    }
    assert!(as_json(faults).is_array());
}

/// Every scalar of the tree is what serde_yaml has at the same path, and stands where it says.
fn both_readers_agree(bytes: &[u8]) {
    let source = Source::new("a.yaml", bytes).expect("was read before");
    let tree = yaml::parse(&source).expect("was read before");
    let value: Value = match serde_yaml::from_str(source.text()) {
        Ok(value) => value,
        // This reader's tree has no integer of more than 64 bits; ours keeps what is written.
        Err(error) if error.to_string().contains("as u128") => return,
        Err(error) if error.to_string().contains("as i128") => return,
        Err(error) => panic!("was read before: {error}"),
    };
    same(&source, &tree, &value);
}

fn same(source: &Source, node: &Node, value: &Value) {
    match (&node.shape, value) {
        (Shape::List(items), Value::Sequence(values)) => {
            assert_eq!(items.len(), values.len());
            for (item, value) in items.iter().zip(values) {
                same(source, item, value);
            }
        }
        (Shape::Map(entries), Value::Mapping(values)) => {
            assert_eq!(entries.len(), values.len());
            for ((key, item), (other, value)) in entries.iter().zip(values) {
                same(source, key, other);
                same(source, item, value);
            }
        }
        (Shape::Null, Value::Null) => {}
        (Shape::Bool(text), Value::Bool(flag)) => {
            assert_eq!(text.eq_ignore_ascii_case("true"), *flag);
        }
        (Shape::Number(_, number), Value::Number(other)) => {
            assert_eq!(Some(*number), other.as_f64());
        }
        (Shape::Text { text, quoted }, Value::String(other)) => {
            assert_eq!(text, other);
            if !quoted && !text.contains('\n') {
                stands_there(source, node, text);
            }
        }
        (shape, value) => panic!("{shape:?} and {value:?}"),
    }
}

/// A plain text of one line is what the file has at its place.
fn stands_there(source: &Source, node: &Node, text: &str) {
    let span = node.span;
    let line = source.line(span.line);
    let marked: String = line
        .chars()
        .skip(span.column - 1)
        .take(span.length)
        .collect();
    // A text that goes on over lines has only its first one marked.
    assert!(
        text.starts_with(marked.trim()),
        "{text:?} at {span:?} of {line:?}"
    );
}
