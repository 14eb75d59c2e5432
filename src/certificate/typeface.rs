//! The typeface in its two weights: which characters it has and how wide they are.
//!
//! The files beside this one are subsets; `typeface/subset.py` makes them and `typeface/OFL.txt` is
//! their licence.

use printpdf::ParsedFont;
use std::sync::OnceLock;

static REGULAR: &[u8] = include_bytes!("typeface/AlegreyaSans-Regular.subset.ttf");
static BOLD: &[u8] = include_bytes!("typeface/AlegreyaSans-Bold.subset.ttf");

/// Height of a capital letter, of the em (OS/2 sCapHeight of the files).
pub(super) const CAP_HEIGHT: f64 = 0.641;
/// How far letters reach above the baseline, accents included.
pub(super) const ASCENT: f64 = 0.74;
/// How far letters reach below the baseline.
pub(super) const DESCENT: f64 = 0.21;

/// The two weights.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub(super) enum Weight {
    Regular,
    Bold,
}

/// One weight: its font program and the advance widths by character.
pub(super) struct Face {
    pub font: ParsedFont,
    /// Thousandths of the em by Unicode code point below `DIRECT`; 0 where there is no glyph.
    direct: Vec<u16>,
    /// Numbers of the glyphs, likewise.
    glyphs: Vec<u16>,
}

/// Code points of the subset lie below this.
const DIRECT: u32 = 0x2600;

impl Face {
    fn load(bytes: &[u8], name: &str) -> Option<Face> {
        let mut font = ParsedFont::from_bytes(bytes, 0, &mut Vec::new())?;
        // A subset carries six capitals and a plus before its name (ISO 32000-1, 9.6.4).
        font.font_name = Some(name.to_owned());
        let width = |code: u32| -> u16 {
            font.lookup_glyph_index(code)
                .filter(|glyph| *glyph != 0)
                .and_then(|glyph| font.get_glyph_width(glyph))
                .unwrap_or(0)
        };
        let direct = (0..DIRECT).map(width).collect();
        let glyph = |code: u32| font.lookup_glyph_index(code).unwrap_or(0);
        let glyphs = (0..DIRECT).map(glyph).collect();
        Some(Face {
            font,
            direct,
            glyphs,
        })
    }

    /// Advance width in thousandths of the em; `None` where the typeface lacks the character.
    pub fn advance(&self, c: char) -> Option<u16> {
        let index = usize::try_from(u32::from(c)).ok()?;
        self.direct.get(index).copied().filter(|w| *w > 0)
    }

    /// Number of the glyph in the font program; 0, the box of no character, where there is none.
    pub fn glyph(&self, c: char) -> u16 {
        let index = usize::try_from(u32::from(c)).ok();
        index.map_or(0, |i| self.glyphs.get(i).copied().unwrap_or(0))
    }
}

/// A weight, read once a process; `None` only if the embedded file is unreadable.
pub(super) fn face(weight: Weight) -> Option<&'static Face> {
    static FACES: OnceLock<(Option<Face>, Option<Face>)> = OnceLock::new();
    let (regular, bold) = FACES.get_or_init(|| {
        (
            Face::load(REGULAR, "RGATEA+AlegreyaSans-Regular"),
            Face::load(BOLD, "RGATEB+AlegreyaSans-Bold"),
        )
    });
    match weight {
        Weight::Regular => regular.as_ref(),
        Weight::Bold => bold.as_ref(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn both_weights_have_what_the_record_needs_and_figures_are_of_one_width() {
        for weight in [Weight::Regular, Weight::Bold] {
            let face = face(weight).expect("embedded face");
            for c in "µμΩΩ°±≤≥–−σ×→·…²≈äéñçßøŁžΔαЖ".chars() {
                assert!(face.advance(c).is_some(), "{c} in {weight:?}");
            }
            let widths: Vec<_> = ('0'..='9').map(|c| face.advance(c)).collect();
            assert!(
                widths.iter().all(|w| *w == Some(475)),
                "{weight:?} {widths:?}"
            );
        }
    }

    #[test]
    fn what_draws_nothing_of_its_own_counts_as_missing() {
        let face = face(Weight::Regular).expect("embedded face");
        for c in [
            '\t',
            '\n',
            '\0',
            '\u{7f}',
            '\u{ad}',
            '\u{200b}',
            '\u{202e}',
            '\u{301}',
            '\u{feff}',
            '漢',
            'ש',
            '😀',
            '\u{10ffff}',
        ] {
            assert!(face.advance(c).is_none(), "U+{:04X}", u32::from(c));
        }
    }
}
