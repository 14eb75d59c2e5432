//! The number at the front of a quantity, kept decimal until its unit is known.
//!
//! `4.7 µF` becomes the text `4.7e-6` and then the nearest `f64`: multiplying 4.7 by 1e-6 could
//! miss it by a unit in the last place, and a nominal value must be exactly what was typed.

/// A decimal number as written.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Decimal {
    pub negative: bool,
    /// Digits with at most one point.
    mantissa: String,
    exponent: i32,
}

/// Why the front of a text is not a number.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum NumberFault {
    /// There are no digits where a number should begin.
    None,
    /// A decimal comma or thousands separators; the numbers it may have meant.
    Separators(Vec<String>, String),
}

/// Beyond what an `f64` can hold.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum OutOfRange {
    TooLarge,
    TooSmall,
}

/// Letters that stand in place of the decimal point (IEC 60062 clause on the RKM code, and the
/// same notation for volts and amperes).
const POINT_LETTERS: &str = "pnuµmkKMGTRFHVAUNP";

impl Decimal {
    /// The value times 10^`exponent`; finite, and zero only when every digit is zero.
    pub fn value(&self, exponent: i32) -> Result<f64, OutOfRange> {
        let sign = if self.negative { "-" } else { "" };
        let text = format!("{sign}{}e{}", self.mantissa, self.exponent + exponent);
        let value: f64 = text.parse().unwrap_or(f64::INFINITY);
        if !value.is_finite() {
            Err(OutOfRange::TooLarge)
        } else if value == 0.0 && !self.is_zero() {
            Err(OutOfRange::TooSmall)
        } else {
            Ok(value)
        }
    }

    pub fn is_zero(&self) -> bool {
        !self.mantissa.contains(|c| matches!(c, '1'..='9'))
    }
}

/// Splits a cleaned text into its number and the unit that follows (spaces removed); the letter of
/// an RKM code (`4u7F`) is given as the unit's first character (`uF`).
pub(super) fn split(text: &str) -> Result<(Decimal, String), NumberFault> {
    let negative = text.starts_with('-');
    let body = text.strip_prefix(['-', '+']).unwrap_or(text).trim_start();
    if let Some((mantissa, unit)) = split_point_letter(body) {
        let exponent = 0;
        return Ok((
            Decimal {
                negative,
                mantissa,
                exponent,
            },
            unit,
        ));
    }
    let (digits, rest) = body.split_at(run_length(body));
    if !digits.contains(|c: char| c.is_ascii_digit()) {
        return Err(NumberFault::None);
    }
    let (exponent, rest) = exponent(rest);
    if !is_plain(digits) {
        let sign = if negative { "-" } else { "" };
        let meant = super::separators::meant(digits);
        let meant = meant.into_iter().map(|m| format!("{sign}{m}")).collect();
        return Err(NumberFault::Separators(meant, rest.trim().to_string()));
    }
    let mantissa = digits.to_string();
    let unit = super::text::without_spaces(rest);
    Ok((
        Decimal {
            negative,
            mantissa,
            exponent,
        },
        unit,
    ))
}

/// Length in bytes of the leading run of digits, points and separators.
fn run_length(text: &str) -> usize {
    let mut end = 0;
    let mut after_digit = false;
    let mut characters = text.char_indices().peekable();
    while let Some((start, c)) = characters.next() {
        let next_is_digit = characters.peek().is_some_and(|(_, n)| n.is_ascii_digit());
        let belongs = match c {
            '0'..='9' | '.' => true,
            ',' | '\'' | '’' | '_' | ' ' => after_digit && next_is_digit,
            _ => false,
        };
        if !belongs {
            break;
        }
        after_digit = c.is_ascii_digit();
        end = start + c.len_utf8();
    }
    end
}

fn is_plain(digits: &str) -> bool {
    digits.chars().all(|c| c.is_ascii_digit() || c == '.') && digits.matches('.').count() <= 1
}

/// Reads `e-6` off the front; a lone `e` is left for the unit.
fn exponent(text: &str) -> (i32, &str) {
    let none = (0, text);
    let Some(after) = text.strip_prefix(['e', 'E']) else {
        return none;
    };
    let negative = after.starts_with('-');
    let digits = after.strip_prefix(['-', '+']).unwrap_or(after);
    let length = digits.bytes().take_while(u8::is_ascii_digit).count();
    if length == 0 {
        return none;
    }
    let (digits, rest) = digits.split_at(length);
    // A text is at most a hundred or so digits long, so this is beyond any f64 either way.
    let size = digits.parse::<i32>().unwrap_or(i32::MAX).min(10_000);
    (if negative { -size } else { size }, rest)
}

/// `4u7F` → (`4.7`, `uF`); `R47` → (`0.47`, `R`).
fn split_point_letter(text: &str) -> Option<(String, String)> {
    let whole_length = text.bytes().take_while(u8::is_ascii_digit).count();
    let (whole, rest) = text.split_at(whole_length);
    let letter = rest.chars().next().filter(|c| POINT_LETTERS.contains(*c))?;
    let rest = rest.strip_prefix(letter)?;
    let fraction_length = rest.bytes().take_while(u8::is_ascii_digit).count();
    if fraction_length == 0 {
        return None;
    }
    let (fraction, rest) = rest.split_at(fraction_length);
    let whole = if whole.is_empty() { "0" } else { whole };
    let unit = format!("{letter}{}", super::text::without_spaces(rest));
    Some((format!("{whole}.{fraction}"), unit))
}
