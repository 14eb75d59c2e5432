//! How the station's delimited sweep files look.

use super::{Column, InstrumentLink, Layout};
use crate::diagnostic::yaml::{Fields, Node, Reader};
use crate::diagnostic::{Span, excerpt};

/// Columns by their names in files.
const COLUMNS: [(&str, Column); 14] = [
    ("frequency", Column::Frequency),
    ("magnitude", Column::Magnitude),
    ("phase", Column::Phase),
    ("resistance", Column::Resistance),
    ("reactance", Column::Reactance),
    ("a_re", Column::ARe),
    ("a_im", Column::AIm),
    ("b_re", Column::BRe),
    ("b_im", Column::BIm),
    ("ratio_db", Column::RatioDb),
    ("capacitance", Column::Capacitance),
    ("esr", Column::Esr),
    ("dissipation_factor", Column::DissipationFactor),
    ("part", Column::Part),
];

/// Sets of columns, one of which a layout has beside `frequency`.
const SETS: [&[Column]; 6] = [
    &[Column::Magnitude, Column::Phase],
    &[Column::Resistance, Column::Reactance],
    &[Column::ARe, Column::AIm, Column::BRe, Column::BIm],
    &[Column::RatioDb, Column::Phase],
    &[Column::Capacitance, Column::Esr],
    &[Column::Capacitance, Column::DissipationFactor],
];

/// What a sweep consists of, in words.
pub const EXPECTED: &str = "beside `frequency` one of: magnitude phase; resistance reactance; a_re a_im \
                            b_re b_im; ratio_db phase; capacitance esr; capacitance dissipation_factor";

/// The name of a column in files.
pub fn name(column: Column) -> &'static str {
    COLUMNS
        .iter()
        .find(|(_, c)| *c == column)
        .map_or("", |(name, _)| name)
}

/// The column of a name.
pub fn column(name: &str) -> Option<Column> {
    COLUMNS
        .iter()
        .find(|(known, _)| *known == name)
        .map(|(_, column)| *column)
}

/// Names of the columns that hold numbers.
pub fn measured_names() -> impl Iterator<Item = &'static str> {
    COLUMNS
        .iter()
        .filter(|(_, column)| *column != Column::Part)
        .map(|(name, _)| *name)
}

/// Whether columns are `frequency` and one complete set, and nothing else.
pub fn is_a_sweep(columns: &[Column]) -> bool {
    columns.contains(&Column::Frequency)
        && SETS.iter().any(|set| {
            set.len() + 1 == columns.len() && set.iter().all(|column| columns.contains(column))
        })
}

/// The layout of the files that are written from an instrument's answers where the station file
/// states none.
pub fn of_link(link: &InstrumentLink) -> Layout {
    let columns = link
        .read
        .iter()
        .flat_map(|answer| answer.quantities.iter().flatten())
        .map(|column| (*column, heading(*column).to_owned()))
        .collect();
    Layout {
        columns,
        peak: false,
    }
}

/// Quantity and unit, as our own files have them.
fn heading(column: Column) -> &'static str {
    match column {
        Column::Frequency => "Frequency (Hz)",
        Column::Magnitude => "Magnitude (Ohm)",
        Column::Phase => "Phase (deg)",
        Column::Resistance => "Resistance (Ohm)",
        Column::Reactance => "Reactance (Ohm)",
        Column::ARe => "A Re (V)",
        Column::AIm => "A Im (V)",
        Column::BRe => "B Re (V)",
        Column::BIm => "B Im (V)",
        Column::RatioDb => "Ratio (dB)",
        Column::Capacitance => "Capacitance (F)",
        Column::Esr => "ESR (Ohm)",
        Column::DissipationFactor => "Dissipation factor",
        Column::Part => "part",
    }
}

/// The layout: `frequency`, one set, perhaps `part`; `amplitude` says what voltages are.
pub fn read(reader: &mut Reader<'_>, node: &Node) -> Option<Layout> {
    let what = "`layout`";
    let fields = reader.fields(node, what, &["columns", "amplitude"])?;
    let example =
        "{frequency: \"Frequency (Hz)\", magnitude: \"|Z| (Ohm)\", phase: \"Phase (deg)\"}";
    let columns = reader
        .required(&fields, "columns", what, example)
        .and_then(|node| columns(reader, node));
    let amplitude = fields.entry("amplitude").map(|(key, node)| {
        let voltages = |c: &[(Column, String)]| c.iter().any(|(c, _)| *c == Column::ARe);
        if columns.as_deref().is_some_and(|c| !voltages(c)) {
            no_voltages(reader, key.span);
        }
        reader.one_of(node, "a kind of amplitude", &["rms", "peak"])
    });
    Some(Layout {
        columns: columns?,
        peak: super::read::given(amplitude)? == Some(1),
    })
}

fn no_voltages(reader: &mut Reader<'_>, span: Span) {
    reader.fault(
        span,
        "no_effect",
        "`amplitude` in a layout without voltages",
        "`amplitude` beside the columns `a_re a_im b_re b_im` only",
        Some("delete it".to_owned()),
    );
}

fn columns(reader: &mut Reader<'_>, node: &Node) -> Option<Vec<(Column, String)>> {
    let before = reader.count();
    let names = COLUMNS.map(|(name, _)| name);
    let fields = reader.fields(node, "`columns`", &names)?;
    let mut columns: Vec<(Column, String)> = Vec::new();
    let mut complete = true;
    for (name, _, value) in fields.iter() {
        let Some((_, column)) = COLUMNS.iter().find(|(known, _)| *known == name) else {
            continue;
        };
        let Some(heading) = reader.line(value, &format!("the heading of `{name}`")) else {
            complete = false;
            continue;
        };
        if columns.iter().any(|(_, other)| *other == heading) {
            reader.fault(
                value.span,
                "duplicate_heading",
                format!("the heading `{}` a second time", excerpt(&heading)),
                "a column of its own for each quantity",
                None,
            );
        }
        columns.push((*column, heading));
    }
    if reader.count() == before {
        check_sets(reader, &fields, &columns);
    }
    (complete && reader.count() == before).then_some(columns)
}

/// `frequency` and exactly one complete set.
fn check_sets(reader: &mut Reader<'_>, fields: &Fields<'_>, columns: &[(Column, String)]) {
    let has = |column: &Column| columns.iter().any(|(c, _)| c == column);
    reader.required(fields, "frequency", "`columns`", "\"Frequency (Hz)\"");
    let complete: Vec<_> = SETS.iter().filter(|set| set.iter().all(has)).collect();
    let [set] = complete.as_slice() else {
        let (found, hint) = if complete.is_empty() {
            (
                "columns that do not give an impedance",
                "add the missing column of a set",
            )
        } else {
            (
                "columns that give the impedance twice",
                "leave one set only",
            )
        };
        reader.fault(
            fields.span,
            "bad_columns",
            found,
            EXPECTED,
            Some(hint.to_owned()),
        );
        return;
    };
    for (name, key, _) in fields.iter() {
        let column = COLUMNS
            .iter()
            .find(|(known, _)| *known == name)
            .map(|(_, c)| *c);
        let used = |c: Column| set.contains(&c) || matches!(c, Column::Frequency | Column::Part);
        if column.is_some_and(|c| !used(c)) {
            let found = format!("the column `{name}`, which is not needed");
            let hint = Some("delete it".to_owned());
            reader.fault(key.span, "bad_columns", found, EXPECTED, hint);
        }
    }
}
