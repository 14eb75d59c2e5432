//! Numbers with a decimal point or a decimal comma.

/// The decimal mark seen so far in a table.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Mark {
    Unknown,
    Point,
    Comma,
}

/// Why a field is no number.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Fault {
    Empty,
    /// NaN, infinity, or the 9.9E37 with which instruments say so (SCPI-99 volume 1, 7.2.1).
    NotFinite,
    Text,
    /// A decimal comma among decimal points or the other way round.
    Mixed,
}

/// The magnitude from which a number is an instrument's sign for overload or "no number".
const OVERLOAD: f64 = 9.9e37;

/// Reads one number and learns the decimal mark from it.
pub(super) fn parse(field: &[u8], mark: &mut Mark, comma_allowed: bool) -> Result<f64, Fault> {
    if let Some((value, has_point)) = plain(field) {
        if has_point && *mark != Mark::Point {
            learn(mark, Mark::Point)?;
        }
        return Ok(value);
    }
    match fast_float2::parse::<f64, _>(field) {
        Ok(value) if value.abs() < OVERLOAD => {
            if *mark != Mark::Point && field.contains(&b'.') {
                learn(mark, Mark::Point)?;
            }
            Ok(value)
        }
        Ok(_) => Err(Fault::NotFinite),
        Err(_) => unusual(field, mark, comma_allowed),
    }
}

/// Powers of ten that a double holds exactly.
const POWERS: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16,
    1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
];

/// More digits than this may not fit into a double.
const DIGITS: usize = 15;

/// A field that is a [`leading`] number and nothing else, and whether it has a decimal point.
fn plain(field: &[u8]) -> Option<(f64, bool)> {
    let number = leading(field)?;
    (number.length == field.len()).then_some((number.value, number.has_point))
}

/// A number that a text begins with.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Leading {
    pub value: f64,
    pub has_point: bool,
    /// In bytes.
    pub length: usize,
}

/// The number at the beginning of a text, where it is one of few digits and a moderate exponent, as
/// instruments write them. Digits and power of ten are exact, so that one operation rounds correctly
/// (Clinger, How to read floating point numbers accurately, PLDI 1990); all other numbers are `None`.
/// No such number reaches `OVERLOAD`.
#[inline]
pub(super) fn leading(text: &[u8]) -> Option<Leading> {
    let (negative, start) = sign(text, 0);
    let (mantissa, mut at) = digits(text, start, 0);
    let (mut mantissa, mut count, mut decimals) = (mantissa, at - start, 0);
    let has_point = text.get(at) == Some(&b'.');
    if has_point {
        let from = at + 1;
        (mantissa, at) = digits(text, from, mantissa);
        decimals = at - from;
        count += decimals;
    }
    if count == 0 || count > DIGITS {
        return None;
    }
    let mut exponent = 0;
    if let Some(b'e' | b'E') = text.get(at) {
        let (negative, from) = sign(text, at + 1);
        (exponent, at) = digits(text, from, 0);
        if at == from || at - from > 3 {
            return None;
        }
        if negative {
            exponent = exponent.wrapping_neg();
        }
    }
    let power = (exponent as i64) - decimals as i64;
    let scale = POWERS.get(power.unsigned_abs() as usize)?;
    let size = mantissa as f64;
    let size = if power < 0 {
        size / scale
    } else {
        size * scale
    };
    Some(Leading {
        value: if negative { -size } else { size },
        has_point,
        length: at,
    })
}

/// Whether there is a minus at a place, and where to go on behind the sign.
#[inline(always)]
fn sign(text: &[u8], at: usize) -> (bool, usize) {
    match text.get(at) {
        Some(b'-') => (true, at + 1),
        Some(b'+') => (false, at + 1),
        _ => (false, at),
    }
}

/// A number goes on with the digits at a place; where they end.
#[inline(always)]
fn digits(text: &[u8], mut at: usize, mut number: u64) -> (u64, usize) {
    while let Some(digit) = text
        .get(at)
        .map(|b| b.wrapping_sub(b'0'))
        .filter(|d| *d < 10)
    {
        number = number.wrapping_mul(10).wrapping_add(u64::from(digit));
        at += 1;
    }
    (number, at)
}

#[cold]
fn unusual(field: &[u8], mark: &mut Mark, comma_allowed: bool) -> Result<f64, Fault> {
    if field.is_empty() {
        return Err(Fault::Empty);
    }
    let mut buffer = [0u8; 64];
    let Some(copy) = buffer.get_mut(..field.len()) else {
        return Err(Fault::Text);
    };
    copy.copy_from_slice(field);
    let commas = copy.iter().filter(|&&b| b == b',').count();
    if commas > 1 || commas == 1 && (!comma_allowed || copy.contains(&b'.')) {
        return Err(Fault::Text);
    }
    for byte in copy.iter_mut() {
        match byte {
            b',' => *byte = b'.',
            // Exponents of older programs.
            b'D' | b'd' => *byte = b'e',
            _ => {}
        }
    }
    match fast_float2::parse::<f64, _>(&*copy) {
        Ok(value) if value.abs() < OVERLOAD => {
            if commas == 1 {
                learn(mark, Mark::Comma)?;
            }
            Ok(value)
        }
        Ok(_) => Err(Fault::NotFinite),
        Err(_) if says_not_finite(field) => Err(Fault::NotFinite),
        Err(_) => Err(Fault::Text),
    }
}

/// `#NUM!`, `1.#IND`, `-1.#INF`, `1.#QNAN`: spellings of spreadsheets and older run-time libraries.
fn says_not_finite(field: &[u8]) -> bool {
    let upper = field.to_ascii_uppercase();
    [
        b"#NUM".as_slice(),
        b"#IND",
        b"#INF",
        b"#QNAN",
        b"#DIV",
        b"#N/A",
    ]
    .iter()
    .any(|sign| upper.windows(sign.len()).any(|window| window == *sign))
}

fn learn(mark: &mut Mark, seen: Mark) -> Result<(), Fault> {
    if *mark == Mark::Unknown {
        *mark = seen;
    }
    if *mark == seen {
        Ok(())
    } else {
        Err(Fault::Mixed)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn number(text: &str) -> Result<f64, Fault> {
        parse(text.as_bytes(), &mut Mark::Unknown, true)
    }

    #[test]
    fn numbers_of_all_kinds() {
        assert_eq!(number("1e3"), Ok(1000.0));
        assert_eq!(number("+1.5"), Ok(1.5));
        assert_eq!(number("-1,5E-3"), Ok(-1.5e-3));
        assert_eq!(number("1.5D2"), Ok(150.0));
        assert_eq!(number(""), Err(Fault::Empty));
        for text in [
            "NaN",
            "inf",
            "-Infinity",
            "9.9E37",
            "9.91E+37",
            "-1.#IND",
            "#NUM!",
            "1e400",
        ] {
            assert_eq!(number(text), Err(Fault::NotFinite), "{text}");
        }
        for text in [
            "OL",
            "---",
            "1.000,5",
            "1,000,000",
            "1 000",
            "12kHz",
            "0x10",
            "++1",
            "1e",
            ".",
        ] {
            assert_eq!(number(text), Err(Fault::Text), "{text}");
        }
        assert_eq!(parse(b"1,5", &mut Mark::Unknown, false), Err(Fault::Text));
    }

    #[test]
    fn numbers_are_rounded_as_the_standard_library_rounds_them() {
        let mut x = 1u64;
        let mut plainly = 0;
        for _ in 0..20_000 {
            x = x.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
            let digits = (x >> 20) % 10u64.pow((x >> 7) as u32 % 18 + 1);
            let (sign, at, exponent) = (["", "-", "+"][(x >> 12) as usize % 3], x >> 50, x >> 33);
            let mut text = digits.to_string();
            text.insert(at as usize % (text.len() + 1), '.');
            for text in [
                format!("{sign}{text}"),
                format!("{sign}{text}e{}", exponent % 20),
                format!("{sign}{text}E-{:02}", exponent % 60),
                format!("{sign}{digits}e+{:03}", exponent % 20),
            ] {
                plainly += u32::from(plain(text.as_bytes()).is_some());
                let expected: f64 = text.parse().expect("a number");
                let found = number(&text).expect("a number");
                assert_eq!(found.to_bits(), expected.to_bits(), "{text}");
            }
        }
        assert!(plainly > 20_000, "{plainly}");
    }

    #[test]
    fn the_decimal_mark_does_not_change() {
        let mut mark = Mark::Unknown;
        assert_eq!(parse(b"1000", &mut mark, true), Ok(1000.0));
        assert_eq!(parse(b"1,5", &mut mark, true), Ok(1.5));
        assert_eq!(mark, Mark::Comma);
        assert_eq!(parse(b"1.5", &mut mark, true), Err(Fault::Mixed));
    }
}
