//! Whether a file is whole: what it holds, against what the sweeps of this run hold.

use crate::station::Station;
use crate::sweep::{self, RawFile};

/// Frequencies that differ by less than this share are one: a file has them rounded.
const SAME_FREQUENCY: f64 = 1e-9;

/// What a file holds, as far as it tells whether more is to come.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Shape {
    /// Points of its sweeps together.
    pub points: usize,
    /// Frequency of the last point, Hz.
    pub last: f64,
    /// Line ends.
    pub lines: usize,
    /// Whether it ends with one.
    pub ended: bool,
}

impl Shape {
    /// The shape of a file that reads as a sweep to its last byte.
    pub fn of(file: &RawFile, station: &Station) -> Option<Shape> {
        let extent = sweep::extent(file, station).ok()?;
        let newlines = file.bytes.iter().filter(|b| **b == b'\n').count();
        let returns = file.bytes.iter().filter(|b| **b == b'\r').count();
        Some(Shape {
            points: extent.points,
            last: extent.last,
            lines: newlines.max(returns),
            ended: matches!(file.bytes.last(), Some(b'\n' | b'\r')),
        })
    }

    /// Whether two files were cut or measured to the same length.
    pub fn is_as_long_as(&self, other: &Shape) -> bool {
        self.points == other.points && same(self.last, other.last)
    }
}

fn same(a: f64, b: f64) -> bool {
    (a - b).abs() <= SAME_FREQUENCY * a.abs().max(b.abs())
}

/// What is known of whole sweeps: from the station file, and from those of this run.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Expected {
    /// As the station file has it.
    pub points: Option<usize>,
    /// The last sweep that was taken for whole.
    pub learned: Option<Shape>,
}

/// What a shape is against what is expected.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Length {
    /// As long as expected, to the last line end.
    Whole,
    /// Shorter than expected.
    Short,
    /// Nothing is known that it could be held against, or it is longer.
    Unknown,
}

impl Expected {
    /// Holds a shape against what is expected.
    pub fn of(&self, shape: &Shape) -> Length {
        let wanted = self.points.or(self.learned.map(|l| l.points));
        let Some(wanted) = wanted else {
            return Length::Unknown;
        };
        if shape.points < wanted {
            return Length::Short;
        }
        // Without a line end the last number could go on.
        let whole = shape.points == wanted
            && shape.ended
            && self.learned.is_none_or(|l| {
                l.points != wanted || same(shape.last, l.last) && shape.lines >= l.lines
            });
        if whole {
            Length::Whole
        } else {
            Length::Unknown
        }
    }

    /// How many points a whole sweep has and where it ends, for a sentence.
    pub fn words(&self) -> String {
        match (self.points, self.learned) {
            (Some(points), _) => format!("the station file says {points}"),
            (None, Some(shape)) => format!("the sweep before has {}", shape.points),
            (None, None) => "nothing is known of the number".to_owned(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn shape(points: usize, last: f64) -> Shape {
        Shape {
            points,
            last,
            lines: points + 1,
            ended: true,
        }
    }

    #[test]
    fn nothing_is_whole_before_something_is_known() {
        let expected = Expected::default();
        assert_eq!(expected.of(&shape(401, 30e6)), Length::Unknown);
    }

    #[test]
    fn the_station_file_says_how_many_points() {
        let expected = Expected {
            points: Some(401),
            learned: None,
        };
        assert_eq!(expected.of(&shape(401, 30e6)), Length::Whole);
        assert_eq!(expected.of(&shape(400, 30e6)), Length::Short);
        assert_eq!(expected.of(&shape(402, 30e6)), Length::Unknown);
        let cut = Shape {
            ended: false,
            ..shape(401, 30e6)
        };
        assert_eq!(expected.of(&cut), Length::Unknown);
    }

    #[test]
    fn the_sweep_before_says_where_it_ends_too() {
        let expected = Expected {
            points: None,
            learned: Some(shape(401, 30e6)),
        };
        assert_eq!(expected.of(&shape(401, 30e6)), Length::Whole);
        assert_eq!(expected.of(&shape(401, 10e6)), Length::Unknown);
        assert_eq!(expected.of(&shape(201, 30e6)), Length::Short);
        let without_footer = Shape {
            lines: 300,
            ..shape(401, 30e6)
        };
        assert_eq!(expected.of(&without_footer), Length::Unknown);
    }
}
