//! What a number with a decimal comma or thousands separators was probably meant to be.
//!
//! Both are refused rather than guessed: `1,000` is a thousand in one country and one in another.

/// The plain numbers that `digits` may have meant, likeliest first; empty when there is no telling.
pub(super) fn meant(digits: &str) -> Vec<String> {
    let commas = digits.matches(',').count();
    let points = digits.matches('.').count();
    let others = digits.contains(|c: char| !c.is_ascii_digit() && c != ',' && c != '.');
    match (commas, points) {
        _ if others => grouped_otherwise(digits),
        (1, 0) => one_comma(digits),
        (_, 0) => if_grouped(digits, ',', "").into_iter().collect(),
        (0, _) => if_grouped(digits, '.', "").into_iter().collect(),
        _ => both(digits),
    }
}

fn one_comma(digits: &str) -> Vec<String> {
    let decimal = digits.replace(',', ".");
    match if_grouped(digits, ',', "") {
        Some(thousands) if !digits.starts_with('0') => vec![thousands, decimal],
        _ => vec![decimal],
    }
}

/// Commas and points: the last of them is the decimal mark if it stands alone.
fn both(digits: &str) -> Vec<String> {
    let comma_is_decimal = digits.rfind(',') > digits.rfind('.');
    let (group, decimal) = if comma_is_decimal {
        ('.', ',')
    } else {
        (',', '.')
    };
    let Some((whole, fraction)) = digits.split_once(decimal) else {
        return Vec::new();
    };
    if !fraction.chars().all(|c| c.is_ascii_digit()) {
        return Vec::new();
    }
    if_grouped(whole, group, &format!(".{fraction}"))
        .into_iter()
        .collect()
}

/// Space, apostrophe or underscore between the thousands.
fn grouped_otherwise(digits: &str) -> Vec<String> {
    let (whole, fraction) = match digits.find(['.', ',']) {
        Some(at) => digits.split_at(at),
        None => (digits, ""),
    };
    let fraction = fraction.replacen(',', ".", 1);
    if fraction.contains(|c: char| !c.is_ascii_digit() && c != '.') {
        return Vec::new();
    }
    if fraction.matches('.').count() > 1 {
        return Vec::new();
    }
    let separator = whole.chars().find(|c| !c.is_ascii_digit()).unwrap_or(' ');
    if_grouped(whole, separator, &fraction)
        .into_iter()
        .collect()
}

/// The digits without `separator` and with `tail`, if the groups are of three digits.
fn if_grouped(digits: &str, separator: char, tail: &str) -> Option<String> {
    let mut groups = digits.split(separator);
    let first = groups.next().unwrap_or_default();
    let is_number = |group: &str| group.chars().all(|c| c.is_ascii_digit());
    let right = (1..=3).contains(&first.len())
        && is_number(first)
        && groups.all(|group| group.len() == 3 && is_number(group));
    right.then(|| format!("{}{tail}", digits.replace(separator, "")))
}
