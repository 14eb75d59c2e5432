//! Faults of one file, gathered without flooding the operator.

use crate::diagnostic::Note;

/// How many faults of one code are told in full.
const TOLD: usize = 3;

/// Gathers faults; after a few of one code only their number is kept.
#[derive(Debug, Default)]
pub(super) struct Faults {
    told: Vec<Note>,
    counts: Vec<(&'static str, usize)>,
}

impl Faults {
    /// Adds a fault; the sentence is made only when it will be told.
    pub fn add(&mut self, code: &'static str, text: impl FnOnce() -> String) {
        let count = match self.counts.iter_mut().find(|(known, _)| *known == code) {
            Some((_, count)) => count,
            None => {
                self.counts.push((code, 0));
                match self.counts.last_mut() {
                    Some((_, count)) => count,
                    None => return,
                }
            }
        };
        *count += 1;
        if *count <= TOLD {
            self.told.push(Note::new(code, text()));
        }
    }

    pub fn is_empty(&self) -> bool {
        self.told.is_empty()
    }

    /// The faults in the order they were found, with the number of those not told.
    pub fn into_notes(mut self) -> Vec<Note> {
        for (code, count) in &self.counts {
            if *count <= TOLD {
                continue;
            }
            if let Some(last) = self.told.iter_mut().rev().find(|note| note.code == *code) {
                last.text
                    .push_str(&format!(" ({} more of this kind)", count - TOLD));
            }
        }
        self.told
    }
}

/// A text of the file, fit to be quoted in a sentence: control characters shown, not too long.
pub(super) fn quoted(bytes: &[u8]) -> String {
    const LONGEST: usize = 40;
    let text = String::from_utf8_lossy(bytes);
    let mut shown: String = text.chars().take(LONGEST).flat_map(shown_char).collect();
    if text.chars().count() > LONGEST {
        shown.push('…');
    }
    format!("`{shown}`")
}

fn shown_char(c: char) -> Box<dyn Iterator<Item = char>> {
    if c.is_control() {
        Box::new(c.escape_default())
    } else {
        Box::new(std::iter::once(c))
    }
}

/// A frequency for a sentence: `310 kHz`.
pub(super) fn hertz(frequency: f64) -> String {
    let (scale, unit) = match frequency.abs() {
        f if f >= 1e9 => (1e9, "GHz"),
        f if f >= 1e6 => (1e6, "MHz"),
        f if f >= 1e3 => (1e3, "kHz"),
        _ => (1.0, "Hz"),
    };
    let value = frequency / scale;
    let digits = (3 - (value.abs().max(1.0).log10().floor() as i32 + 1)).clamp(0, 3) as usize;
    let text = format!("{value:.digits$}");
    let text = if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.')
    } else {
        &text
    };
    format!("{text} {unit}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn frequencies_are_told_with_three_digits() {
        assert_eq!(hertz(310_000.0), "310 kHz");
        assert_eq!(hertz(1_234_567.0), "1.23 MHz");
        assert_eq!(hertz(120.0), "120 Hz");
        assert_eq!(hertz(65e6), "65 MHz");
    }

    #[test]
    fn many_faults_of_one_kind_are_counted() {
        let mut faults = Faults::default();
        for i in 0..10 {
            faults.add("x", || format!("fault {i}"));
        }
        let notes = faults.into_notes();
        assert_eq!(notes.len(), 3);
        assert_eq!(notes[2].text, "fault 2 (7 more of this kind)");
    }

    #[test]
    fn control_characters_are_shown() {
        assert_eq!(quoted(b"a\x1b[31m"), "`a\\u{1b}[31m`");
    }
}
