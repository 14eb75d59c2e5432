//! What an instrument answered, as a file that our own reader reads with the station's layout.

use super::numbers::Columns;
use crate::station::{Column, Layout};

/// The table: who measured, the headings of the layout, one line for each point.
pub fn write(columns: &Columns, layout: &Layout, identity: Option<&str>) -> Vec<u8> {
    let mut out = Vec::new();
    if let Some(identity) = identity {
        // A line before the headings that cannot be taken for them: no separators.
        let plain = identity.replace([',', ';', '\t', '"'], " ");
        out.extend_from_slice(format!("# {}\n", plain.trim()).as_bytes());
    }
    let of = |column: &Column| columns.iter().find(|(c, _)| c == column).map(|(_, v)| v);
    let chosen: Vec<(&str, &Vec<String>)> = layout
        .columns
        .iter()
        .filter_map(|(column, heading)| Some((heading.as_str(), of(column)?)))
        .collect();
    let headings: Vec<String> = chosen.iter().map(|(heading, _)| field(heading)).collect();
    out.extend_from_slice(headings.join(",").as_bytes());
    out.push(b'\n');
    let points = chosen
        .iter()
        .map(|(_, values)| values.len())
        .min()
        .unwrap_or(0);
    for i in 0..points {
        for (at, (_, values)) in chosen.iter().enumerate() {
            if at > 0 {
                out.push(b',');
            }
            out.extend_from_slice(values.get(i).map_or(b"", |v| v.as_bytes()));
        }
        out.push(b'\n');
    }
    out
}

/// A heading as a field of a table (RFC 4180).
fn field(text: &str) -> String {
    if text.contains([',', '"']) {
        format!("\"{}\"", text.replace('"', "\"\""))
    } else {
        text.to_owned()
    }
}
