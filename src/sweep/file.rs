//! One file to its attempts: the order in which everything is applied.

use super::compensation::Standards;
use super::delimited::{self, Portion};
use super::method::{self, Measurement};
use super::naming::{self, Kind};
use super::raw::{Measured, RawSweep};
use super::validity::{self, Evidence};
use super::{Attempt, RawFile, Sweep, arrange, text, touchstone};
use crate::diagnostic::Note;
use crate::station::Station;
use sha2::{Digest, Sha256};
use std::fmt::Write;

/// Reads one sweep file: one attempt, or one for each part of a table with a `part` column.
///
/// A file that cannot be read gives an attempt with faults, never nothing. Where the station
/// names compensation standards, `standards` must hold them.
pub fn read_file(file: &RawFile, station: &Station, standards: Option<&Standards>) -> Vec<Attempt> {
    let digest = sha256(&file.bytes);
    let named = naming::stem(&file.name);
    let contents = read(file, station);
    contents
        .portions
        .into_iter()
        .map(|Portion { part, raw }| {
            let (part, attempt) = naming::part_and_attempt(part.as_deref().unwrap_or(named));
            let mut notes = contents.notes.clone();
            let sweep = raw.and_then(|raw| evaluate(raw, station, standards, &mut notes));
            Attempt {
                part: part.to_owned(),
                attempt,
                file: file.name.clone(),
                sha256: digest.clone(),
                sweep,
                notes,
            }
        })
        .collect()
}

/// How far a file's sweeps reach, before any method or check.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Extent {
    /// Sweeps in the file: more than one in a table with a `part` column.
    pub parts: usize,
    /// Points of all of them.
    pub points: usize,
    /// Frequency of the file's last point in Hz, as written.
    pub last: f64,
}

/// How many points a file holds, and where it ends: what there is to see while it is being written.
///
/// # Errors
/// The faults of reading, where the file does not read as a sweep to its last byte.
pub fn extent(file: &RawFile, station: &Station) -> Result<Extent, Vec<Note>> {
    let contents = try_read(file, station)?;
    let mut extent = Extent {
        parts: 0,
        points: 0,
        last: f64::NAN,
    };
    let mut last_line = 0;
    for portion in contents.portions {
        let raw = portion.raw?;
        extent.parts += 1;
        extent.points += raw.frequency.len();
        let end = raw.lines.last().copied().unwrap_or(0);
        if let Some(last) = raw.frequency.last().filter(|_| end >= last_line) {
            (extent.last, last_line) = (*last, end);
        }
    }
    Ok(extent)
}

/// Reads a sweep of the jig itself, empty, shorted or with a standard in it: no compensation, and none of the checks that
/// expect a capacitor.
pub fn read_standard(file: &RawFile, station: &Station) -> Result<Sweep, Vec<Note>> {
    let mut portions = read(file, station).portions;
    match (portions.pop(), portions.is_empty()) {
        (Some(portion), true) => measure(&mut portion.raw?, station, &mut Vec::new()).map(|m| m.0),
        _ => Err(vec![Note::new(
            "many_parts",
            "the file holds several parts where one standard was expected",
        )]),
    }
}

/// What a file holds, before any method.
struct Contents {
    portions: Vec<Portion>,
    notes: Vec<Note>,
}

fn read(file: &RawFile, station: &Station) -> Contents {
    match try_read(file, station) {
        Ok(contents) => contents,
        Err(faults) => Contents {
            portions: vec![Portion {
                part: None,
                raw: Err(faults),
            }],
            notes: Vec::new(),
        },
    }
}

fn try_read(file: &RawFile, station: &Station) -> Result<Contents, Vec<Note>> {
    match naming::kind(&file.name) {
        Some(Kind::Touchstone { ports }) => {
            let located = touchstone::read_located(&file.bytes, ports)?;
            let raw = RawSweep {
                frequency: located.network.frequency.clone(),
                lines: located.lines,
                measured: Measured::Network(located.network),
            };
            let notes = vec![Note::new("touchstone", "read as a Touchstone file")];
            Ok(Contents {
                portions: vec![Portion {
                    part: None,
                    raw: Ok(raw),
                }],
                notes,
            })
        }
        Some(Kind::Delimited) | None => {
            let one = |note| vec![note];
            let text = text::decode(&file.bytes).map_err(one)?;
            let layout = station.layout.as_ref().ok_or_else(|| {
                one(Note::new(
                    "layout_missing",
                    "the file is a table, but the station file has no `layout` that says what its columns are: add it",
                ))
            })?;
            let table = delimited::read(&text.text, layout)?;
            let notes = text.note.into_iter().chain(table.notes).collect();
            let portions = table.portions;
            Ok(Contents { portions, notes })
        }
    }
}

/// A raw sweep to a judged-valid sweep.
fn evaluate(
    mut raw: RawSweep,
    station: &Station,
    standards: Option<&Standards>,
    notes: &mut Vec<Note>,
) -> Result<Sweep, Vec<Note>> {
    let named = &station.compensation;
    let needed = named.open.is_some() || named.short.is_some() || named.load.is_some();
    if needed && standards.is_none() {
        return Err(vec![Note::new(
            "compensation_missing",
            "the station names compensation sweeps, but they could not be used: record the standards again",
        )]);
    }
    let (sweep, channels) = measure(&mut raw, station, notes)?;
    let mut evidence = Evidence::of(station);
    if let Some((a, b)) = channels {
        evidence = evidence.with_channels(a, b);
    }
    if let Some(open) = standards.and_then(|s| s.open_reading(&sweep.frequency)) {
        evidence = evidence.with_open(open, sweep.impedance.clone());
    }
    let sweep = match standards {
        Some(standards) => standards.apply(sweep)?,
        None => sweep,
    };
    let findings = validity::check(&sweep, &evidence);
    notes.extend(findings.warnings);
    if findings.faults.is_empty() {
        Ok(sweep)
    } else {
        Err(findings.faults)
    }
}

/// The two channels in V, in the order of the sweep.
type Channels = (Vec<num_complex::Complex64>, Vec<num_complex::Complex64>);

fn measure(
    raw: &mut RawSweep,
    station: &Station,
    notes: &mut Vec<Note>,
) -> Result<(Sweep, Option<Channels>), Vec<Note>> {
    arrange::arrange(raw, notes)?;
    let Measurement { impedance, level } =
        method::apply(raw, station).map_err(|note| vec![note])?;
    let sweep = Sweep {
        frequency: std::mem::take(&mut raw.frequency),
        impedance,
        level,
    };
    let channels = match &mut raw.measured {
        Measured::Channels { a, b, .. } => Some((std::mem::take(a), std::mem::take(b))),
        _ => None,
    };
    Ok((sweep, channels))
}

fn sha256(bytes: &[u8]) -> String {
    let mut text = String::with_capacity(64);
    for byte in Sha256::digest(bytes) {
        // Writing to a string cannot fail.
        let _ = write!(text, "{byte:02x}");
    }
    text
}
