//! Short texts: what a scanner types, and quantities with their units.

use reelgate::label as labels;
use reelgate::quantity::{
    Dimension, capacitance_code, find_capacitances, frequency_key, parse, parse_tolerance,
    parse_window, shortest,
};

/// The text of a label.
pub fn label(bytes: &[u8]) {
    let Ok(text) = std::str::from_utf8(bytes) else {
        return;
    };
    let label = match labels::read(text) {
        Ok(label) => label,
        Err(error) => return assert!(!error.notes.is_empty()),
    };
    assert!(!label.fields.is_empty());
    for (identifier, value) in &label.fields {
        assert!(!identifier.is_empty() && !value.is_empty());
        assert!(!value.contains(char::is_control), "{value:?}");
    }
    let _ = (
        label.part(),
        label.lot(),
        label.quantity(),
        label.supplier(),
        label.order(),
    );
    if let Some(code) = label.date_code().one() {
        labels::weeks(code);
    }
    // Written out, the fields read back as they are.
    if label.confirm.is_empty() {
        let again = labels::read(&labels::write(&label.fields)).map(|label| label.fields);
        assert_eq!(again.as_ref(), Ok(&label.fields), "{text:?}");
    }
}

/// A quantity, a tolerance or a window; the first byte says of which dimension.
pub fn quantity(bytes: &[u8]) {
    let Some((which, bytes)) = bytes.split_first() else {
        return;
    };
    let Ok(text) = std::str::from_utf8(bytes) else {
        return;
    };
    let dimension = Dimension::ALL[usize::from(*which) % Dimension::ALL.len()];
    match parse(text, dimension) {
        Ok(value) => {
            assert!(value.is_finite(), "{text:?} {value}");
            let shown = shortest(value, dimension.unit());
            let again = parse(&shown, dimension);
            // Twelve digits are shown.
            let near = |again: &f64| (again - value).abs() <= 2e-11 * value.abs();
            assert!(
                again.as_ref().is_ok_and(near),
                "{text:?} {value:e} {shown:?} {again:?}"
            );
            if dimension == Dimension::Frequency {
                frequency_key(value);
            }
        }
        Err(error) => assert!(!error.to_string().is_empty()),
    }
    if let Ok((lower, upper)) = parse_window(text, dimension) {
        assert!(
            lower.is_finite() && upper.is_finite() && lower < upper,
            "{text:?}"
        );
    }
    if let Ok(tolerance) = parse_tolerance(text, dimension, Some(1.0)) {
        let (lower, upper) = tolerance.limits(1.0);
        assert!(lower <= upper, "{text:?} {lower} {upper}");
    }
    assert!(capacitance_code(text).iter().all(|c| c.is_finite()));
    assert!(find_capacitances(text).iter().all(|c| c.is_finite()));
}
