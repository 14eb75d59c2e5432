//! Lines of a Touchstone file without comments, and the numbers in them.

/// One line that holds something: its 1-based number and its text up to a `!`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Line<'a> {
    pub number: u32,
    pub text: &'a [u8],
}

/// The lines that hold something; line ends are LF, CR LF or CR.
pub(super) fn lines(bytes: &[u8]) -> impl Iterator<Item = Line<'_>> {
    let mut rest = bytes;
    let mut number = 0;
    std::iter::from_fn(move || {
        while !rest.is_empty() {
            let end = rest.iter().position(|b| matches!(b, b'\n' | b'\r'));
            let (line, after) = match end {
                Some(at) => {
                    let crlf = rest.get(at..at + 2) == Some(b"\r\n");
                    (rest.get(..at)?, rest.get(at + 1 + usize::from(crlf)..)?)
                }
                None => (rest, &rest[rest.len()..]),
            };
            rest = after;
            number += 1;
            let text = line
                .split(|&b| b == b'!')
                .next()
                .unwrap_or_default()
                .trim_ascii();
            if !text.is_empty() {
                return Some(Line { number, text });
            }
        }
        None
    })
}

/// The words of a line.
pub(super) fn words(text: &[u8]) -> impl Iterator<Item = &[u8]> {
    text.split(|b| b.is_ascii_whitespace())
        .filter(|word| !word.is_empty())
}

/// A number; exponents may be marked `D` as well as `E`. Not finite is no number.
pub(super) fn number(word: &[u8]) -> Option<f64> {
    match fast_float2::parse::<f64, _>(word) {
        Ok(value) => value.is_finite().then_some(value),
        Err(_) => fortran(word),
    }
}

#[cold]
fn fortran(word: &[u8]) -> Option<f64> {
    if word.len() > 64 {
        return None;
    }
    let word = word.strip_prefix(b"+").unwrap_or(word);
    let replaced: Vec<u8> = word
        .iter()
        .map(|&b| if matches!(b, b'd' | b'D') { b'e' } else { b })
        .collect();
    fast_float2::parse::<f64, _>(&replaced)
        .ok()
        .filter(|v| v.is_finite())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn comments_and_blank_lines_are_passed_over_but_counted() {
        let found: Vec<(u32, &[u8])> = lines(b"! a\r\n\r\n# Hz ! b\n1 2\r3")
            .map(|l| (l.number, l.text))
            .collect();
        assert_eq!(found, [(3, b"# Hz".as_slice()), (4, b"1 2"), (5, b"3")]);
    }

    #[test]
    fn numbers() {
        assert_eq!(number(b"1.5D-3"), Some(1.5e-3));
        assert_eq!(number(b"+2"), Some(2.0));
        assert_eq!(number(b"nan"), None);
        assert_eq!(number(b"1e999"), None);
        assert_eq!(number(b"1,5"), None);
    }
}
