//! A number rounded in decimal, without touching its binary value.

/// A finite number in decimal: `digits` with the point after the first, times 10^`exponent`.
pub(super) struct Rounded {
    pub negative: bool,
    pub digits: String,
    pub exponent: i32,
}

/// Rounds to significant digits, exactly and half to even.
pub(super) fn round(value: f64, digits: usize) -> Rounded {
    let places = digits.clamp(1, 17) - 1;
    parse_scientific(&format!("{value:.places$e}"))
}

/// Takes `-4.683e-6` apart.
pub(super) fn parse_scientific(text: &str) -> Rounded {
    let (mantissa, exponent) = text.split_once('e').unwrap_or((text, "0"));
    let digits: String = mantissa.chars().filter(char::is_ascii_digit).collect();
    let zero = digits.chars().all(|c| c == '0');
    Rounded {
        negative: mantissa.starts_with('-') && !zero,
        digits: if zero { "0".to_string() } else { digits },
        exponent: exponent.parse().unwrap_or(0),
    }
}

impl Rounded {
    /// Drops trailing zeros.
    pub(super) fn trim(&mut self) {
        let kept = self.digits.trim_end_matches('0').len().max(1);
        self.digits.truncate(kept);
    }

    /// Plain decimal notation of the number divided by 10^`shift`.
    pub(super) fn plain(&self, shift: i32) -> String {
        let sign = if self.negative { "-" } else { "" };
        let point = self.exponent - shift + 1;
        let digits = &self.digits;
        match usize::try_from(point) {
            Ok(0) | Err(_) => {
                let zeros = "0".repeat(usize::try_from(-point).unwrap_or(0));
                format!("{sign}0.{zeros}{digits}")
            }
            Ok(point) if point >= digits.len() => {
                format!("{sign}{digits}{}", "0".repeat(point - digits.len()))
            }
            Ok(point) => {
                let (whole, fraction) = digits.split_at(point);
                format!("{sign}{whole}.{fraction}")
            }
        }
    }

    /// `d.ddde-20`.
    pub(super) fn scientific(&self) -> String {
        format!("{}e{}", self.plain(self.exponent), self.exponent)
    }
}
