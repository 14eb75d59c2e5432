//! From what arrives to the characters that were encoded: symbology prefix, scanner suffix, and the
//! many ways in which RS, GS and EOT arrive as something visible.
//!
//! How scanners and hosts render control characters is common practice, no source; the separators
//! themselves are ISO/IEC 15434 clause 5, the symbology prefix ISO/IEC 15424.

use super::error::LabelError;
use super::identifier;
use crate::diagnostic::Note;

pub(super) const HEADER: &str = "[)>";
pub(super) const RS: char = '\u{1e}';
pub(super) const GS: char = '\u{1d}';
pub(super) const EOT: char = '\u{4}';

/// A scan with real separators, and what was done to get there.
pub(super) struct Scan {
    pub text: String,
    pub notes: Vec<Note>,
}

/// One way of writing the three separators: GS, RS, EOT.
struct Convention {
    name: &'static str,
    gs: &'static str,
    rs: &'static str,
    eot: &'static str,
}

const fn convention(name: &'static str, [gs, rs, eot]: [&'static str; 3]) -> Convention {
    Convention { name, gs, rs, eot }
}

/// All compared without regard to ASCII case.
const CONVENTIONS: &[Convention] = &[
    convention("caret notation", ["^]", "^^", "^d"]),
    convention("braces", ["{gs}", "{rs}", "{eot}"]),
    convention("angle brackets", ["<gs>", "<rs>", "<eot>"]),
    convention("square brackets", ["[gs]", "[rs]", "[eot]"]),
    convention("parentheses", ["(gs)", "(rs)", "(eot)"]),
    convention("control pictures", ["\u{241d}", "\u{241e}", "\u{2404}"]),
    convention("code page 437 glyphs", ["\u{2194}", "\u{25b2}", "\u{2666}"]),
    convention("spreadsheet escapes", ["_x001d_", "_x001e_", "_x0004_"]),
    convention("\\x escapes", ["\\x1d", "\\x1e", "\\x04"]),
    convention("\\u escapes", ["\\u001d", "\\u001e", "\\u0004"]),
    convention("percent escapes", ["%1d", "%1e", "%04"]),
    convention("decimal references", ["&#29;", "&#30;", "&#4;"]),
    convention("hexadecimal references", ["&#x1d;", "&#x1e;", "&#x4;"]),
];

/// Strips what the scanner adds and puts the separators back.
pub(super) fn normalise(text: &str) -> Result<Scan, LabelError> {
    let text = text.trim_matches(['\r', '\n', '\t', ' ']);
    if text.is_empty() {
        return Err(LabelError::refused(
            "empty",
            "nothing was scanned: scan the label",
        ));
    }
    refuse_damage(text)?;
    let text = strip_symbology(text)?;
    refuse_wrong_keyboard(text)?;
    let scan = translate(text)?;
    refuse_control_characters(&scan.text)?;
    Ok(scan)
}

fn refuse_damage(text: &str) -> Result<(), LabelError> {
    if text.contains(['\u{fffd}', '?']) {
        return Err(LabelError::refused(
            "encoding_damaged",
            "a character was lost on the way and stands as `?`: set the scanner and the host to \
             the same character encoding and scan again",
        ));
    }
    Ok(())
}

/// Takes the `]cm` symbology identifier off (ISO/IEC 15424: `]`, a letter, a modifier).
fn strip_symbology(text: &str) -> Result<&str, LabelError> {
    let mut chars = text.chars();
    let (Some(']'), Some(code), Some(modifier)) = (chars.next(), chars.next(), chars.next()) else {
        return Ok(text);
    };
    if !code.is_ascii_alphabetic() || !modifier.is_ascii_digit() {
        return Ok(text);
    }
    // FNC1 in first position: the data are GS1 application identifiers.
    if matches!(
        (code, modifier),
        ('C', '1') | ('d', '2' | '5') | ('Q', '3' | '4') | ('e', _)
    ) {
        return Err(LabelError::refused(
            "format_not_06",
            "the symbol holds GS1 application identifiers, not data identifiers: scan the code \
             whose fields begin with 1P, Q, 1T",
        ));
    }
    Ok(chars.as_str())
}

/// `[)>` typed by a scanner set to a US keyboard on a host with a German one.
fn refuse_wrong_keyboard(text: &str) -> Result<(), LabelError> {
    let folded: String = text.chars().take(3).flat_map(char::to_lowercase).collect();
    if folded != "ü=:" {
        return Ok(());
    }
    let error = LabelError::refused(
        "keyboard_layout_mismatch",
        "the scanner types for another keyboard layout than the host's (`[)>` arrived as `ü=:`): \
         set the scanner to the host's layout and scan again",
    );
    Err(if text.contains(GS) {
        error
    } else {
        error.and("separators_missing", MISSING)
    })
}

/// What to do where the separators are gone.
pub(super) const MISSING: &str = "the separators between the fields did not arrive, and the fields cannot be told apart: \
     set the scanner to send control characters, or scan the linear bar codes one by one, or type \
     the values in";

fn translate(text: &str) -> Result<Scan, LabelError> {
    let folded = text.to_ascii_lowercase();
    let used: Vec<&Convention> = CONVENTIONS
        .iter()
        .filter(|c| folded.contains(c.gs))
        .collect();
    let unchanged = || Scan {
        text: text.to_owned(),
        notes: Vec::new(),
    };
    match used.as_slice() {
        [] if text.contains(GS) => Ok(unchanged()),
        [] => Ok(bare_brackets(text)?.unwrap_or_else(unchanged)),
        [one] if !text.contains(GS) => Ok(Scan {
            text: replace(text, &folded, one),
            notes: vec![Note::new(
                "separators_translated",
                format!("the separators arrived as {} and were put back", one.name),
            )],
        }),
        _ => Err(LabelError::refused(
            "separators_mixed",
            "separators arrived in more than one form, and which of them are data cannot be told: \
             set the scanner to send control characters and scan again",
        )),
    }
}

/// Puts the separators back; `folded` is `text` in ASCII lower case, so of the same byte lengths.
fn replace(text: &str, folded: &str, convention: &Convention) -> String {
    let pairs = [
        (convention.gs, GS),
        (convention.rs, RS),
        (convention.eot, EOT),
    ];
    let mut out = String::with_capacity(text.len());
    let mut rest = (text, folded);
    while let Some(first) = rest.0.chars().next() {
        let hit = pairs.iter().find(|(token, _)| rest.1.starts_with(token));
        let (character, length) = match hit {
            Some((token, separator)) => (*separator, token.len()),
            None => (first, first.len_utf8()),
        };
        out.push(character);
        rest = (
            rest.0.get(length..).unwrap_or(""),
            rest.1.get(length..).unwrap_or(""),
        );
    }
    out
}

/// `[)>^06]1P…]Q…^`: the host lost the control key. Only where every bracket is followed by a
/// known data identifier and no caret stands among the data.
fn bare_brackets(text: &str) -> Result<Option<Scan>, LabelError> {
    let Some(body) = text.strip_prefix(HEADER) else {
        return Ok(None);
    };
    let body = body.strip_prefix('^').unwrap_or(body);
    let Some(body) = body.strip_prefix("06]") else {
        return Ok(None);
    };
    let (body, trailer) = if let Some(body) = body.strip_suffix("^d") {
        (body, format!("{RS}{EOT}"))
    } else if let Some(body) = body.strip_suffix('^') {
        (body, RS.to_string())
    } else {
        (body, String::new())
    };
    let known = |field: &str| identifier::split(field).is_some_and(|(id, _)| identifier::known(id));
    if body.contains('^') || !body.split(']').all(known) {
        return Err(LabelError::refused(
            "separators_ambiguous",
            "the control key got lost: `]` and `^` stand for separators, but not all of them can \
             be: set the scanner to send control characters and scan again",
        ));
    }
    let fields = body.replace(']', "\u{1d}");
    Ok(Some(Scan {
        text: format!("{HEADER}{RS}06{GS}{fields}{trailer}"),
        notes: vec![Note::new(
            "separators_guessed",
            "the separators arrived as `]` and `^`; each field so split begins with a known data \
             identifier",
        )],
    }))
}

/// Anything that is neither text nor one of the three separators: a substitute for a separator
/// (line feed, tab, function key), or text that is out to deceive a reader.
fn refuse_control_characters(text: &str) -> Result<(), LabelError> {
    let last = text.trim_end_matches(['\r', '\n']);
    let wrong = last.chars().find(|c| {
        let separator = matches!(*c, GS | RS | EOT);
        !separator && (c.is_control() || invisible(*c))
    });
    match wrong {
        None => Ok(()),
        Some(c) => Err(LabelError::refused(
            "control_character",
            format!(
                "character U+{:04X} stands in the scan, which is no separator of a label: set the \
                 scanner to send the control characters RS, GS, EOT, one label a scan",
                u32::from(c)
            ),
        )),
    }
}

/// Private-use, zero-width, directional and other format characters, line and paragraph separators.
fn invisible(c: char) -> bool {
    matches!(u32::from(c),
        0xad | 0x61c | 0x180e | 0x200b..=0x200f | 0x2028..=0x202e | 0x2060..=0x206f | 0xfeff
        | 0xfff0..=0xfffb | 0xe000..=0xf8ff | 0xe0000..=0x10_ffff)
}
