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
    fn the_decimal_mark_does_not_change() {
        let mut mark = Mark::Unknown;
        assert_eq!(parse(b"1000", &mut mark, true), Ok(1000.0));
        assert_eq!(parse(b"1,5", &mut mark, true), Ok(1.5));
        assert_eq!(mark, Mark::Comma);
        assert_eq!(parse(b"1.5", &mut mark, true), Err(Fault::Mixed));
    }
}
