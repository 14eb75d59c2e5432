//! The uncertainty budget of a part's readings, line by line.

use super::text::wrapped;
use crate::diagnostic::printable;
use crate::limits;
use crate::quantity::engineering;
use crate::readings::{Budget, Component, Reader, Request, combined};
use crate::record::{BoundSection, Made, Sources};
use crate::station;
use std::fmt::Write;

/// The budget of every characteristic of one part; the files are those that were judged.
pub fn screen(sources: &Sources, made: &Made, part: &str) -> String {
    let mut out = format!("\nUncertainty budget of part {}\n", printable(part));
    let parsed = (
        limits::read(&sources.limits.name, &sources.limits.bytes),
        station::read(&sources.station.name, &sources.station.bytes),
    );
    let (Ok(limits), Ok(station)) = parsed else {
        return out;
    };
    let Some(curve) = made.curves.iter().find(|c| c.part == part) else {
        out.push_str("  there is no such part with a valid sweep\n");
        return out;
    };
    let budget = Budget::of(&station)
        .with_temperature_coefficients(&limits.conditions.temperature_coefficients);
    let reader = Reader::new(&curve.sweep, &budget);
    for bound in &limits.bounds {
        let request = Request {
            characteristic: bound.characteristic,
            place: bound.place,
            equivalent: limits.conditions.equivalent,
        };
        let components = reader.budget_table(&request);
        let _ = writeln!(out, "  {}", BoundSection::of(bound).name);
        lines(&mut out, &components, bound.characteristic.unit());
    }
    out.push_str(&wrapped(
        "First-order propagation, JCGM 100:2008, 5.1.2; a rectangular half-width counts divided by √3 (4.3.7). \
         Referral for ageing adds its own term to the capacitance that is judged.",
        "  ",
        "  ",
    ));
    out
}

fn lines(out: &mut String, components: &[Component], unit: &str) {
    if components.is_empty() {
        out.push_str("    no value, or the station states no uncertainty for it\n");
        return;
    }
    for component in components {
        let input = match component.unit {
            "1" => engineering(component.standard_uncertainty, "1", 2),
            other => engineering(component.standard_uncertainty, other, 3),
        };
        let contribution = engineering(component.contribution, unit, 3);
        let _ = writeln!(
            out,
            "    {:<28} {:>14} {:<12} {:>14}",
            component.name, input, component.distribution, contribution
        );
    }
    let _ = writeln!(
        out,
        "    {:<28} {:>14} {:<12} {:>14}",
        "standard uncertainty",
        "",
        "",
        engineering(combined(components), unit, 3)
    );
}
