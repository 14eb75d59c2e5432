//! The rows of network data.

use super::Located;
use super::keywords::{Header, Matrix, keyword};
use super::tokens::{Line, lines, number, words};
use crate::diagnostic::Note;
use crate::sweep::faults::{Faults, quoted};
use crate::sweep::{Network, Parameter};
use num_complex::Complex64;

/// Reads the rows; a point may be spread over lines, but a new point begins a new line.
pub(super) fn read(text: &[u8], header: &Header) -> Result<Located, Vec<Note>> {
    let mut rows = Rows::new(header);
    let mut faults = Faults::default();
    let mut ended = false;
    for line in lines(text).filter(|line| line.number >= header.data_from) {
        match line.text.first() {
            Some(b'[') => {
                ended = end_of_data(line).map_err(|note| vec![note])?;
                break;
            }
            Some(b'#') => {}
            _ => {
                if !rows.line(line, &mut faults) {
                    break;
                }
            }
        }
    }
    rows.whole(&mut faults);
    if !header.version_one() && !ended {
        faults.add("file_incomplete", || {
            "the file ends without [End]: it was cut off; copy or export it again".to_owned()
        });
    }
    if let Some(points) = header
        .points
        .filter(|&points| points != rows.frequency.len())
    {
        let found = rows.frequency.len();
        faults.add("points_conflict", || {
            format!(
                "[Number of Frequencies] says {points}, the file holds {found}: it is not whole"
            )
        });
    }
    if faults.is_empty() {
        Ok(rows.finish())
    } else {
        Err(faults.into_notes())
    }
}

/// Whether a keyword after the rows ends the data properly.
fn end_of_data(line: Line<'_>) -> Result<bool, Note> {
    let (keyword, _) = keyword(line)?;
    match keyword.as_str() {
        "end" | "noise data" => Ok(true),
        _ => Err(Note::new(
            "keyword_unknown",
            format!(
                "line {}: [{}] stands among the rows of data",
                line.number,
                keyword.escape_default()
            ),
        )),
    }
}

struct Rows<'h> {
    header: &'h Header,
    /// Numbers of one point: the frequency and two for each element held.
    width: usize,
    point: Vec<f64>,
    frequency: Vec<f64>,
    lines: Vec<u32>,
    values: Vec<Complex64>,
}

impl<'h> Rows<'h> {
    fn new(header: &'h Header) -> Self {
        let n = header.ports;
        let elements = if header.matrix == Matrix::Full {
            n * n
        } else {
            n * (n + 1) / 2
        };
        Rows {
            header,
            width: 1 + 2 * elements,
            point: Vec::new(),
            frequency: Vec::new(),
            lines: Vec::new(),
            values: Vec::new(),
        }
    }

    /// Takes one line; false where the data end with it.
    fn line(&mut self, line: Line<'_>, faults: &mut Faults) -> bool {
        let begins = self.point.is_empty();
        let before = self.point.len();
        for word in words(line.text) {
            match number(word) {
                Some(value) => self.point.push(value),
                None => {
                    let code = if is_not_finite(word) {
                        "not_a_number"
                    } else {
                        "text_in_number"
                    };
                    faults.add(code, || {
                        format!(
                            "line {}: {} stands where a number was expected",
                            line.number,
                            quoted(word)
                        )
                    });
                    self.point.push(f64::NAN);
                }
            }
        }
        if begins {
            if self.is_noise(before) {
                self.point.clear();
                return false;
            }
            self.lines.push(line.number);
        }
        match self.point.len().cmp(&self.width) {
            std::cmp::Ordering::Less => {}
            std::cmp::Ordering::Equal => self.take(),
            std::cmp::Ordering::Greater => {
                let (found, expected) = (self.point.len(), self.width);
                faults.add("ragged_row", || {
                    format!("line {}: the point has {found} numbers, expected {expected} for {} port(s)", line.number, self.header.ports)
                });
                self.lines.truncate(self.frequency.len());
                self.point.clear();
            }
        }
        true
    }

    /// Version 1: noise rows have five numbers and begin at a frequency not above the last one.
    fn is_noise(&self, before: usize) -> bool {
        self.header.version_one()
            && self.header.ports == 2
            && self.point.len() - before == 5
            && matches!(
                (self.point.first(), self.frequency.last()),
                (Some(f), Some(last)) if f * self.header.options.hertz <= *last
            )
    }

    fn take(&mut self) {
        let options = &self.header.options;
        let Some((&frequency, pairs)) = self.point.split_first() else {
            return;
        };
        self.frequency.push(frequency * options.hertz);
        let start = self.values.len();
        let held = pairs.chunks(2).map(|pair| match *pair {
            [first, second] => options.format.complex(first, second),
            _ => Complex64::new(f64::NAN, f64::NAN),
        });
        let n = self.header.ports;
        if self.header.matrix == Matrix::Full {
            self.values.extend(held);
        } else {
            let held: Vec<Complex64> = held.collect();
            let at = |i: usize, k: usize| {
                let (low, high) = (i.min(k), i.max(k));
                let index = match self.header.matrix {
                    Matrix::Lower => high * (high + 1) / 2 + low,
                    _ => low * n - low * (low + 1) / 2 + high,
                };
                held.get(index)
                    .copied()
                    .unwrap_or(Complex64::new(f64::NAN, f64::NAN))
            };
            self.values
                .extend((0..n * n).map(|index| at(index / n, index % n)));
        }
        if self.header.order_21_12 && self.header.matrix == Matrix::Full {
            self.values.swap(start + 1, start + 2);
        }
        self.point.clear();
    }

    fn whole(&mut self, faults: &mut Faults) {
        if self.point.is_empty() {
            return;
        }
        let (found, expected) = (self.point.len(), self.width);
        let line = self.lines.pop().unwrap_or(0);
        faults.add("truncated_line", || {
            format!("line {line}: the last point has {found} numbers, expected {expected}: the file was cut off; copy or export it again")
        });
        self.point.clear();
    }

    /// The network, denormalised: version 1 holds Z/R and Y·R.
    fn finish(self) -> Located {
        let header = self.header;
        let mut values = self.values;
        let n = header.ports;
        if header.version_one() && header.options.parameter != Parameter::Scattering {
            let of = |port: usize| header.reference.get(port).copied().unwrap_or(f64::NAN);
            for (at, value) in values.iter_mut().enumerate() {
                let scale = (of(at / n % n) * of(at % n)).sqrt();
                match header.options.parameter {
                    Parameter::Impedance => *value *= scale,
                    _ => *value /= scale,
                }
            }
        }
        Located {
            network: Network {
                ports: n,
                frequency: self.frequency,
                parameter: header.options.parameter,
                values,
                reference: header.reference.clone(),
            },
            lines: self.lines,
        }
    }
}

fn is_not_finite(word: &[u8]) -> bool {
    fast_float2::parse::<f64, _>(word).is_ok()
}
