//! How the lot is accepted from its sample.

use super::bound::{Bounded, is_class};
use super::{Acceptance, NotNormal};
use crate::diagnostic::excerpt;
use crate::diagnostic::yaml::{Fields, Node, Reader, shown};
use crate::statistics::sampling::{AQL_SERIES, InspectionLevel, aql_index, neighbouring_aqls};

const KINDS: [&str; 4] = ["attributes", "variables", "zero_acceptance", "fixed"];

/// Exactly one kind of acceptance; every class of the bounds has its AQL.
pub fn read(reader: &mut Reader<'_>, node: &Node, bounded: &Bounded) -> Option<Acceptance> {
    let fields = reader.fields(node, "`acceptance`", &KINDS)?;
    let known: Vec<_> = fields.iter().filter(|(k, ..)| KINDS.contains(k)).collect();
    let [(kind, _, value)] = known.as_slice() else {
        if let Some((name, key, _)) = known.get(1) {
            let found = format!("`{name}` as a second kind of acceptance");
            let hint = Some("delete one of the two".to_owned());
            reader.fault(key.span, "two_ways", found, "one kind of acceptance", hint);
        } else if fields.iter().next().is_none() {
            let expected = "one of `attributes`, `variables`, `zero_acceptance` or `fixed`";
            reader.fault(
                node.span,
                "missing_key",
                "an empty `acceptance`",
                expected,
                None,
            );
        }
        return None;
    };
    match *kind {
        "attributes" => attributes(reader, value, bounded),
        "variables" => variables(reader, value, bounded),
        "zero_acceptance" => zero_acceptance(reader, value),
        _ => fixed(reader, value),
    }
}

fn attributes(reader: &mut Reader<'_>, node: &Node, bounded: &Bounded) -> Option<Acceptance> {
    let what = "`attributes`";
    let fields = reader.fields(node, what, &["level", "aql"])?;
    let (level, aql) = level_and_aql(reader, &fields, bounded, what)?;
    Some(Acceptance::Attributes { level, aql })
}

/// `not_normal` says what is done where a characteristic is not normally distributed.
fn variables(reader: &mut Reader<'_>, node: &Node, bounded: &Bounded) -> Option<Acceptance> {
    const CHOICES: [&str; 2] = ["hold", "attributes"];
    let what = "`variables`";
    let fields = reader.fields(node, what, &["level", "aql", "not_normal"])?;
    let both = level_and_aql(reader, &fields, bounded, what);
    let not_normal = match fields.get("not_normal") {
        None => NotNormal::default(),
        Some(node) => match reader.one_of(node, "what to do where it is not normal", &CHOICES)? {
            0 => NotNormal::Hold,
            _ => NotNormal::Attributes,
        },
    };
    let (level, aql) = both?;
    Some(Acceptance::Variables {
        level,
        aql,
        not_normal,
    })
}

type LevelAndAql = (String, Vec<(String, f64)>);

fn level_and_aql(
    reader: &mut Reader<'_>,
    fields: &Fields<'_>,
    bounded: &Bounded,
    what: &str,
) -> Option<LevelAndAql> {
    let levels = InspectionLevel::ALL.map(|level| level.to_string());
    let levels: Vec<&str> = levels.iter().map(String::as_str).collect();
    let level = reader
        .required(fields, "level", what, "II")
        .and_then(|node| reader.one_of(node, "an inspection level", &levels))
        .and_then(|index| levels.get(index));
    let aql = reader
        .required(fields, "aql", what, "{A: 0.65}")
        .and_then(|node| aql_by_class(reader, node, bounded));
    Some(((*level?).to_owned(), aql?))
}

fn aql_by_class(
    reader: &mut Reader<'_>,
    node: &Node,
    bounded: &Bounded,
) -> Option<Vec<(String, f64)>> {
    let before = reader.count();
    let fields = reader.entries(node, "`aql`, an AQL for each class,")?;
    let mut list = Vec::new();
    for (class, key, value) in fields.iter() {
        if !is_class(class) {
            let found = format!("the class `{}`", excerpt(class));
            let expected = "a nonconformity class such as `A`: letters and digits, at most 16";
            reader.fault(key.span, "bad_class", found, expected, None);
        } else if bounded.complete && bounded.classes.iter().all(|(known, _)| known != class) {
            let found = format!("an AQL for class `{class}`, in which nothing is bounded");
            let hint = Some(format!("delete it, or put `class: {class}` at a bound"));
            reader.fault(
                key.span,
                "class_without_bound",
                found,
                "classes of the bounds",
                hint,
            );
        }
        if let Some(percent) = aql(reader, value) {
            list.push((class.to_owned(), percent));
        }
    }
    classes_without_aql(reader, &fields, bounded);
    (reader.count() == before).then_some(list)
}

fn classes_without_aql(reader: &mut Reader<'_>, fields: &Fields<'_>, bounded: &Bounded) {
    let mut seen: Vec<&str> = Vec::new();
    for (class, bound) in &bounded.classes {
        if fields.get(class).is_some() || seen.contains(&class.as_str()) {
            continue;
        }
        seen.push(class);
        reader.fault(
            fields.span,
            "class_without_aql",
            format!("no AQL for class `{class}`, in which `{bound}` is bounded"),
            "an AQL for every class of the bounds (class A where a bound names none)",
            Some(format!("add for example `{class}: 0.65`")),
        );
    }
}

/// An AQL of the series, in percent.
fn aql(reader: &mut Reader<'_>, node: &Node) -> Option<f64> {
    let percent = reader.number(node, "an AQL in percent")?;
    if let Some(listed) = aql_index(percent).and_then(|index| AQL_SERIES.get(index)) {
        return Some(*listed);
    }
    let hint = match neighbouring_aqls(percent) {
        (Some(below), Some(above)) => {
            format!(
                "its neighbours are {} and {}",
                aql_text(below),
                aql_text(above)
            )
        }
        (None, Some(least)) => format!("the lowest is {}", aql_text(least)),
        (Some(most), None) => format!("the highest is {}", aql_text(most)),
        (None, None) => "choose one of the series".to_owned(),
    };
    let series = AQL_SERIES.map(aql_text).join(" ");
    reader.fault(
        node.span,
        "aql_not_in_series",
        format!("the AQL {} is not in the series", shown(node)),
        format!("an AQL of ISO 2859-1, in percent: {series}"),
        Some(hint),
    );
    None
}

/// An AQL as ISO 2859-1 prints it: `0.010`, `0.65`, `1.0`, `10`.
pub fn aql_text(percent: f64) -> String {
    let places = match percent {
        p if p >= 10.0 => 0,
        p if p >= 1.0 => 1,
        p if p >= 0.1 => 2,
        _ => 3,
    };
    format!("{percent:.places$}")
}

fn zero_acceptance(reader: &mut Reader<'_>, node: &Node) -> Option<Acceptance> {
    let what = "`zero_acceptance`";
    let fields = reader.fields(node, what, &["quality_limit", "consumers_risk"])?;
    let mut ratio = |key: &str, example: &str| {
        let node = reader.required(&fields, key, what, example)?;
        let possible = |v: f64| v > 0.0 && v < 1.0;
        let expected = "a share above 0 and below 100 %";
        reader.share_if(node, &format!("`{key}`"), possible, expected)
    };
    let quality_limit = ratio("quality_limit", "1 %");
    let consumers_risk = ratio("consumers_risk", "10 %");
    Some(Acceptance::ZeroAcceptance {
        quality_limit: quality_limit?,
        consumers_risk: consumers_risk?,
    })
}

fn fixed(reader: &mut Reader<'_>, node: &Node) -> Option<Acceptance> {
    let what = "`fixed`";
    let fields = reader.fields(node, what, &["sample", "accept"])?;
    let sample = reader
        .required(&fields, "sample", what, "32")
        .and_then(|node| reader.integer(node, "`sample`", (1, 1_000_000)));
    let accept_node = reader.required(&fields, "accept", what, "0");
    let accept = accept_node.and_then(|node| reader.integer(node, "`accept`", (0, 999_999)));
    let (sample, accept) = (sample?, accept?);
    if accept >= sample {
        reader.fault(
            accept_node.map_or(fields.span, |node| node.span),
            "impossible_value",
            format!("{accept} nonconforming parts accepted in a sample of {sample}"),
            "`accept` below `sample`",
            None,
        );
        return None;
    }
    Some(Acceptance::Fixed { sample, accept })
}
