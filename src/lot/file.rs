//! A lot file from its bytes.

use super::{Lot, bench_run};
use crate::diagnostic::yaml::{Fields, Node, Reader, parse_date, parse_moment, shown};
use crate::diagnostic::{Faults, Source, yaml};
use crate::quantity::Dimension;
use chrono::{DateTime, FixedOffset, NaiveDateTime, NaiveTime};

/// JSON Schema (draft 2020-12) of a lot file, for editors.
pub const SCHEMA: &str = include_str!("lot.schema.json");

const KEYS: [&str; 15] = [
    "lot",
    "part",
    "supplier",
    "quantity",
    "date_code",
    "order",
    "label",
    "operator",
    "station",
    "measured",
    "ambient",
    "drive",
    "last_heat",
    "sweeps",
    "run",
];

/// Most parts that a lot can have.
const MOST: u64 = 1_000_000_000;

/// Reads a lot file. `path` is only named in faults.
///
/// Errors: every fault of the file, with its place.
pub fn read(path: &str, bytes: &[u8]) -> Result<Lot, Faults> {
    let source = Source::new(path, bytes)?;
    let root = yaml::parse(&source)?;
    let mut reader = Reader::new(&source);
    let lot = lot(&mut reader, &root);
    reader.finish(lot)
}

fn lot(reader: &mut Reader<'_>, root: &Node) -> Option<Lot> {
    let what = "a lot file";
    let fields = reader.fields(root, what, &KEYS)?;
    let mut name = |key: &str, example: &str| {
        let node = reader.required(&fields, key, what, example)?;
        reader.name(node, &format!("`{key}`"))
    };
    let lot = name("lot", "26K-0457");
    let part = name("part", "RG-0475-X7R");
    let station = name("station", "BENCH-2");
    let quantity = reader
        .required(&fields, "quantity", what, "4000")
        .and_then(|node| reader.integer(node, "`quantity`", (1, MOST)));
    let mut line = |key: &str| match fields.get(key) {
        None => Some(None),
        Some(node) => reader.line(node, &format!("`{key}`")).map(Some),
    };
    let (supplier, date_code) = (line("supplier"), line("date_code"));
    let (order, operator) = (line("order"), line("operator"));
    let label = match fields.get("label") {
        None => Some(None),
        Some(node) => reader.text(node, "`label`").map(Some),
    };
    let measured = reader
        .required(&fields, "measured", what, "2026-10-05T09:12:00+02:00")
        .and_then(|node| reader.moment(node, "`measured`"));
    let ambient = ambient(reader, fields.get("ambient"));
    let drive = match fields.get("drive") {
        None => Some(None),
        Some(node) => drive(reader, node).map(Some),
    };
    let last_heat = last_heat(reader, &fields, measured);
    let sweeps = reader
        .required(&fields, "sweeps", what, "sweeps")
        .and_then(|node| reader.path(node, "`sweeps`"));
    let run = bench_run::read(reader, fields.get("run"));
    let (temperature, humidity) = ambient?;
    Some(Lot {
        lot: lot?,
        part: part?,
        supplier: supplier?,
        quantity: quantity?,
        date_code: date_code?,
        order: order?,
        label: label?,
        operator: operator?,
        station: station?,
        measured: measured?,
        temperature,
        humidity,
        drive: drive?,
        last_heat: last_heat?,
        sweeps: sweeps?,
        run: run?,
    })
}

fn ambient(reader: &mut Reader<'_>, node: Option<&Node>) -> Option<(Option<f64>, Option<f64>)> {
    let Some(node) = node else {
        return Some((None, None));
    };
    let fields = reader.fields(node, "`ambient`", &["temperature", "humidity"])?;
    let temperature = match fields.get("temperature") {
        None => Some(None),
        Some(node) => {
            let possible = |v: f64| (-80.0..=250.0).contains(&v);
            let expected = "a temperature from -80 °C to 250 °C";
            let what = "`temperature`";
            reader
                .quantity_if(node, what, Dimension::Temperature, possible, expected)
                .map(Some)
        }
    };
    let humidity = match fields.get("humidity") {
        None => Some(None),
        Some(node) => {
            let possible = |v: f64| (0.0..=1.0).contains(&v);
            let expected = "a relative humidity from 0 to 100 %";
            let what = "`humidity`";
            reader.share_if(node, what, possible, expected).map(Some)
        }
    };
    Some((temperature?, humidity?))
}

fn drive(reader: &mut Reader<'_>, node: &Node) -> Option<f64> {
    let possible = |v: f64| v > 0.0 && v <= 1000.0;
    let expected = "a voltage above zero and at most 1000 V";
    reader.quantity_if(node, "`drive`", Dimension::Voltage, possible, expected)
}

/// A day (its midnight) or a moment, in the local time of the measurement and not after it.
fn last_heat(
    reader: &mut Reader<'_>,
    fields: &Fields<'_>,
    measured: Option<DateTime<FixedOffset>>,
) -> Option<Option<NaiveDateTime>> {
    let Some(node) = fields.get("last_heat") else {
        return Some(None);
    };
    let text = reader.scalar(node, "`last_heat`")?;
    let day = parse_date(text).map(|day| day.and_time(NaiveTime::MIN));
    let offset = measured.map(|moment| *moment.offset());
    let moment = parse_moment(text).map(|moment| match offset {
        Some(offset) => moment.with_timezone(&offset).naive_local(),
        None => moment.naive_local(),
    });
    let Some(heated) = day.or(moment) else {
        let expected = "a day, `2026-07-01`, or day, time and offset from UTC";
        reader.not_a_time(node, "`last_heat`", expected);
        return None;
    };
    if measured.is_some_and(|measured| heated > measured.naive_local()) {
        reader.fault(
            node.span,
            "reversed",
            format!("`last_heat` {} after `measured`", shown(node)),
            "a time before the measurement",
            Some("check the two times".to_owned()),
        );
        return None;
    }
    Some(Some(heated))
}
