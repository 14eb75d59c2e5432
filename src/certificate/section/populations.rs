//! Two populations in one lot: what was found, and which parts belong to which.

use super::Characteristic;
use crate::certificate::figures::{ABSENT, chance, plain, significant};
use crate::certificate::flow::Flow;
use crate::certificate::table::{Align, Cell, Column, Span, Table};
use crate::record::MixedSection;

pub(in crate::certificate) fn populations(flow: &mut Flow, all: &[Characteristic]) {
    let found: Vec<(&Characteristic, &MixedSection)> =
        all.iter().filter_map(|c| Some((c, c.mixed?))).collect();
    if found.is_empty() {
        return;
    }
    flow.heading("Two populations", 90.0);
    let mut table = Table::new(vec![
        Column::new("Characteristic", Align::Left, Span::Share(1.0)),
        Column::new("Group", Align::Left, Span::Natural),
        Column::new("n", Align::Right, Span::Natural),
        Column::new("Mean", Align::Decimal, Span::Natural),
        Column::new("s", Align::Decimal, Span::Natural),
        Column::new("Parts", Align::Left, Span::Share(2.4)),
    ]);
    for (c, mixed) in &found {
        for (group, name) in mixed.groups.iter().zip(["light", "dark"]) {
            table.row(vec![
                Cell::text(c.title()),
                Cell::text(name),
                Cell::text(group.parts.len().to_string()),
                Cell::text(c.scale.finer(group.mean)),
                Cell::text(c.scale.spread(group.standard_deviation)),
                Cell::text(group.parts.join(", ")),
            ]);
        }
    }
    table.set(flow);
    flow.y += 3.0;
    for (c, mixed) in found {
        flow.small(&evidence(c, mixed));
    }
}

/// What speaks for two populations, for the document and its text twin.
pub(in crate::certificate) fn evidence(c: &Characteristic, m: &MixedSection) -> String {
    let number = |v: Option<f64>, digits: i32| {
        v.map_or_else(|| ABSENT.to_owned(), |v| significant(v, digits))
    };
    let word = if m.mixed {
        "two populations"
    } else {
        "two populations are possible, one cannot be ruled out"
    };
    format!(
        "{}: {word}; {} values, dip {} with p {} (significance {}), BIC of one {}, of two {}, separation {}.",
        c.bound.name,
        m.n,
        number(m.dip, 3),
        m.dip_p_value.map_or_else(|| ABSENT.to_owned(), chance),
        plain(m.alpha),
        number(m.bic_one, 5),
        number(m.bic_two, 5),
        number(m.separation, 3)
    )
}
