//! Finding the line of headings, and with it the delimiter.

use super::rows::{Delimiter, Field, Rows};
use super::unit::{self, Unit};
use crate::diagnostic::Note;
use crate::station::{Column, Layout};
use crate::sweep::faults::quoted;

/// The line of headings is looked for in so many lines of preamble.
const PREAMBLE: usize = 250;

/// Where a quantity stands in each row.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Located {
    pub column: Column,
    /// Index of the field.
    pub index: usize,
    /// As the file spells it.
    pub heading: String,
    /// The unit in the file's heading, otherwise that in the layout's.
    pub unit: Option<Unit>,
}

/// The line of headings, understood.
#[derive(Debug, Clone)]
pub(super) struct Headings<'a> {
    pub delimiter: Delimiter,
    /// 1-based.
    pub line: u32,
    /// Headings in the line.
    pub count: usize,
    pub columns: Vec<Located>,
    /// The lines that follow.
    pub rows: Rows<'a>,
}

/// One heading the file is expected to have.
struct Wanted<'l> {
    column: Column,
    text: &'l str,
    name: String,
    unit: Option<Unit>,
}

/// Finds the first line that has every heading of the layout.
pub(super) fn find<'a>(text: &'a str, layout: &Layout) -> Result<Headings<'a>, Note> {
    let wanted: Vec<Wanted> = layout
        .columns
        .iter()
        .map(|(column, text)| Wanted::new(*column, text))
        .collect();
    let mut best: Option<Miss> = None;
    for delimiter in Delimiter::ALL {
        // Headings are at least two fields.
        if !delimiter.is_in(text.as_bytes()) {
            continue;
        }
        let mut rows = Rows::new(text.as_bytes(), delimiter);
        let mut fields = Vec::new();
        for _ in 0..PREAMBLE {
            let Some(line) = rows.next(&mut fields) else {
                break;
            };
            if fields.len() < 2 || !fields.iter().any(|field| is_heading(field.bytes)) {
                continue;
            }
            let below = fields_below(&rows);
            for headings in readings_of_line(&fields, delimiter) {
                let count = headings.len();
                if delimiter == Delimiter::Whitespace && below.is_some_and(|below| below != count) {
                    continue;
                }
                match assign(&headings, &wanted) {
                    Ok(mut columns) => {
                        add_part_column(&mut columns, &headings);
                        return Ok(Headings {
                            delimiter,
                            line,
                            count,
                            columns,
                            rows,
                        });
                    }
                    Err(missing) => {
                        let found = wanted.len() - missing.len();
                        let miss = Miss {
                            line,
                            found,
                            missing,
                            headings,
                        };
                        if best.as_ref().is_none_or(|best| miss.is_nearer_than(best)) {
                            best = Some(miss);
                        }
                    }
                }
            }
        }
    }
    Err(missing(best, &wanted))
}

/// The nearest line to one of headings.
struct Miss {
    line: u32,
    found: usize,
    missing: Vec<String>,
    headings: Vec<String>,
}

impl Miss {
    fn is_nearer_than(&self, other: &Miss) -> bool {
        let more_headings = self.found == 0 && self.headings.len() > other.headings.len();
        self.found > other.found || self.found == other.found && more_headings
    }
}

/// Whether a field can be a heading: it has a letter or is like `|Z|`.
fn is_heading(field: &[u8]) -> bool {
    field
        .iter()
        .any(|b| b.is_ascii_alphabetic() || *b == b'|' || !b.is_ascii())
}

fn missing(best: Option<Miss>, wanted: &[Wanted]) -> Note {
    let list = |texts: &mut dyn Iterator<Item = &str>| {
        texts
            .take(20)
            .map(|text| quoted(text.as_bytes()))
            .collect::<Vec<_>>()
            .join(", ")
    };
    let text = match best {
        Some(miss) => format!(
            "no column {}; the headings found in line {} are {}: correct the layout in the station file or export with these columns",
            list(&mut miss.missing.iter().map(String::as_str)),
            miss.line,
            list(&mut miss.headings.iter().map(String::as_str)),
        ),
        None => format!(
            "no line of headings was found; expected {}: correct the layout in the station file or export with headings",
            list(&mut wanted.iter().map(|w| w.text)),
        ),
    };
    Note::new("heading_missing", text)
}

impl<'l> Wanted<'l> {
    fn new(column: Column, text: &'l str) -> Self {
        let unit::Heading { name, unit } = unit::split(text, column);
        Wanted {
            column,
            text,
            name,
            unit,
        }
    }
}

/// The number of fields in the next line that has any.
fn fields_below(rows: &Rows<'_>) -> Option<usize> {
    let mut rows = rows.clone();
    let mut fields = Vec::new();
    while rows.next(&mut fields).is_some() {
        if !fields.is_empty() {
            return Some(fields.len());
        }
    }
    None
}

/// The headings of a line. Where blanks delimit, headings may hold blanks themselves, so words are
/// also put together: a unit in brackets with the word before it, or all words up to a bracket.
fn readings_of_line(fields: &[Field<'_>], delimiter: Delimiter) -> Vec<Vec<String>> {
    let mut words: Vec<String> = fields
        .iter()
        .map(|field| String::from_utf8_lossy(field.bytes).into_owned())
        .collect();
    // A comment sign before the headings is no heading.
    if let Some(first) = words.first_mut() {
        let bare = first
            .trim_start_matches(['#', '!', '%', '\u{FEFF}'])
            .trim_start()
            .to_owned();
        *first = bare;
    }
    if delimiter != Delimiter::Whitespace {
        return vec![words];
    }
    words.retain(|word| !word.is_empty());
    let opens = |word: &str| word.starts_with(['(', '[', '{']);
    let closes = |word: &str| word.ends_with([')', ']', '}']);
    let mut with_unit: Vec<String> = Vec::new();
    let mut to_bracket: Vec<String> = Vec::new();
    let mut open = false;
    for word in &words {
        join(&mut with_unit, word, opens(word));
        join(&mut to_bracket, word, open);
        open = !closes(word);
    }
    let mut all = vec![words];
    for other in [with_unit, to_bracket] {
        if !all.contains(&other) {
            all.push(other);
        }
    }
    all
}

/// Adds a word, to the last heading or as a new one.
fn join(headings: &mut Vec<String>, word: &str, to_last: bool) {
    match headings.last_mut() {
        Some(last) if to_last => {
            last.push(' ');
            last.push_str(word);
        }
        _ => headings.push(word.to_owned()),
    }
}

/// Assigns each wanted heading to one of the file's, or names those that are not there (or are
/// there twice without one being spelt exactly as the layout has it).
fn assign(headings: &[String], wanted: &[Wanted]) -> Result<Vec<Located>, Vec<String>> {
    let mut columns = Vec::with_capacity(wanted.len());
    let mut missing = Vec::new();
    for want in wanted {
        let mut candidates = headings.iter().enumerate().filter_map(|(index, heading)| {
            let split = unit::split(heading, want.column);
            (split.name == want.name).then_some((index, heading, split.unit))
        });
        let first = candidates.next();
        let chosen = match (first, candidates.next()) {
            (Some(only), None) => Some(only),
            (Some(_), Some(_)) => {
                let mut exact = headings
                    .iter()
                    .enumerate()
                    .filter(|(_, h)| **h == want.text.trim());
                match (exact.next(), exact.next()) {
                    (Some((index, heading)), None) => Some((index, heading, want.unit)),
                    _ => None,
                }
            }
            _ => None,
        };
        match chosen {
            Some((index, heading, unit)) => columns.push(Located {
                column: want.column,
                index,
                heading: heading.clone(),
                unit: unit.or(want.unit),
            }),
            None => missing.push(want.text.to_owned()),
        }
    }
    if missing.is_empty() {
        Ok(columns)
    } else {
        Err(missing)
    }
}

/// A `part` column makes a table one of many parts, whether the layout names it or not.
fn add_part_column(columns: &mut Vec<Located>, headings: &[String]) {
    if columns.iter().any(|c| c.column == Column::Part) {
        return;
    }
    let found = headings
        .iter()
        .position(|heading| unit::compared(heading) == "part");
    if let Some(index) = found.filter(|&index| columns.iter().all(|c| c.index != index)) {
        columns.push(Located {
            column: Column::Part,
            index,
            heading: "part".to_owned(),
            unit: None,
        });
    }
}
