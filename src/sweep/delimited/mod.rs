//! Delimited sweep tables (CSV and its relatives) by the station's layout.
//!
//! The layout names the headings, and everything else is found out from the file: delimiter,
//! decimal mark, preamble, units. What cannot be found out for sure is a fault.

mod decimal;
mod heading;
mod rows;
mod table;
mod unit;

use super::raw::RawSweep;
use crate::diagnostic::Note;
use crate::station::{Column, Layout};

/// The factor from the numbers under a heading to hertz, ohm, farad, volt, radian, decibel or 1.
/// Without a unit in the heading it is 1, and that of degrees for a phase.
pub fn heading_scale(heading: &str, column: Column) -> f64 {
    let usual = match column {
        Column::Phase => std::f64::consts::PI / 180.0,
        _ => 1.0,
    };
    let unit = unit::split(heading, column).unit;
    unit.map_or(usual, |unit| unit.scale)
}

/// The sweep of one part in a table, or why there is none.
#[derive(Debug)]
pub(super) struct Portion {
    /// As the `part` column has it; `None` where the table has no such column.
    pub part: Option<String>,
    pub raw: Result<RawSweep, Vec<Note>>,
}

/// What a table holds.
#[derive(Debug)]
pub(super) struct Table {
    /// In order of first appearance, at least one.
    pub portions: Vec<Portion>,
    /// What was found out (delimiter, decimal mark, preamble).
    pub notes: Vec<Note>,
}

/// Reads a table of one or many parts.
///
/// # Errors
/// What makes the whole file unreadable: no headings as the layout names them, no rows.
pub(super) fn read(text: &str, layout: &Layout) -> Result<Table, Vec<Note>> {
    if text.trim().is_empty() {
        return Err(vec![Note::new(
            "file_empty",
            "the file is empty: measure or export the part again",
        )]);
    }
    let headings = heading::find(text, layout).map_err(|note| vec![note])?;
    table::read(text, layout, headings)
}
