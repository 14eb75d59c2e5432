//! Everything before the data: option line and, in version 2, the bracketed keywords.

use super::options::{self, Options};
use super::tokens::{Line, lines, number, words};
use crate::diagnostic::Note;
use crate::sweep::faults::quoted;

/// Which elements of a matrix the file holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Matrix {
    Full,
    /// Symmetric; the elements on and below the diagonal.
    Lower,
    /// Symmetric; the elements on and above the diagonal.
    Upper,
}

/// What stands before the data.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Header {
    version: u32,
    pub options: Options,
    pub ports: usize,
    /// Whether a two-port row is N11 N21 N12 N22 rather than row by row.
    pub order_21_12: bool,
    pub matrix: Matrix,
    /// One a port, Ω.
    pub reference: Vec<f64>,
    /// `[Number of Frequencies]`
    pub points: Option<usize>,
    /// Line of the first row of data, or of the line before it.
    pub data_from: u32,
}

impl Header {
    pub fn version_one(&self) -> bool {
        self.version == 1
    }
}

/// More ports than this are no capacitor and would only cost memory.
const MOST_PORTS: usize = 16;

/// Reads the header. `extension` is the number of ports the file's extension tells.
pub(super) fn read(text: &[u8], extension: Option<usize>) -> Result<Header, Note> {
    let mut found = Found::default();
    let mut in_information = false;
    let mut first_row = None;
    let mut awaiting_reference = false;
    for line in lines(text) {
        match line.text.first() {
            Some(b'[') => {
                let (keyword, rest) = keyword(line)?;
                if keyword == "begin information" || keyword == "end information" {
                    in_information = keyword.starts_with("begin");
                    continue;
                }
                if in_information {
                    continue;
                }
                if keyword == "network data" {
                    found.data_from = Some(line.number + 1);
                    break;
                }
                awaiting_reference = keyword == "reference";
                found.keyword(&keyword, rest, line.number)?;
            }
            _ if in_information => {}
            // Option lines after the first are passed over, as the specification says.
            Some(b'#') if found.options.is_none() => {
                let rest = line.text.get(1..).unwrap_or_default();
                found.options = Some(options::read(rest, line.number)?);
            }
            Some(b'#') => {}
            _ if awaiting_reference => found.reference_values(line.text, line.number)?,
            _ => {
                first_row = Some(line);
                break;
            }
        }
    }
    found.finish(first_row, extension)
}

#[derive(Default)]
struct Found {
    version: Option<u32>,
    options: Option<Options>,
    ports: Option<usize>,
    order_21_12: Option<bool>,
    matrix: Option<Matrix>,
    reference: Vec<f64>,
    points: Option<usize>,
    data_from: Option<u32>,
}

impl Found {
    fn keyword(&mut self, keyword: &str, rest: &[u8], line: u32) -> Result<(), Note> {
        let value = words(rest).next().unwrap_or_default().to_ascii_lowercase();
        let count = || {
            number(&value)
                .filter(|n| n.fract() == 0.0 && (1.0..=1e9).contains(n))
                .map(|n| n as usize)
        };
        let unexpected = |expected: &str| {
            Note::new(
                "keyword_value",
                format!(
                    "line {line}: [{keyword}] is {}, expected {expected}",
                    quoted(rest)
                ),
            )
        };
        match keyword {
            "version" => {
                let known = matches!(value.as_slice(), b"2.0" | b"2.1");
                self.version = Some(known.then_some(2).ok_or_else(|| unexpected("2.0"))?);
            }
            "number of ports" => {
                self.ports = Some(count().ok_or_else(|| unexpected("the number of ports"))?);
            }
            "number of frequencies" => {
                self.points = Some(count().ok_or_else(|| unexpected("the number of points"))?);
            }
            "two-port data order" | "two-port order" => {
                self.order_21_12 = Some(match value.as_slice() {
                    b"21_12" => true,
                    b"12_21" => false,
                    _ => return Err(unexpected("21_12 or 12_21")),
                });
            }
            "matrix format" => {
                self.matrix = Some(match value.as_slice() {
                    b"full" => Matrix::Full,
                    b"lower" => Matrix::Lower,
                    b"upper" => Matrix::Upper,
                    _ => return Err(unexpected("Full, Lower or Upper")),
                });
            }
            "reference" => self.reference_values(rest, line)?,
            "number of noise frequencies" => {}
            "mixed-mode order" => {
                return Err(Note::new(
                    "mixed_mode",
                    format!(
                        "line {line}: mixed-mode data are not read: export single-ended parameters"
                    ),
                ));
            }
            _ => {
                return Err(Note::new(
                    "keyword_unknown",
                    format!(
                        "line {line}: [{}] is no keyword that is known before the data",
                        keyword.escape_default()
                    ),
                ));
            }
        }
        Ok(())
    }

    fn reference_values(&mut self, text: &[u8], line: u32) -> Result<(), Note> {
        for word in words(text) {
            let value = number(word).filter(|&v| v > 0.0 && self.reference.len() < MOST_PORTS);
            self.reference.push(value.ok_or_else(|| {
                Note::new(
                    "reference_value",
                    format!("line {line}: {} is no port impedance, expected one positive number of ohms a port", quoted(word)),
                )
            })?);
        }
        Ok(())
    }

    fn finish(self, first_row: Option<Line<'_>>, extension: Option<usize>) -> Result<Header, Note> {
        let version = self.version.unwrap_or(1);
        let data_from = match (version, self.data_from, first_row) {
            (2, Some(line), _) => line,
            (2, None, _) => {
                return Err(Note::new(
                    "network_data_missing",
                    "a version 2 file needs [Network Data] before its rows: the file is not whole",
                ));
            }
            (_, _, Some(row)) => row.number,
            _ => {
                return Err(Note::new(
                    "no_data",
                    "the file holds no rows of data: measure or export the part again",
                ));
            }
        };
        let options = self.options.unwrap_or_default();
        let ports = match (version, self.ports, extension) {
            (2, Some(ports), Some(named)) if ports != named => {
                return Err(Note::new(
                    "ports_conflict",
                    format!("the file's name says {named} ports, [Number of Ports] says {ports}"),
                ));
            }
            (2, Some(ports), _) => ports,
            (2, None, _) => {
                return Err(Note::new(
                    "number_of_ports_missing",
                    "a version 2 file needs [Number of Ports]",
                ));
            }
            (_, _, Some(named)) => named,
            (_, _, None) => counted_ports(first_row)?,
        };
        if !(1..=MOST_PORTS).contains(&ports) {
            return Err(Note::new(
                "too_many_ports",
                format!("{ports} ports: a capacitor is measured with one or two"),
            ));
        }
        if version == 2 && ports == 2 && self.order_21_12.is_none() {
            return Err(Note::new(
                "data_order_missing",
                "a version 2 file of two ports needs [Two-Port Data Order]",
            ));
        }
        let stated = if self.reference.is_empty() {
            &options.reference
        } else {
            &self.reference
        };
        let reference = match stated.as_slice() {
            [one] => vec![*one; ports],
            many if many.len() == ports => many.to_vec(),
            many => {
                return Err(Note::new(
                    "reference_count",
                    format!(
                        "{} port impedances are stated for {ports} ports",
                        many.len()
                    ),
                ));
            }
        };
        Ok(Header {
            version,
            options,
            ports,
            order_21_12: ports == 2 && self.order_21_12.unwrap_or(true),
            matrix: self.matrix.unwrap_or(Matrix::Full),
            reference,
            points: self.points,
            data_from,
        })
    }
}

/// Ports by the length of the first row, where neither name nor keyword tells (version 1).
fn counted_ports(row: Option<Line<'_>>) -> Result<usize, Note> {
    match row.map(|row| words(row.text).count()) {
        Some(3) => Ok(1),
        Some(9) => Ok(2),
        other => Err(Note::new(
            "ports_unknown",
            format!(
                "the first row has {} numbers, so the number of ports is unclear: expected 3 (one port) or 9 (two ports)",
                other.unwrap_or(0)
            ),
        )),
    }
}

/// `[Keyword] rest`: the keyword in lower case with single spaces.
pub(super) fn keyword(line: Line<'_>) -> Result<(String, &[u8]), Note> {
    let end = line.text.iter().position(|&b| b == b']');
    let (Some(inside), Some(rest)) = (
        end.and_then(|end| line.text.get(1..end)),
        end.and_then(|end| line.text.get(end + 1..)),
    ) else {
        return Err(Note::new(
            "keyword_unknown",
            format!(
                "line {}: {} begins a keyword and never ends it",
                line.number,
                quoted(line.text)
            ),
        ));
    };
    let words: Vec<String> = words(inside)
        .map(|w| String::from_utf8_lossy(w).to_ascii_lowercase())
        .collect();
    Ok((words.join(" "), rest))
}
