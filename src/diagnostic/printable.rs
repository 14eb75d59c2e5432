//! Text from files made fit to show: nothing in it steers a terminal or hides.

/// Whether a character steers the terminal, or the reader's eye, instead of being seen: control
/// characters, line and paragraph separators, and the bidirectional and zero-width characters.
pub fn is_hidden(c: char) -> bool {
    c.is_control()
        || matches!(c, '\u{ad}' | '\u{61c}' | '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}'
            | '\u{2060}'..='\u{206f}' | '\u{feff}' | '\u{fff9}'..='\u{fffb}'
            | '\u{e0000}'..='\u{e007f}')
}

/// The text with every hidden character written out (`\u{1b}`).
pub fn printable(text: &str) -> String {
    let mut shown = String::with_capacity(text.len());
    for c in text.chars() {
        if is_hidden(c) {
            shown.extend(c.escape_unicode());
        } else {
            shown.push(c);
        }
    }
    shown
}

/// The text printable and no longer than about 40 characters, for use inside a sentence.
pub fn excerpt(text: &str) -> String {
    const LONGEST: usize = 40;
    let mut cut: String = text.chars().take(LONGEST).collect();
    if text.chars().nth(LONGEST).is_some() {
        cut.push('…');
    }
    printable(&cut)
}

/// The text broken at spaces into lines of at most `width` columns; a longer word is broken too.
pub fn wrap(text: &str, width: usize) -> Vec<String> {
    let lines = textwrap::wrap(text, width.max(2));
    lines.into_iter().map(|line| line.into_owned()).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use unicode_width::UnicodeWidthStr;

    #[test]
    fn hidden_characters_are_written_out() {
        assert_eq!(printable("a\u{1b}[31mb"), "a\\u{1b}[31mb");
        assert_eq!(printable("12\u{202e}34 µΩ ±"), "12\\u{202e}34 µΩ ±");
    }

    #[test]
    fn lines_never_exceed_the_width() {
        let lines = wrap("one two three fourfourfourfour", 9);
        assert_eq!(lines, ["one two", "three", "fourfourf", "ourfour"]);
        assert!(
            wrap(&"漢字 ".repeat(30), 11)
                .iter()
                .all(|l| l.width() <= 11)
        );
    }

    #[test]
    fn an_excerpt_says_that_it_is_one() {
        assert_eq!(excerpt("short"), "short");
        assert_eq!(excerpt(&"x".repeat(50)).chars().count(), 41);
    }
}
