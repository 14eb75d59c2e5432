//! Whether a file ends in the middle of a number.
//!
//! A file without a final line end is common; one whose last number also has fewer digits than
//! the same column everywhere else was cut off while it was written or copied.

/// How a number is written: digits after the decimal mark, and length of the exponent.
#[derive(Clone, Copy)]
struct Form {
    decimals: usize,
    exponent: usize,
}

/// How many lines before the last are compared with it.
const COMPARED: usize = 60;

/// True where the text ends without a line end and its last field is written with fewer digits
/// than the last field of the lines before.
pub(super) fn ends_mid_number(text: &[u8], is_separator: impl Fn(u8) -> bool) -> bool {
    if matches!(text.last(), None | Some(b'\n' | b'\r')) {
        return false;
    }
    let mut lines = text
        .rsplit(|b| matches!(b, b'\n' | b'\r'))
        .filter(|line| !line.is_empty());
    let last_form = |line: &[u8]| {
        let field = line
            .rsplit(|&b| is_separator(b) || b == b'"')
            .find(|f| !f.trim_ascii().is_empty())?;
        form(field.trim_ascii())
    };
    let Some(last) = lines.next() else {
        return false;
    };
    let Some(last) = last_form(last) else {
        return false;
    };
    let others: Vec<Form> = lines.take(COMPARED).filter_map(last_form).collect();
    if others.len() < 3 {
        return false;
    }
    let fewest = others.iter().map(|f| f.decimals).min().unwrap_or(0);
    let most = others.iter().map(|f| f.decimals).max().unwrap_or(0);
    let shortest = others.iter().map(|f| f.exponent).min().unwrap_or(0);
    // Numbers of changing length drop a trailing zero now and then; two missing digits are not that.
    let slack = usize::from(fewest != most);
    last.decimals + slack < fewest || last.exponent < shortest
}

fn form(field: &[u8]) -> Option<Form> {
    let first = field.first()?;
    if !(first.is_ascii_digit() || matches!(first, b'+' | b'-' | b'.' | b',')) {
        return None;
    }
    let (mantissa, exponent) = match field
        .iter()
        .position(|b| matches!(b, b'e' | b'E' | b'd' | b'D'))
    {
        // An exponent without digits is none: the file ends within it.
        Some(at) if field.last().is_some_and(u8::is_ascii_digit) => {
            (field.get(..at)?, field.len() - at)
        }
        Some(at) => (field.get(..at)?, 0),
        None => (field, 0),
    };
    let decimals = mantissa
        .iter()
        .position(|b| matches!(b, b'.' | b','))
        .map_or(0, |at| mantissa.len() - at - 1);
    Some(Form { decimals, exponent })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn cut(text: &str) -> bool {
        ends_mid_number(text.as_bytes(), |b| b == b',')
    }

    #[test]
    fn a_shorter_last_number_without_line_end_is_cut() {
        let body = "1,2.50e-03\n2,2.51e-03\n3,2.52e-03\n4,2.53e-03\n";
        assert!(!cut(body));
        assert!(!cut(&format!("{body}5,2.54e-03")));
        assert!(cut(&format!("{body}5,2.54e-0")));
        assert!(cut(&format!("{body}5,2.54e-")));
        assert!(cut(&format!("{body}5,2.54")));
        assert!(cut(&format!("{body}5,2.")));
    }

    #[test]
    fn fixed_decimals_crossing_a_power_of_ten_are_whole() {
        assert!(!cut("1,10.22\n2,10.11\n3,10.01\n4,9.95"));
        assert!(cut("1,10.22\n2,10.11\n3,10.01\n4,9.9"));
    }

    #[test]
    fn numbers_of_changing_length_may_be_one_digit_short() {
        assert!(!cut("1,0.1234\n2,0.12345\n3,0.1236\n4,0.124"));
        assert!(cut("1,0.1234\n2,0.12345\n3,0.1236\n4,0.1"));
    }
}
