//! Date codes: year and week (ISO 8601), and the other layouts of the date identifiers.
//!
//! Two-digit years are of this century.

use chrono::{Datelike, NaiveDate, Weekday};

/// An ISO 8601 week.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
#[allow(missing_docs)]
pub struct Week {
    pub year: i32,
    pub week: u32,
}

impl Week {
    /// Days from the Monday of the week to a day, negative where the day is before; `None` for a week that the
    /// calendar does not have.
    pub fn days_before(self, day: NaiveDate) -> Option<i64> {
        let monday = NaiveDate::from_isoywd_opt(self.year, self.week, Weekday::Mon)?;
        Some(day.signed_duration_since(monday).num_days())
    }
}

/// What a date field holds.
pub(super) enum Dates {
    /// Not a date field, or one of an agreed structure that is not known here.
    None,
    /// One reading.
    Clear,
    /// One reading is a date, another layout of that length is not.
    OnlyReading,
    Ambiguous,
    Invalid,
}

/// The weeks that a date code can mean: `2638`, `202638`, `260914`, `20260914`, letters after it
/// left out. Empty where it means none; more than one where it is ambiguous.
pub fn weeks(text: &str) -> Vec<Week> {
    let (readings, _) = readings(text);
    let mut out: Vec<Week> = readings;
    out.dedup();
    out
}

/// Reads the field of a date identifier.
pub(super) fn dates(identifier: &str, value: &str) -> Dates {
    let one = |week: Option<Week>| week.map_or(Dates::Invalid, |_| Dates::Clear);
    match identifier {
        "9D" => agreed(value),
        "10D" => one(year_week(value, 2)),
        "11D" => one(year_week(value, 4)),
        "12D" | "14D" | "16D" => one(date(value, 4)),
        "D" => one(date(value, 2)),
        _ => Dates::None,
    }
}

fn agreed(value: &str) -> Dates {
    let (found, layouts) = readings(value);
    match (found.as_slice(), layouts) {
        (_, 0) => Dates::None,
        ([], _) => Dates::Invalid,
        ([_], 1) => Dates::Clear,
        ([_], _) => Dates::OnlyReading,
        _ => Dates::Ambiguous,
    }
}

/// The valid readings, and how many layouts have that length.
fn readings(text: &str) -> (Vec<Week>, usize) {
    let digits = text.trim_end_matches(|c: char| c.is_ascii_alphabetic());
    if digits.is_empty() || !digits.bytes().all(|b| b.is_ascii_digit()) {
        return (Vec::new(), 0);
    }
    let layouts: Vec<Option<Week>> = match digits.len() {
        4 => vec![year_week(digits, 2)],
        6 => vec![year_week(digits, 4), date(digits, 2)],
        8 => vec![date(digits, 4)],
        _ => Vec::new(),
    };
    let count = layouts.len();
    (layouts.into_iter().flatten().collect(), count)
}

/// Year of `digits` digits, then the week; a week 53 only in the years that have one.
fn year_week(text: &str, digits: usize) -> Option<Week> {
    let (year, week) = text.split_at_checked(digits)?;
    let week = exactly(week, 2)?;
    let year = century(exactly(year, digits)?, digits);
    NaiveDate::from_isoywd_opt(year, week, Weekday::Mon)?;
    plausible(year).then_some(Week { year, week })
}

/// Year of `digits` digits, month, day: the week it lies in.
fn date(text: &str, digits: usize) -> Option<Week> {
    let (year, rest) = text.split_at_checked(digits)?;
    let (month, day) = rest.split_at_checked(2)?;
    let year = century(exactly(year, digits)?, digits);
    let date = NaiveDate::from_ymd_opt(year, exactly(month, 2)?, exactly(day, 2)?)?;
    let week = date.iso_week();
    plausible(year).then(|| Week {
        year: week.year(),
        week: week.week(),
    })
}

fn exactly(text: &str, digits: usize) -> Option<u32> {
    let all = text.len() == digits && text.bytes().all(|b| b.is_ascii_digit());
    all.then(|| text.parse().ok()).flatten()
}

fn century(year: u32, digits: usize) -> i32 {
    let year = i32::try_from(year).unwrap_or(0);
    if digits == 2 { 2000 + year } else { year }
}

/// A year that a component on a reel can bear.
fn plausible(year: i32) -> bool {
    (1980..=2099).contains(&year)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn week(year: i32, week: u32) -> Week {
        Week { year, week }
    }

    /// Week 53 exists in 2015, 2020 and 2026 (ISO 8601: years that begin or, in leap years, end on a Thursday).
    #[test]
    fn week_53() {
        for (year, has) in [(15, true), (20, true), (26, true), (21, false), (24, false)] {
            assert_eq!(
                weeks(&format!("{year}53")).len(),
                usize::from(has),
                "20{year}"
            );
        }
    }

    #[test]
    fn layouts() {
        assert_eq!(weeks("2638"), [week(2026, 38)]);
        assert_eq!(weeks("202638"), [week(2026, 38)]);
        assert_eq!(weeks("20260914"), [week(2026, 38)]);
        assert_eq!(weeks("260914"), [week(2026, 38)]);
        assert_eq!(weeks("2638A"), [week(2026, 38)]);
        assert_eq!(weeks("201105"), [week(2011, 5), week(2020, 45)]);
        assert_eq!(weeks("2600"), []);
        assert_eq!(weeks("A2638"), []);
        assert_eq!(weeks("20261301"), []);
    }
}
