//! Lot statistics of every characteristic.

use super::{Characteristic, part_anchor};
use crate::certificate::figures::{ABSENT, chance, index};
use crate::certificate::flow::Flow;
use crate::certificate::table::{Align, Cell, Column, Span, Table};
use indexmap::IndexMap;

pub(in crate::certificate) fn statistics(flow: &mut Flow, characteristics: &[Characteristic]) {
    flow.heading("Statistics", 90.0);
    flow.subheading("Location and spread", 60.0);
    spread(flow, characteristics);
    flow.subheading("Capability", 60.0);
    capability(flow, characteristics);
    flow.subheading("Form, tolerance interval and risks", 70.0);
    shape(flow, characteristics);
    // Beside the dashes that they explain.
    notes(flow, characteristics);
    outliers(flow, characteristics);
}

fn number(head: &str) -> Column {
    Column::new(head, Align::Decimal, Span::Natural)
}

fn spread(flow: &mut Flow, characteristics: &[Characteristic]) {
    let mut table = Table::new(vec![
        Column::new("Characteristic", Align::Left, Span::Share(1.0)),
        Column::new("n", Align::Right, Span::Natural),
        number("Mean"),
        number("Standard deviation s"),
        number("s within"),
        number("Minimum"),
        number("Median"),
        number("Maximum"),
    ]);
    for c in characteristics {
        let Some(s) = c.statistics else { continue };
        let fine =
            |v: Option<f64>| Cell::text(v.map_or_else(|| ABSENT.to_owned(), |v| c.scale.finer(v)));
        let wide =
            |v: Option<f64>| Cell::text(v.map_or_else(|| ABSENT.to_owned(), |v| c.scale.spread(v)));
        table.row(vec![
            Cell::text(c.title()),
            Cell::text(s.n.to_string()),
            fine(s.mean),
            wide(s.standard_deviation),
            wide(s.sigma_within),
            fine(s.minimum),
            fine(s.median),
            fine(s.maximum),
        ]);
    }
    table.set(flow);
}

fn capability(flow: &mut Flow, characteristics: &[Characteristic]) {
    let mut table = Table::new(vec![
        Column::new("Characteristic", Align::Left, Span::Share(1.0)),
        number("Cp"),
        number("Cpk"),
        number("Cpk, lower 95 %"),
        number("Pp"),
        number("Ppk"),
        number("Ppk, lower 95 %"),
        Column::new("Non- conforming", Align::Right, Span::Natural),
        Column::new("Undecided", Align::Right, Span::Natural),
    ]);
    for c in characteristics {
        let Some(s) = c.statistics else { continue };
        let mut cells = vec![Cell::text(c.bound.name.clone())];
        cells.extend(
            [s.cp, s.cpk, s.cpk_lower_95, s.pp, s.ppk, s.ppk_lower_95]
                .into_iter()
                .map(|v| Cell::text(index(v))),
        );
        cells.push(Cell::text(s.nonconforming.to_string()));
        cells.push(Cell::text(s.undecided.to_string()));
        table.row(cells);
    }
    table.set(flow);
    flow.y += 3.0;
    flow.small(
        "Cp and Cpk use the standard deviation within the lot (mean moving range in measuring order), Pp and Ppk the \
         standard deviation s of all parts; lower 95 % is the one-sided lower confidence bound.",
    );
}

/// Form of the distribution, what holds where it is not normal, and what the decision rule risks.
fn shape(flow: &mut Flow, characteristics: &[Characteristic]) {
    let mut table = Table::new(vec![
        Column::new("Characteristic", Align::Left, Span::Share(1.0)),
        number("Normality p"),
        number("Pp, percentiles"),
        number("Ppk, percentiles"),
        number("Tolerance interval from"),
        number("to"),
        number("Consumer's risk").unit("%"),
        number("Producer's risk").unit("%"),
    ]);
    for c in characteristics {
        let Some(s) = c.statistics else { continue };
        let of = |v: Option<f64>, show: &dyn Fn(f64) -> String| {
            Cell::text(v.map_or_else(|| ABSENT.to_owned(), show))
        };
        let percent = |v: f64| chance(v * 100.0);
        let fine = |v: f64| c.scale.finer(v);
        let [low, high] = s.tolerance_95_95.map_or([None; 2], |t| t.map(Some));
        table.row(vec![
            Cell::text(c.title()),
            of(s.normality_p_value, &chance),
            Cell::text(index(s.pp_percentile)),
            Cell::text(index(s.ppk_percentile)),
            of(low, &fine),
            of(high, &fine),
            of(s.consumers_risk, &percent),
            of(s.producers_risk, &percent),
        ]);
    }
    table.set(flow);
    flow.y += 3.0;
    flow.small(
        "Normality p: test of Anderson and Darling, mean and standard deviation estimated. Indices by percentiles (ISO \
         22514-2) where the values are not normally distributed. The tolerance interval holds at least 95 % of the parts \
         with a confidence of 95 %. Risks (JCGM 106): that a part of such a lot is accepted and does not conform, and that it is not \
         accepted and conforms.",
    );
}

fn outliers(flow: &mut Flow, characteristics: &[Characteristic]) {
    let rows: Vec<(&Characteristic, &String)> = characteristics
        .iter()
        .filter_map(|c| Some((c, c.statistics?)))
        .flat_map(|(c, s)| s.outliers.iter().map(move |part| (c, part)))
        .collect();
    if rows.is_empty() {
        return;
    }
    flow.subheading("Outliers", 40.0);
    let mut table = Table::new(vec![
        Column::new("Part", Align::Left, Span::Natural),
        Column::new("Characteristic", Align::Left, Span::Natural),
        Column::new("Value", Align::Left, Span::Share(1.0)),
    ]);
    for (c, part) in rows {
        let value = c.values.iter().find(|v| v.part == part);
        let figure = value.map_or_else(
            || ABSENT.to_owned(),
            |v| format!("{} {}", c.scale.figure(v.value), c.scale.unit),
        );
        table.row(vec![
            Cell::text(part.clone()).link(part_anchor(part)),
            Cell::text(c.bound.name.clone()),
            Cell::text(figure),
        ]);
    }
    table.set(flow);
}

/// Why a statistic is missing: each sentence once, with the characteristics that it is about.
fn notes(flow: &mut Flow, characteristics: &[Characteristic]) {
    let mut found: IndexMap<(&str, &str), Vec<&str>> = IndexMap::new();
    for c in characteristics {
        for note in c.statistics.iter().flat_map(|s| &s.warnings) {
            let names = found.entry((&note.text, &note.code)).or_default();
            names.push(&c.bound.name);
        }
    }
    for ((text, code), names) in found {
        flow.small(&format!("{}: {text} ({code})", names.join(", ")));
    }
}
