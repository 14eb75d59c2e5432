//! Setting text: widths, wrapping, and characters that the typeface lacks.
//!
//! Nothing is dropped or clipped: text wraps, a word too long for its column breaks, and a character
//! without a glyph stands as a small box with its code point in it.

use super::ink::{Ink, TEXT};
use super::typeface::{Weight, face};

/// How a piece of text looks.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Style {
    /// Points.
    pub size: f64,
    pub weight: Weight,
    pub ink: Ink,
}

impl Style {
    pub const fn regular(size: f64) -> Self {
        Style {
            size,
            weight: Weight::Regular,
            ink: TEXT,
        }
    }

    pub const fn bold(size: f64) -> Self {
        Style {
            size,
            weight: Weight::Bold,
            ink: TEXT,
        }
    }

    pub const fn ink(self, ink: Ink) -> Self {
        Style { ink, ..self }
    }
}

/// Size of a code point in its box, of the size of the text around it.
const TAG_SIZE: f64 = 0.62;
/// Space between the box and what is in it, and between box and neighbour, of the text size.
const TAG_PAD: f64 = 0.12;

/// A stretch of text that is set in one go.
#[derive(Debug, PartialEq)]
pub(super) enum Piece {
    Run(String),
    /// A character without a glyph.
    Missing(char),
}

/// What stands in the box of a missing character.
pub(super) fn tag(c: char) -> String {
    format!("U+{:04X}", u32::from(c))
}

/// The style of the code point in the box.
pub(super) fn tag_style(style: Style) -> Style {
    Style {
        size: style.size * TAG_SIZE,
        ..style
    }
}

/// Padding in the box, in points.
pub(super) fn tag_pad(style: Style) -> f64 {
    style.size * TAG_PAD
}

/// Splits text into runs that the typeface can set and the characters between that it cannot.
pub(super) fn pieces(text: &str, weight: Weight) -> Vec<Piece> {
    let face = face(weight);
    let mut out = Vec::new();
    let mut run = String::new();
    for c in text.chars() {
        if face.is_some_and(|f| f.advance(c).is_some()) {
            run.push(c);
            continue;
        }
        if !run.is_empty() {
            out.push(Piece::Run(std::mem::take(&mut run)));
        }
        out.push(Piece::Missing(c));
    }
    if !run.is_empty() {
        out.push(Piece::Run(run));
    }
    out
}

/// Advance width of one character in points.
fn advance(c: char, style: Style) -> f64 {
    let Some(face) = face(style.weight) else {
        return 0.0;
    };
    match face.advance(c) {
        Some(w) => f64::from(w) / 1000.0 * style.size,
        None => tag_width(c, style),
    }
}

/// Width of the box of a missing character with its surrounding space.
pub(super) fn tag_width(c: char, style: Style) -> f64 {
    let code: f64 = tag(c).chars().map(|k| advance(k, tag_style(style))).sum();
    code + 4.0 * tag_pad(style)
}

/// Width of a line of text in points.
pub(super) fn width(text: &str, style: Style) -> f64 {
    text.chars().map(|c| advance(c, style)).sum()
}

/// Breaks text into lines no wider than `measure`: at spaces, within a word only where it is wider
/// than a line. Spaces at a break go; all other characters stay.
pub(super) fn wrap(text: &str, style: Style, measure: f64) -> Vec<String> {
    let mut lines = Vec::new();
    let mut line = String::new();
    let mut used = 0.0;
    let space = advance(' ', style);
    for word in blocks(text, style, measure) {
        let wide = width(word, style);
        let gap = if line.is_empty() { 0.0 } else { space };
        if used + gap + wide <= measure {
            if !line.is_empty() {
                line.push(' ');
            }
            line.push_str(word);
            used += gap + wide;
            continue;
        }
        if !line.is_empty() {
            lines.push(std::mem::take(&mut line));
        }
        if wide <= measure {
            line.push_str(word);
            used = wide;
            continue;
        }
        let mut parts = break_word(word, style, measure);
        line = parts.pop().unwrap_or_default();
        used = width(&line, style);
        lines.extend(parts);
    }
    lines.push(line);
    lines
}

/// The words of a text; a number with its unit or its uncertainty is one where that fits a line.
fn blocks(text: &str, style: Style, measure: f64) -> Vec<&str> {
    let mut out: Vec<&str> = Vec::new();
    let mut start = 0;
    let mut before = "";
    for word in text.split(' ') {
        let end = start + word.len();
        let joined = out
            .last()
            .filter(|_| stays(before, word))
            .and_then(|block| {
                let begin = start.checked_sub(1 + block.len())?;
                let both = text.get(begin..end)?;
                (width(both, style) <= measure).then_some(both)
            });
        match (joined, out.last_mut()) {
            (Some(both), Some(block)) => *block = both,
            _ => out.push(word),
        }
        before = word;
        start = end + 1;
    }
    out
}

/// Whether a word stays on the line of the one before it.
fn stays(before: &str, word: &str) -> bool {
    const SIGNS: [&str; 6] = ["±", "≤", "≥", "<", ">", "="];
    let number = before.ends_with(|c: char| c.is_ascii_digit());
    let bare = word.trim_end_matches(['.', ',', ';', ':', ')']);
    let date = before.len() == 10 && before.bytes().filter(|b| *b == b'-').count() == 2;
    (number && is_unit(bare))
        || (number && date && word.contains(':'))
        || (word == "±" && (number || is_unit(before)))
        || (SIGNS.contains(&before) && word.starts_with(|c: char| c.is_ascii_digit()))
}

/// A unit as it follows a number, with or without a prefix.
fn is_unit(word: &str) -> bool {
    const UNITS: [&str; 11] = ["F", "Ω", "H", "Hz", "V", "A", "W", "s", "h", "°C", "%"];
    let bare = word.trim_start_matches(['p', 'n', 'µ', 'm', 'k', 'M', 'G']);
    UNITS.contains(&word)
        || (UNITS.contains(&bare) && word.chars().count() == bare.chars().count() + 1)
}

/// Breaks a word wider than a line, after a hyphen, slash or the like where one is near the end.
fn break_word(word: &str, style: Style, measure: f64) -> Vec<String> {
    let mut out = Vec::new();
    let mut line = String::new();
    let mut used = 0.0;
    for c in word.chars() {
        let wide = advance(c, style);
        if used + wide > measure && !line.is_empty() {
            let rest = match line.rfind(['-', '/', '_', '.', ',', ':', '@']) {
                Some(at) if at > line.len() / 2 => line.split_off(at + 1),
                _ => String::new(),
            };
            used = width(&rest, style);
            out.push(std::mem::replace(&mut line, rest));
        }
        line.push(c);
        used += wide;
    }
    out.push(line);
    out
}

/// Text on one line: where it is too wide, the middle gives way to an ellipsis. Only for repeated
/// identities that stand in full elsewhere in the document.
pub(super) fn elide(text: &str, style: Style, measure: f64) -> String {
    if width(text, style) <= measure {
        return text.to_owned();
    }
    let chars: Vec<char> = text.chars().collect();
    let room = measure - width(" … ", style);
    let take = |from: &mut dyn Iterator<Item = &char>| -> Vec<char> {
        let mut used = 0.0;
        from.take_while(|c| {
            used += advance(**c, style);
            used <= room / 2.0
        })
        .copied()
        .collect()
    };
    let head = take(&mut chars.iter());
    let mut tail = take(&mut chars.iter().rev());
    tail.reverse();
    let head: String = head.into_iter().collect();
    let tail: String = tail.into_iter().collect();
    format!("{head} … {tail}")
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const STYLE: Style = Style::regular(9.0);

    #[test]
    fn a_missing_character_is_a_piece_of_its_own() {
        assert_eq!(
            pieces("a漢b", Weight::Regular),
            vec![
                Piece::Run("a".into()),
                Piece::Missing('漢'),
                Piece::Run("b".into())
            ]
        );
        assert_eq!(tag('漢'), "U+6F22");
    }

    #[test]
    fn an_elided_text_keeps_both_ends_and_fits() {
        let text = "A".repeat(300) + &"B".repeat(300);
        let short = elide(&text, STYLE, 120.0);
        assert!(width(&short, STYLE) <= 120.0);
        assert!(short.starts_with('A') && short.ends_with('B') && short.contains('…'));
    }

    #[test]
    fn a_number_keeps_its_unit_and_its_uncertainty() {
        let text = "it leaves 0.31 % of |Z|; L 438.7 pH ± 2.0 pH, at 100 kHz ≤ 450 mΩ";
        for measure in 40..240 {
            for line in wrap(text, STYLE, f64::from(measure)) {
                for cut in ["0.31", "438.7", "100"] {
                    assert!(!line.ends_with(cut), "{line:?}");
                }
                assert!(!line.ends_with('≤'), "{line:?}");
            }
        }
        assert!(!stays("of 3", "parts") && !stays("in", "F") && !stays("2", "of"));
    }

    proptest! {
        #[test]
        fn wrapping_loses_nothing_and_every_line_fits(text in "\\PC{0,200}", measure in 60.0f64..300.0) {
            let lines = wrap(&text, STYLE, measure);
            let kept: String = lines.concat().split(' ').collect();
            let all: String = text.split(' ').collect();
            prop_assert_eq!(kept, all);
            for line in lines {
                prop_assert!(width(&line, STYLE) <= measure + 1e-6, "{:?}", line);
            }
        }
    }
}
