//! A limit file resolved, for people. Fits 80 columns.

use crate::diagnostic::{printable, wrap};
use crate::limits::{
    Acceptance, Action, Bound, Conditions, DecisionRuleKind, Limits, OutlierRule, Retest, aql_text,
};
use crate::quantity::{NO_VALUE, shortest};
use crate::readings::{Equivalent, Place};
use comfy_table::{CellAlignment, ContentArrangement, LineStyle, Table, presets};

const WIDTH: usize = 80;
/// Columns of the labels on the left.
const LABEL: usize = 15;

/// The page: identity, conditions, the table of bounds, and what is made of them.
pub fn page(limits: &Limits) -> String {
    let mut page = format!(
        "{}   revision {}\n",
        printable(&limits.part),
        printable(&limits.revision)
    );
    if let Some(description) = &limits.description {
        for line in wrap(&printable(description), WIDTH) {
            page.push_str(&line);
            page.push('\n');
        }
    }
    page.push('\n');
    page.push_str(&table(limits));
    page.push_str("\n\n");
    for (label, text) in sections(limits) {
        page.push_str(&labelled(label, &text));
    }
    page
}

fn labelled(label: &str, text: &str) -> String {
    let mut lines = String::new();
    for (index, line) in wrap(&printable(text), WIDTH - LABEL).iter().enumerate() {
        let label = if index == 0 { label } else { "" };
        lines.push_str(&format!("{label:<LABEL$}{line}\n"));
    }
    lines
}

fn table(limits: &Limits) -> String {
    let mut table = Table::new();
    table
        .load_style(presets::UTF8_HORIZONTAL_ONLY.row_separator(LineStyle::none()))
        .set_content_arrangement(ContentArrangement::Dynamic)
        .set_width(80)
        .set_header(["characteristic", "at", "lower", "upper", "nominal", "class"]);
    for bound in &limits.bounds {
        table.add_row(row(bound));
    }
    for index in 2..5 {
        if let Some(column) = table.column_mut(index) {
            column.set_cell_alignment(CellAlignment::Right);
        }
    }
    let lines = table.lines().map(|line| line.trim_end().to_owned());
    lines.collect::<Vec<_>>().join("\n")
}

fn row(bound: &Bound) -> [String; 6] {
    let unit = bound.characteristic.unit();
    let value = |v: Option<f64>| v.map_or(NO_VALUE.to_owned(), |v| shortest(v, unit));
    let frequency = |f: f64| shortest(f, "Hz");
    let place = match bound.place {
        Place::At(f) => frequency(f),
        Place::Between(from, to) => format!("{} .. {}", frequency(from), frequency(to)),
        Place::Anywhere => "whole sweep".to_owned(),
    };
    [
        bound.characteristic.title().to_owned(),
        place,
        value(bound.lower),
        value(bound.upper),
        value(bound.nominal),
        printable(&bound.class),
    ]
}

fn sections(limits: &Limits) -> Vec<(&'static str, String)> {
    let mut sections = vec![
        ("Conditions", conditions(&limits.conditions)),
        ("Decision rule", decision_rule(limits)),
        ("Acceptance", acceptance(&limits.acceptance)),
    ];
    let rules = lot_rules(limits);
    if rules.is_empty() {
        sections.push((
            "Lot rules",
            "none: statistics are reported and decide nothing".to_owned(),
        ));
    }
    sections.extend(rules.into_iter().map(|rule| ("Lot rule", rule)));
    sections.push(("Retest", retest(limits.retest)));
    sections
}

/// Each lot rule in a sentence.
fn lot_rules(limits: &Limits) -> Vec<String> {
    let capability = limits.capability_rules.iter().map(|rule| {
        let of = rule.of.join(", ");
        format!("held where {} of {of} is below {}", rule.index, rule.min)
    });
    let outliers = limits.outlier_rules.iter().map(outlier_rule);
    let mixed = limits.mixed_rules.iter().map(|rule| {
        let of = rule.of.join(", ");
        format!(
            "held where {of} has two populations (dip test at alpha {}, mixture by BIC)",
            rule.alpha
        )
    });
    let trend = limits.trend_rules.iter().map(|rule| {
        let of = rule.of.join(", ");
        let done = match rule.action {
            Action::Warn => "a warning",
            Action::Hold => "held",
        };
        format!("{done} where {of} is unlike that of the accepted lots before")
    });
    let reduced = limits
        .reduced_inspection
        .then(|| "reduced inspection where the switching rules allow it".to_owned());
    capability
        .chain(outliers)
        .chain(mixed)
        .chain(trend)
        .chain(reduced)
        .collect()
}

fn outlier_rule(rule: &OutlierRule) -> String {
    let parts = match rule.allowed {
        0 => "a part is an outlier".to_owned(),
        1 => "more than one part is an outlier".to_owned(),
        most => format!("more than {most} parts are outliers"),
    };
    let level = rule
        .alpha
        .map_or(String::new(), |alpha| format!(", alpha {alpha}"));
    format!(
        "held where {parts} of {} ({}{level})",
        rule.of.join(", "),
        rule.method.words()
    )
}

fn conditions(conditions: &Conditions) -> String {
    let mut parts = Vec::new();
    if let Some(window) = conditions.drive {
        parts.push(format!("drive {} rms", window.words("V")));
    }
    if let Some(window) = conditions.temperature {
        parts.push(format!("temperature {}", window.words("°C")));
    }
    parts.push(match conditions.equivalent {
        Equivalent::Series => "series equivalent".to_owned(),
        Equivalent::Parallel => "parallel equivalent".to_owned(),
    });
    if let Some(ageing) = conditions.ageing {
        parts.push(format!(
            "capacitance referred to {} after last heat, {} a decade",
            shortest(ageing.refer_to, "s"),
            shortest(ageing.per_decade, "1")
        ));
    }
    for (characteristic, share) in &conditions.temperature_coefficients {
        parts.push(format!(
            "{} changes by {} a kelvin",
            characteristic.title(),
            shortest(*share, "1")
        ));
    }
    parts.join("; ")
}

/// The name of a decision rule in files.
pub fn rule_name(kind: DecisionRuleKind) -> &'static str {
    match kind {
        DecisionRuleKind::SimpleAcceptance => "simple_acceptance",
        DecisionRuleKind::GuardedAcceptance => "guarded_acceptance",
        DecisionRuleKind::GuardedRejection => "guarded_rejection",
    }
}

fn decision_rule(limits: &Limits) -> String {
    let rule = limits.decision_rule;
    let name = rule_name(rule.kind).replace('_', " ");
    match rule.kind {
        DecisionRuleKind::SimpleAcceptance => format!("{name}: uncertainty decides nothing"),
        _ => format!(
            "{name}, guard band {} standard uncertainties",
            rule.coverage_factor
        ),
    }
}

fn acceptance(acceptance: &Acceptance) -> String {
    let by_class = |aql: &[(String, f64)]| {
        let pairs = aql
            .iter()
            .map(|(class, aql)| format!("{class} {}", aql_text(*aql)));
        pairs.collect::<Vec<_>>().join(", ")
    };
    match acceptance {
        Acceptance::Attributes { level, aql } => format!(
            "attributes, ISO 2859-1 level {level}; AQL in percent by class: {}",
            by_class(aql)
        ),
        Acceptance::Variables {
            level,
            aql,
            not_normal,
        } => format!(
            "variables, ISO 3951-1 level {level}; AQL in percent by class: {}; where not normal: {}",
            by_class(aql),
            not_normal.name()
        ),
        Acceptance::ZeroAcceptance {
            quality_limit,
            consumers_risk,
        } => format!(
            "zero acceptance, {} nonconforming accepted with a risk of at most {}",
            shortest(*quality_limit, "1"),
            shortest(*consumers_risk, "1")
        ),
        Acceptance::Fixed { sample, accept } => {
            format!("fixed sample of {sample}, at most {accept} nonconforming")
        }
    }
}

fn retest(retest: Retest) -> String {
    format!(
        "further tries: {} after unmeasured, {} after nonconforming",
        retest.unmeasured, retest.nonconforming
    )
}
