//! Text for the terminal: what comes from files is shown, never obeyed.

use crate::diagnostic::printable;

/// The width that every screen fits.
pub const WIDTH: usize = 80;

/// Wrapped to `WIDTH` with an indent on each line; each line ends with a newline.
pub fn wrapped(text: &str, first: &str, rest: &str) -> String {
    let options = textwrap::Options::new(WIDTH)
        .initial_indent(first)
        .subsequent_indent(rest);
    let mut all = textwrap::fill(&printable(text), options);
    all.push('\n');
    all
}

/// At most `width` columns, the end cut off and marked with `…`.
pub fn clipped(text: &str, width: usize) -> String {
    use unicode_width::UnicodeWidthChar;
    let safe = printable(text);
    if unicode_width::UnicodeWidthStr::width(safe.as_str()) <= width {
        return safe;
    }
    let mut used = 0;
    let mut kept: String = safe
        .chars()
        .take_while(|c| {
            used += c.width().unwrap_or(0);
            used < width
        })
        .collect();
    kept.push('…');
    kept
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn clips_by_columns_not_characters() {
        assert_eq!(clipped("abcdef", 6), "abcdef");
        assert_eq!(clipped("abcdefg", 6), "abcde…");
        assert_eq!(clipped("部品部品", 6), "部品…");
    }
}
