//! The rows under the headings: numbers into columns, parts apart, quantities to complex values.

use super::decimal::{self, Fault, Mark};
use super::heading::{Headings, Located};
use super::rows::{Delimiter, Field, Rows};
use super::unit::{self, Unit};
use super::{Portion, Table};
use crate::diagnostic::Note;
use crate::station::{Column, Layout};
use crate::sweep::cut;
use crate::sweep::faults::{Faults, quoted};
use crate::sweep::raw::{Measured, RawSweep};
use num_complex::Complex64;
use std::collections::HashMap;
use std::f64::consts::TAU;

/// A value column while it is read.
struct Values {
    column: Column,
    index: usize,
    heading: String,
    unit: Option<Unit>,
}

/// The rows of one part.
struct Group {
    part: Option<String>,
    lines: Vec<u32>,
    /// One list a value column, in the order of `Values`.
    columns: Vec<Vec<f64>>,
    faults: Faults,
}

impl Group {
    fn new(part: Option<String>, columns: usize, rows: usize) -> Self {
        Group {
            part,
            lines: Vec::with_capacity(rows),
            columns: (0..columns).map(|_| Vec::with_capacity(rows)).collect(),
            faults: Faults::default(),
        }
    }
}

/// Parts in order of first appearance.
struct Groups {
    list: Vec<Group>,
    by_part: HashMap<Vec<u8>, usize>,
    last: usize,
    columns: usize,
}

impl Groups {
    /// The group a row belongs to; rows of one part usually follow one another.
    fn of(&mut self, part: Option<&[u8]>) -> Option<&mut Group> {
        let Some(part) = part else {
            return self.list.first_mut();
        };
        let same = |group: &Group| group.part.as_ref().is_some_and(|p| p.as_bytes() == part);
        if !self.list.get(self.last).is_some_and(same) {
            self.last = match self.by_part.get(part) {
                Some(&index) => index,
                None => {
                    self.by_part.insert(part.to_vec(), self.list.len());
                    let name = String::from_utf8_lossy(part).into_owned();
                    self.list.push(Group::new(Some(name), self.columns, 0));
                    self.list.len() - 1
                }
            };
        }
        self.list.get_mut(self.last)
    }
}

pub(super) fn read(
    text: &str,
    layout: &Layout,
    headings: Headings<'_>,
) -> Result<Table, Vec<Note>> {
    let mut notes = opening_notes(&headings);
    let part = headings
        .columns
        .iter()
        .find(|c| c.column == Column::Part)
        .map(|c| c.index);
    let mut values: Vec<Values> = headings
        .columns
        .iter()
        .filter(|c| c.column != Column::Part)
        .map(Values::of)
        .collect();
    let mut rows = headings.rows.clone();
    let mut groups = Groups {
        list: Vec::new(),
        by_part: HashMap::new(),
        last: 0,
        columns: values.len(),
    };
    if part.is_none() {
        let estimate = text.len() / (12 * values.len().max(1)) + 1;
        groups
            .list
            .push(Group::new(None, values.len(), estimate.min(4096)));
    }
    let needed = values.iter().map(|v| v.index + 1).max().unwrap_or(0);
    let mut mark = Mark::Unknown;
    let mut fields: Vec<Field> = Vec::with_capacity(headings.count + 1);
    let mut first = true;
    let mut last_row = None;
    let mut plainly = Plainly::new(&values, part, headings.count);
    loop {
        // The first row may hold the units, and numbers with a decimal comma are never plain.
        if !first
            && mark != Mark::Comma
            && let Some(group) = groups.list.first_mut()
            && let Some((line, has_point)) = plainly.row(&mut rows, &values, group)
        {
            if has_point {
                mark = Mark::Point;
            }
            last_row = Some((line, None, true));
            continue;
        }
        let Some(line) = rows.next(&mut fields) else {
            break;
        };
        if fields.is_empty() || is_comment(&fields) || fields.iter().all(|f| f.bytes.is_empty()) {
            continue;
        }
        if std::mem::take(&mut first) && units_row(&fields, &mut values) {
            notes.push(Note::new(
                "units_row",
                format!("line {line} holds the units of the columns"),
            ));
            continue;
        }
        let name = part.map(|index| fields.get(index).map_or(b"".as_slice(), |f| f.bytes));
        let Some(group) = groups.of(name) else {
            continue;
        };
        group.lines.push(line);
        read_row(group, &values, &fields, line, headings.delimiter, &mut mark);
        row_length(group, &fields, needed, headings.count, line);
        let whole = values
            .iter()
            .all(|v| fields.get(v.index).is_some_and(|f| !f.bytes.is_empty()));
        last_row = Some((line, name, whole));
    }
    if mark == Mark::Comma {
        notes.push(Note::new(
            "decimal_comma",
            "numbers are written with a decimal comma",
        ));
    }
    cut_off(text, &mut groups, last_row, headings.delimiter);
    if groups.list.iter().all(|group| group.lines.is_empty()) {
        return Err(vec![Note::new(
            "no_data",
            format!(
                "no rows follow the headings in line {}: measure or export the part again",
                headings.line
            ),
        )]);
    }
    let portions = groups
        .list
        .into_iter()
        .map(|group| portion(group, &values, layout))
        .collect();
    Ok(Table { portions, notes })
}

impl Values {
    fn of(located: &Located) -> Self {
        Values {
            column: located.column,
            index: located.index,
            heading: located.heading.clone(),
            unit: located.unit,
        }
    }
}

fn opening_notes(headings: &Headings<'_>) -> Vec<Note> {
    let mut notes = Vec::new();
    if let Some((code, words)) = headings.delimiter.note() {
        notes.push(Note::new(code, format!("fields are separated by {words}")));
    }
    if headings.line > 1 {
        notes.push(Note::new(
            "preamble",
            format!(
                "the headings stand in line {}; the lines before them were passed over",
                headings.line
            ),
        ));
    }
    notes
}

/// Rows that are numbers alone, without a detour by their fields.
struct Plainly {
    numbers: Vec<f64>,
    /// A bit for each number that belongs to a column.
    wanted: u64,
    /// Rows that may still be tried in vain: a table with text in it is better read by its fields.
    tries: u32,
}

impl Plainly {
    fn new(values: &[Values], part: Option<usize>, count: usize) -> Self {
        let possible = part.is_none() && count <= u64::BITS as usize;
        let bits = values.iter().map(|v| 1u64.wrapping_shl(v.index as u32));
        Plainly {
            numbers: vec![0.0; count],
            wanted: bits.fold(0, |all, bit| all | bit),
            tries: if possible { 10 } else { 0 },
        }
    }

    /// The next row into the columns: its line, and whether a number of theirs has a decimal point.
    fn row(
        &mut self,
        rows: &mut Rows<'_>,
        values: &[Values],
        group: &mut Group,
    ) -> Option<(u32, bool)> {
        if self.tries == 0 {
            return None;
        }
        let Some((line, points)) = rows.numbers(&mut self.numbers) else {
            self.tries -= 1;
            return None;
        };
        group.lines.push(line);
        for (value, column) in values.iter().zip(&mut group.columns) {
            column.push(self.numbers.get(value.index).copied().unwrap_or(f64::NAN));
        }
        Some((line, points & self.wanted != 0))
    }
}

fn is_comment(fields: &[Field<'_>]) -> bool {
    let first = fields
        .first()
        .filter(|field| !field.quoted)
        .map_or(b"".as_slice(), |f| f.bytes);
    matches!(first.first(), Some(b'#' | b'!' | b'%')) && !first.starts_with(b"#N")
        || first.starts_with(b"//")
}

/// A row of units right under the headings gives its units to the columns.
fn units_row(fields: &[Field<'_>], values: &mut [Values]) -> bool {
    let unit_at = |value: &Values| {
        let text = std::str::from_utf8(fields.get(value.index)?.bytes).ok()?;
        let text = text
            .trim()
            .trim_start_matches(['(', '['])
            .trim_end_matches([')', ']']);
        if text == "1" {
            None
        } else {
            unit::parse(text, value.column)
        }
    };
    let units: Option<Vec<Unit>> = values.iter().map(unit_at).collect();
    let Some(units) = units else { return false };
    for (value, unit) in values.iter_mut().zip(units) {
        value.unit = Some(unit);
    }
    true
}

fn read_row(
    group: &mut Group,
    values: &[Values],
    fields: &[Field<'_>],
    line: u32,
    delimiter: Delimiter,
    mark: &mut Mark,
) {
    for (value, column) in values.iter().zip(&mut group.columns) {
        let Some(field) = fields.get(value.index) else {
            column.push(f64::NAN);
            continue;
        };
        let comma_allowed = delimiter != Delimiter::Comma || field.quoted;
        match decimal::parse(field.bytes, mark, comma_allowed) {
            Ok(number) => column.push(number),
            Err(fault) => {
                column.push(f64::NAN);
                number_fault(&mut group.faults, fault, field.bytes, line, &value.heading);
            }
        }
    }
}

#[cold]
fn number_fault(faults: &mut Faults, fault: Fault, field: &[u8], line: u32, heading: &str) {
    let heading = quoted(heading.as_bytes());
    let place = || format!("line {line}, column {heading}");
    match fault {
        Fault::Empty => faults.add("empty_cell", || {
            format!("{}: the cell is empty where a number was expected", place())
        }),
        Fault::NotFinite => faults.add("not_a_number", || {
            format!("{}: the instrument wrote {}, which is no finite number: measure the part again", place(), quoted(field))
        }),
        Fault::Text => faults.add("text_in_number", || {
            format!("{}: {} stands where a number was expected", place(), quoted(field))
        }),
        Fault::Mixed => faults.add("mixed_decimal_marks", || {
            format!("{}: {} has another decimal mark than the numbers before it: export with one of the two", place(), quoted(field))
        }),
    }
}

/// A row must have as many fields as there are headings; empty ones behind them are let pass.
fn row_length(group: &mut Group, fields: &[Field<'_>], needed: usize, count: usize, line: u32) {
    let found = fields.len();
    if found < needed {
        group.faults.add("short_row", || {
            format!(
                "line {line}: the row has {found} fields, expected {count}: the file is not whole"
            )
        });
    } else if fields
        .iter()
        .skip(count)
        .any(|field| !field.bytes.is_empty())
    {
        group.faults.add("ragged_row", || {
            format!("line {line}: the row has {found} fields under {count} headings (a decimal comma where a comma separates fields does this)")
        });
    }
}

/// Says that the file was cut off, where its last row shows it.
fn cut_off(
    text: &str,
    groups: &mut Groups,
    last_row: Option<(u32, Option<&[u8]>, bool)>,
    delimiter: Delimiter,
) {
    let Some((line, part, whole)) = last_row else {
        return;
    };
    let no_line_end = !text.ends_with(['\n', '\r']);
    let cut = no_line_end && !whole || cut::ends_mid_number(text.as_bytes(), |b| delimiter.is(b));
    if let Some(group) = groups.of(part).filter(|_| cut) {
        group.faults.add("truncated_line", || {
            format!("line {line}: the file ends within its last row: it was cut off; copy or export it again")
        });
    }
}

fn portion(group: Group, values: &[Values], layout: &Layout) -> Portion {
    let Group {
        part,
        lines,
        columns,
        mut faults,
    } = group;
    let named = part.as_ref().is_none_or(|part| !part.is_empty());
    if !named {
        let line = lines.first().copied().unwrap_or(0);
        faults.add("part_missing", || {
            format!("line {line}: the row names no part")
        });
    }
    if lines.is_empty() {
        faults.add("no_data", || "no rows follow the headings".to_owned());
    }
    if !faults.is_empty() {
        return Portion {
            part,
            raw: Err(faults.into_notes()),
        };
    }
    let raw = quantities(lines, columns, values, layout).map_err(|note| vec![note]);
    Portion { part, raw }
}

/// The columns of one part by quantity, in SI units.
struct Quantities<'v> {
    values: &'v [Values],
    columns: Vec<Vec<f64>>,
}

impl Quantities<'_> {
    fn has(&self, column: Column) -> bool {
        self.values.iter().any(|v| v.column == column)
    }

    /// Takes a column out, scaled to SI.
    fn take(&mut self, column: Column) -> Vec<f64> {
        let Some(at) = self.values.iter().position(|v| v.column == column) else {
            return Vec::new();
        };
        let mut numbers = self
            .columns
            .get_mut(at)
            .map(std::mem::take)
            .unwrap_or_default();
        let scale = self
            .values
            .get(at)
            .and_then(|v| v.unit)
            .map_or(1.0, |unit| unit.scale);
        if scale != 1.0 {
            numbers.iter_mut().for_each(|number| *number *= scale);
        }
        numbers
    }

    /// The phase in radians. Degrees where no unit is stated, unless the numbers could as well
    /// be radians.
    fn phase(&mut self) -> Result<Vec<f64>, Note> {
        let stated = self
            .values
            .iter()
            .any(|v| v.column == Column::Phase && v.unit.is_some());
        let mut phase = self.take(Column::Phase);
        if !stated {
            let largest = phase.iter().fold(0.0f64, |most, p| most.max(p.abs()));
            if largest <= TAU {
                return Err(Note::new(
                    "phase_unit_unknown",
                    format!(
                        "the phase reaches {largest:.3} and no heading says whether these are degrees or radians: name the unit in the heading or in the station's layout, such as `Phase (deg)`"
                    ),
                ));
            }
            phase.iter_mut().for_each(|p| *p = p.to_radians());
        }
        Ok(phase)
    }

    /// Whether the headings (first) or the layout say that voltages are peak values.
    fn peak(&self, layout: &Layout) -> bool {
        let of = |v: &Values| v.unit.and_then(|unit| unit.peak);
        self.values.iter().find_map(of).unwrap_or(layout.peak)
    }
}

fn quantities(
    lines: Vec<u32>,
    columns: Vec<Vec<f64>>,
    values: &[Values],
    layout: &Layout,
) -> Result<RawSweep, Note> {
    let mut q = Quantities { values, columns };
    let frequency = q.take(Column::Frequency);
    let complex = |re: Vec<f64>, im: Vec<f64>| -> Vec<Complex64> {
        re.into_iter()
            .zip(im)
            .map(|(re, im)| Complex64::new(re, im))
            .collect()
    };
    let measured = if q.has(Column::ARe) {
        let peak = q.peak(layout);
        Measured::Channels {
            a: complex(q.take(Column::ARe), q.take(Column::AIm)),
            b: complex(q.take(Column::BRe), q.take(Column::BIm)),
            peak,
        }
    } else if q.has(Column::RatioDb) {
        let phase = q.phase()?;
        let decibel = q.take(Column::RatioDb);
        let ratio = |(db, p): (f64, f64)| Complex64::from_polar(10f64.powf(db / 20.0), p);
        Measured::Ratio(decibel.into_iter().zip(phase).map(ratio).collect())
    } else if q.has(Column::Magnitude) {
        let phase = q.phase()?;
        let polar = |(m, p): (f64, f64)| Complex64::from_polar(m, p);
        let magnitude = q.take(Column::Magnitude);
        if let Some(at) = magnitude.iter().position(|m| *m < 0.0) {
            let line = lines.get(at).copied().unwrap_or(0);
            return Err(Note::new(
                "negative_magnitude",
                format!("line {line}: a magnitude of impedance is negative"),
            ));
        }
        Measured::Impedance(magnitude.into_iter().zip(phase).map(polar).collect())
    } else if q.has(Column::Resistance) {
        Measured::Impedance(complex(
            q.take(Column::Resistance),
            q.take(Column::Reactance),
        ))
    } else {
        let capacitance = q.take(Column::Capacitance);
        let loss = if q.has(Column::Esr) {
            Loss::Esr(q.take(Column::Esr))
        } else {
            Loss::Factor(q.take(Column::DissipationFactor))
        };
        Measured::Impedance(series(&frequency, &capacitance, loss))
    };
    Ok(RawSweep {
        frequency,
        lines,
        measured,
    })
}

enum Loss {
    Esr(Vec<f64>),
    Factor(Vec<f64>),
}

/// `Z = R - j/(ωC)` from the series capacitance and either R or D = R/|X| (IEC 60384-1, 4.8).
///
/// Above resonance an instrument shows a negative capacitance, and some show D negative with it.
fn series(frequency: &[f64], capacitance: &[f64], loss: Loss) -> Vec<Complex64> {
    let reactance = frequency
        .iter()
        .zip(capacitance)
        .map(|(f, c)| -1.0 / (TAU * f * c));
    match loss {
        Loss::Esr(esr) => reactance
            .zip(esr)
            .map(|(x, r)| Complex64::new(r, x))
            .collect(),
        Loss::Factor(factor) => reactance
            .zip(factor)
            .map(|(x, d)| {
                let d = if x > 0.0 { d.abs() } else { d };
                Complex64::new(d * x.abs(), x)
            })
            .collect(),
    }
}
