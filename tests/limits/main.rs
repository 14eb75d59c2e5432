//! Limit, station, lot and site files: what valid ones mean, every fault of invalid ones, how faults
//! look, that no bytes bring the readers down, and the command that checks them.

mod any_bytes;
mod command;
mod limit_file;
mod lot_file;
mod rendering;
mod schema;
mod site_file;
mod station_bench;
mod station_file;
mod yaml;

use reelgate::diagnostic::Faults;

pub const LIMITS: &str = include_str!("files/good.yaml");
pub const FAULTY: &str = include_str!("files/faulty.yaml");
pub const STATION: &str = include_str!("files/station.yaml");
pub const LOT: &str = include_str!("files/lot.yaml");
pub const SITE: &str = include_str!("files/site.yaml");

/// A text with one piece replaced.
pub fn with(text: &str, piece: &str, by: &str) -> String {
    assert_eq!(
        text.matches(piece).count(),
        1,
        "`{piece}` stands once in the file"
    );
    text.replacen(piece, by, 1)
}

/// Code and marked text of every fault, in the order of the file: `unknown_key toleranse`.
pub fn listed<T: std::fmt::Debug>(read: Result<T, Faults>) -> Vec<String> {
    let faults = read.expect_err("a file with faults");
    let one = |fault: &reelgate::diagnostic::Fault| {
        let marked = fault.quote.as_ref().map_or(String::new(), |quote| {
            quote
                .text
                .chars()
                .skip(quote.from)
                .take(quote.to - quote.from)
                .collect()
        });
        assert!(
            !fault.found.is_empty() && !fault.expected.is_empty(),
            "{fault:?}"
        );
        assert!(fault.line > 0 && fault.column > 0, "{fault:?}");
        if marked.is_empty() {
            return fault.code.to_owned();
        }
        format!("{} {marked}", fault.code)
    };
    faults.iter().map(one).collect()
}
