//! How the lot was measured, against what limit file and station demand.
//!
//! What is demanded and not known counts as not met. Times are compared with the time of
//! measurement, never with the clock.

use super::Lot;
use crate::diagnostic::Note;
use crate::judgement::PartRecord;
use crate::label;
use crate::limits::Limits;
use crate::quantity::{engineering, shortest};
use crate::station::Station;
use chrono::{DateTime, FixedOffset, TimeDelta};
use serde::{Deserialize, Serialize};

/// The ageing law holds from 1 h to 1e5 h after last heat.
const AGE_HOURS: std::ops::RangeInclusive<f64> = 1.0..=1e5;

/// A condition that the limit file or the station demands, and what was found.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct ConditionSection {
    /// `drive`, `temperature`, `calibration`, `jig check`, `label`, `ageing`.
    pub name: String,
    pub demanded: String,
    pub found: String,
    pub met: bool,
}

/// A condition and, where it is not met, the reason that holds the lot.
pub(super) struct Checked {
    pub(super) section: ConditionSection,
    pub(super) reason: Option<Note>,
}

fn checked(
    name: &str,
    demanded: String,
    found: String,
    failure: Option<(&str, String)>,
) -> Checked {
    Checked {
        section: ConditionSection {
            name: name.to_owned(),
            demanded,
            found,
            met: failure.is_none(),
        },
        reason: failure.map(|(code, text)| Note::new(code, text)),
    }
}

/// Every condition that applies, in a fixed order.
pub(super) fn check(
    lot: &Lot,
    limits: &Limits,
    station: &Station,
    parts: &[PartRecord],
) -> Vec<Checked> {
    [
        drive(lot, limits, parts),
        temperature(lot, limits),
        ageing(lot, limits),
        calibration(lot, station),
        jig_check(lot, station),
        label_against_lot(lot),
        date_code(lot, limits),
    ]
    .into_iter()
    .flatten()
    .collect()
}

fn drive(lot: &Lot, limits: &Limits, parts: &[PartRecord]) -> Option<Checked> {
    let window = limits.conditions.drive?;
    let demanded = window.words("V");
    let volts = |v: f64| engineering(v, "V", 3);
    let seen: Vec<(&PartRecord, f64)> = parts
        .iter()
        .filter_map(|p| p.drive.map(|d| (p, d)))
        .collect();
    if let Some((lowest, highest)) = range(seen.iter().map(|(_, d)| *d)) {
        let outside: Vec<&str> = seen
            .iter()
            .filter(|(_, d)| !window.contains_nearly(*d))
            .map(|(p, _)| p.part.as_str())
            .collect();
        let found = format!("{} to {} in the sweeps", volts(lowest), volts(highest));
        let failure = (!outside.is_empty()).then(|| {
            let text = format!(
                "the voltage across the part at the test frequency lies outside {demanded} for {}: set the drive and measure again",
                some_parts(&outside)
            );
            ("drive_out_of_range", text)
        });
        return Some(checked("drive", demanded, found, failure));
    }
    let failure = match lot.drive {
        Some(v) if window.contains_nearly(v) => None,
        Some(v) => Some(format!(
            "the drive was {}, {demanded} is demanded: set the drive and measure the lot again",
            volts(v)
        )),
        None => Some(format!(
            "the drive is not known, {demanded} is demanded: give `drive` in lot.yaml as it was set"
        )),
    };
    let found = lot
        .drive
        .map_or("not stated".to_owned(), |v| format!("{} as set", volts(v)));
    Some(checked(
        "drive",
        demanded,
        found,
        failure.map(|text| ("drive_out_of_range", text)),
    ))
}

fn temperature(lot: &Lot, limits: &Limits) -> Option<Checked> {
    let window = limits.conditions.temperature?;
    let demanded = window.words("°C");
    let degrees = |t: f64| shortest(t, "°C");
    let failure = match lot.temperature {
        Some(t) if window.contains_nearly(t) => None,
        Some(t) => Some(format!(
            "the ambient temperature was {}, {demanded} is demanded: let the parts settle and measure again",
            degrees(t)
        )),
        None => Some(format!(
            "the ambient temperature is not known, {demanded} is demanded: give `ambient: {{temperature: …}}` in lot.yaml"
        )),
    };
    let found = lot.temperature.map_or("not stated".to_owned(), degrees);
    Some(checked(
        "temperature",
        demanded,
        found,
        failure.map(|text| ("temperature_out_of_range", text)),
    ))
}

fn ageing(lot: &Lot, limits: &Limits) -> Option<Checked> {
    let ageing = limits.conditions.ageing?;
    let demanded = format!(
        "capacitance referred to {} after last heat at {} per decade",
        shortest(ageing.refer_to, "s"),
        shortest(ageing.per_decade, "1")
    );
    let (found, failure) = match lot.age_hours() {
        None => (
            "last heat not stated".to_owned(),
            Some("the limit file refers capacitance to a time since last heat, and `last_heat` is not in lot.yaml: \
                  ask the supplier or heat and wait as the part's specification says".to_owned()),
        ),
        Some(hours) if AGE_HOURS.contains(&hours) => (format!("last heat {hours:.0} h before the measurement"), None),
        Some(hours) => (
            format!("last heat {hours:.1} h before the measurement"),
            Some(format!(
                "last heat lies {hours:.1} h before the measurement; the law of ageing holds from 1 h to 100 000 h: check `last_heat` in lot.yaml"
            )),
        ),
    };
    Some(checked(
        "ageing",
        demanded,
        found,
        failure.map(|text| ("ageing_unknown", text)),
    ))
}

/// The week of the date code against the greatest age that the limit file allows. The code names a week:
/// the parts are no older than its Monday and no younger than its Sunday.
fn date_code(lot: &Lot, limits: &Limits) -> Option<Checked> {
    let most = limits.conditions.date_code_age?;
    let demanded = format!("a date code at most {:.0} weeks old", most / 604_800.0);
    let ask = "ask the quality engineer before the reel is used";
    let weeks = lot.date_code.as_deref().map(label::weeks);
    let (found, failure) = match (lot.date_code.as_deref(), weeks.as_deref()) {
        (Some(text), Some([week])) => {
            let found = format!("date code {text}, measured {}", lot.measured.date_naive());
            let days = week.days_before(lot.measured.date_naive());
            let failure = match days {
                None => Some(format!(
                    "the date code {text} cannot be reckoned with: {ask}"
                )),
                Some(days) if days < 0 => Some(format!(
                    "the date code {text} lies after the measurement: read the printed label again"
                )),
                Some(days) if (days - 6) as f64 * 86_400.0 > most => Some(format!(
                    "the date code {text} is {} weeks old, {demanded} is demanded: {ask}",
                    days / 7
                )),
                Some(_) => None,
            };
            (found, failure)
        }
        (Some(text), _) => (
            format!("date code {text}"),
            Some(format!(
                "the week of the date code {text} is not clear: {ask}"
            )),
        ),
        (None, _) => (
            "not stated".to_owned(),
            Some(format!(
                "the date code is not known, {demanded} is demanded: give `date_code` in lot.yaml"
            )),
        ),
    };
    Some(checked(
        "date code",
        demanded,
        found,
        failure.map(|text| ("date_code_out_of_range", text)),
    ))
}

fn calibration(lot: &Lot, station: &Station) -> Option<Checked> {
    let instrument = station.instrument.as_ref()?;
    let due = instrument.due?;
    let day = lot.measured.date_naive();
    let late = day > due;
    let early = instrument
        .calibrated
        .is_some_and(|calibrated| day < calibrated);
    let failure = if late {
        Some(format!(
            "the calibration of {} was due on {due}, the lot was measured on {day}: measure again with a calibrated instrument",
            instrument.asset
        ))
    } else if early {
        Some(format!(
            "{} was calibrated only after the lot was measured on {day}: check the dates",
            instrument.asset
        ))
    } else {
        None
    };
    Some(checked(
        "calibration",
        format!("{} calibrated, due {due}", instrument.asset),
        format!("measured {day}"),
        failure.map(|text| ("calibration_expired", text)),
    ))
}

fn jig_check(lot: &Lot, station: &Station) -> Option<Checked> {
    let jig = station.jig.as_ref()?;
    let valid_for = jig.valid_for?;
    let last = jig.checked.max(lot.run.jig_checked);
    let demanded = format!(
        "{} checked within {} before the measurement",
        jig.asset,
        shortest(valid_for, "s")
    );
    let again = "check the jig and measure the lot again";
    let (found, failure) = match last {
        None => (
            "no check stated".to_owned(),
            Some(format!("no check of jig {} is stated: {again}", jig.asset)),
        ),
        Some(at) => {
            let found = format!("checked {}, measured {}", minute(at), minute(lot.measured));
            let age = lot.measured.signed_duration_since(at);
            let failure = if age < TimeDelta::zero() {
                Some(format!(
                    "jig {} was checked only after the lot was measured: {again}",
                    jig.asset
                ))
            } else if age.num_milliseconds() as f64 / 1e3 > valid_for {
                let over = shortest((age.num_minutes() as f64 * 60.0).max(60.0), "s");
                Some(format!(
                    "the check of jig {} was {over} old when the lot was measured, and holds for {}: {again}",
                    jig.asset,
                    shortest(valid_for, "s")
                ))
            } else {
                None
            };
            (found, failure)
        }
    };
    Some(checked(
        "jig check",
        demanded,
        found,
        failure.map(|text| ("jig_check_expired", text)),
    ))
}

fn minute(at: DateTime<FixedOffset>) -> String {
    at.format("%Y-%m-%d %H:%M%:z").to_string()
}

fn label_against_lot(lot: &Lot) -> Option<Checked> {
    let text = lot.label.as_ref()?;
    let demanded = "label and lot.yaml agree".to_owned();
    let words = |notes: &[Note]| {
        notes
            .iter()
            .map(|n| n.text.clone())
            .collect::<Vec<_>>()
            .join("; ")
    };
    let label = match label::read(text) {
        Ok(label) => label,
        Err(why) => {
            let text = format!(
                "the scanned label cannot be read ({}): scan it again",
                words(&why.notes)
            );
            return Some(checked(
                "label",
                demanded,
                "not readable".to_owned(),
                Some(("label_unreadable", text)),
            ));
        }
    };
    if !label.confirm.is_empty() {
        let text = format!(
            "the scanned label needs a person's word ({}): confirm it against the reel",
            words(&label.confirm)
        );
        return Some(checked(
            "label",
            demanded,
            "to be confirmed".to_owned(),
            Some(("label_to_confirm", text)),
        ));
    }
    let expected = label::Expected {
        part: Some(&lot.part),
        lot: Some(&lot.lot),
        quantity: Some(lot.quantity),
        date_code: lot.date_code.as_deref(),
        supplier: lot.supplier.as_deref(),
        order: lot.order.as_deref(),
    };
    let mismatches = label::compare(&label, &expected);
    let failure = (!mismatches.is_empty()).then(|| {
        let each: Vec<String> = mismatches
            .iter()
            .map(|m| {
                format!(
                    "{}: `{}` on the label, `{}` in lot.yaml",
                    m.field, m.on_label, m.expected
                )
            })
            .collect();
        (
            "label_mismatch",
            format!(
                "the label contradicts lot.yaml ({}): find out which reel this is",
                each.join("; ")
            ),
        )
    });
    let found = if failure.is_some() {
        "they differ"
    } else {
        "they agree"
    };
    Some(checked("label", demanded, found.to_owned(), failure))
}

fn range(values: impl Iterator<Item = f64>) -> Option<(f64, f64)> {
    values.fold(None, |range, v| {
        Some(range.map_or((v, v), |(low, high): (f64, f64)| (low.min(v), high.max(v))))
    })
}

/// `part 003`, `parts 003, 004`, `parts 001, 002, 003, 004, 005 and 12 more`.
pub(super) fn some_parts(names: &[&str]) -> String {
    const SHOWN: usize = 8;
    match names {
        [] => "no part".to_owned(),
        [one] => format!("part {one}"),
        many if many.len() <= SHOWN => format!("parts {}", many.join(", ")),
        many => format!(
            "parts {} and {} more",
            many[..SHOWN].join(", "),
            many.len() - SHOWN
        ),
    }
}
