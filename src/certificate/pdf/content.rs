//! The bytes of a page's content stream (ISO 32000-1, 7.8.2 and annex A): operators and their
//! operands, nothing of what they mean.

/// A length in hundredths of a point: finer than any printer, and short in the file.
pub(super) fn hundredths(value: f64) -> i64 {
    // What is not a number or off any page must never be in a content stream.
    if value.is_finite() {
        (value.clamp(-5000.0, 5000.0) * 100.0).round() as i64
    } else {
        0
    }
}

/// A content stream while it grows.
#[derive(Default)]
pub(super) struct Content {
    pub bytes: Vec<u8>,
}

impl Content {
    /// An operand that is written as it is, and a space.
    pub fn raw(&mut self, operand: &str) -> &mut Self {
        self.bytes.extend_from_slice(operand.as_bytes());
        self.bytes.push(b' ');
        self
    }

    /// A name of letters.
    pub fn name(&mut self, name: &str) -> &mut Self {
        self.bytes.push(b'/');
        self.raw(name)
    }

    /// A whole number.
    pub fn integer(&mut self, value: usize) -> &mut Self {
        decimal(&mut self.bytes, i64::try_from(value).unwrap_or(i64::MAX), 0);
        self.bytes.push(b' ');
        self
    }

    /// A number given in hundredths.
    pub fn number(&mut self, hundredths: i64) -> &mut Self {
        decimal(&mut self.bytes, hundredths, 2);
        self.bytes.push(b' ');
        self
    }

    /// A colour component, 0 to 1, in thousandths.
    pub fn share(&mut self, value: f64) -> &mut Self {
        let thousandths = (value.clamp(0.0, 1.0) * 1000.0).round() as i64;
        decimal(&mut self.bytes, thousandths, 3);
        self.bytes.push(b' ');
        self
    }

    /// Glyphs by their numbers, two bytes each, in hexadecimal digits.
    pub fn glyphs(&mut self, glyphs: impl Iterator<Item = u16>) -> &mut Self {
        const DIGITS: &[u8; 16] = b"0123456789ABCDEF";
        self.bytes.push(b'<');
        for glyph in glyphs {
            for shift in [12, 8, 4, 0] {
                self.bytes.push(DIGITS[usize::from(glyph >> shift & 15)]);
            }
        }
        self.bytes.push(b'>');
        self
    }

    /// Ends an operation.
    pub fn operator(&mut self, name: &str) {
        self.bytes.extend_from_slice(name.as_bytes());
        self.bytes.push(b'\n');
    }
}

/// A number given in units of so many decimal places, without zeros at its end.
fn decimal(out: &mut Vec<u8>, value: i64, places: u32) {
    if value < 0 {
        out.push(b'-');
    }
    let unit = 10u64.pow(places);
    let (whole, mut rest) = (value.unsigned_abs() / unit, value.unsigned_abs() % unit);
    if whole > 0 || rest == 0 {
        natural(out, whole);
    }
    if rest > 0 {
        out.push(b'.');
    }
    let mut place = unit;
    while rest > 0 {
        place /= 10;
        out.push(b'0' + (rest / place) as u8);
        rest %= place;
    }
}

/// Digits of a whole number.
pub(super) fn natural(out: &mut Vec<u8>, value: u64) {
    let mut digits = [0u8; 20];
    let mut rest = value;
    let mut first = digits.len();
    for (index, digit) in digits.iter_mut().enumerate().rev() {
        *digit = b'0' + (rest % 10) as u8;
        rest /= 10;
        first = index;
        if rest == 0 {
            break;
        }
    }
    out.extend_from_slice(&digits[first..]);
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn written(value: i64, places: u32) -> String {
        let mut out = Vec::new();
        decimal(&mut out, value, places);
        String::from_utf8(out).expect("digits")
    }

    #[test]
    fn numbers_are_as_short_as_they_can_be() {
        for (value, text) in [
            (0, "0"),
            (5, ".05"),
            (-5, "-.05"),
            (50, ".5"),
            (100, "1"),
            (-12_345, "-123.45"),
            (84_189, "841.89"),
        ] {
            assert_eq!(written(value, 2), text);
        }
        assert_eq!(hundredths(f64::NAN), 0);
        assert_eq!(hundredths(f64::INFINITY), 0);
        assert_eq!(hundredths(1e300), 500_000);
    }

    proptest! {
        #[test]
        fn a_number_reads_back_as_it_was(value in -10_000_000i64..10_000_000, places in 0u32..4) {
            let read: f64 = written(value, places).parse().expect("a number");
            prop_assert_eq!((read * 10f64.powi(places as i32)).round() as i64, value);
        }
    }
}
