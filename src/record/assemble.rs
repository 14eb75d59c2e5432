//! The record from what was judged: plain values, nothing computed but words and digests.

use super::*;
use crate::limits::{Acceptance, DecisionRuleKind, Limits, NotNormal};
use crate::lot::{BenchRun, Lot, LotJudgement};
use crate::quantity::{engineering, shortest};
use crate::readings::Place;
use crate::site::SiteFile;
use crate::station::{Method, Repeatability, Station};
use sha2::{Digest, Sha256};

/// What a record is made from.
#[derive(Debug)]
#[allow(missing_docs)]
pub struct Inputs<'a> {
    pub site: Option<&'a SiteFile>,
    pub approvals: &'a Approvals,
    pub lot: &'a Lot,
    pub limits: &'a Limits,
    pub station: &'a Station,
    pub digests: &'a Digests,
    pub judgement: LotJudgement,
    pub parts: Vec<PartRecord>,
    pub circuit: Option<CircuitSection>,
    /// Further warnings from reading the files.
    pub warnings: Vec<Note>,
    /// The time of issue, RFC 3339 with offset.
    pub issued: String,
    /// The record of the same lot that was made before, from other inputs.
    pub supersedes: Option<String>,
}

/// SHA-256 of every file that the verdict rests on, lower-case hexadecimal.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Digests {
    pub site: Option<String>,
    /// Signed statements about these files: role and digest.
    pub approvals: Vec<(String, String)>,
    pub lot: String,
    pub limits: String,
    pub station: String,
    /// Sweeps of the compensation standards: name and digest.
    pub compensation: Vec<(String, String)>,
    /// Sweep files: name and digest, in name order.
    pub sweeps: Vec<(String, String)>,
}

impl Digests {
    /// The lot's number and twelve hexadecimal digits of a digest over the record's shape, the
    /// program's version and all inputs: the same inputs always give the same identity.
    pub fn identity(&self, lot: &str) -> String {
        let mut hash = Sha256::new();
        let mut add = |text: &str| {
            hash.update((text.len() as u64).to_be_bytes());
            hash.update(text.as_bytes());
        };
        add(&SCHEMA.to_string());
        add(env!("CARGO_PKG_VERSION"));
        for text in [lot, &self.lot, &self.limits, &self.station] {
            add(text);
        }
        for (name, digest) in self.compensation.iter().chain(&self.sweeps) {
            add(name);
            add(digest);
        }
        if let Some(site) = &self.site {
            add("site");
            add(site);
        }
        for (role, digest) in &self.approvals {
            add(role);
            add(digest);
        }
        let digest = hex(&hash.finalize());
        format!("{lot}-{}", &digest[..12])
    }
}

/// SHA-256 in lower-case hexadecimal.
pub fn sha256(bytes: &[u8]) -> String {
    hex(&Sha256::digest(bytes))
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|b| format!("{b:02x}")).collect()
}

impl LotRecord {
    /// The record of a judged lot.
    pub fn assemble(inputs: Inputs) -> LotRecord {
        let Inputs {
            site,
            approvals,
            lot,
            limits,
            station,
            digests,
            judgement,
            parts,
            circuit,
            warnings,
            issued,
            supersedes,
        } = inputs;
        let mut all = judgement.warnings;
        all.extend(warnings);
        let mut explanation: Vec<Step> = approvals.step().into_iter().collect();
        explanation.extend(judgement.explanation);
        LotRecord {
            schema: SCHEMA,
            record: digests.identity(&lot.lot),
            issued,
            supersedes,
            program: Program {
                name: "reelgate".to_owned(),
                version: env!("CARGO_PKG_VERSION").to_owned(),
            },
            site: site
                .zip(digests.site.as_ref())
                .map(|(site, sha256)| SiteSection {
                    site: site.name.clone(),
                    approval: site.approval.name().to_owned(),
                    sha256: sha256.clone(),
                }),
            approvals: approvals.in_force.clone(),
            lot: lot_section(lot, &digests.lot),
            limits: limits_section(limits, &digests.limits, judgement.conditions),
            station: station_section(station, digests),
            verdict: judgement.verdict,
            reasons: judgement.reasons,
            warnings: all,
            explanation,
            sampling: judgement.sampling,
            statistics: judgement.statistics,
            circuit,
            findings: judgement.findings,
            parts,
        }
    }
}

fn lot_section(lot: &Lot, sha256: &str) -> LotSection {
    LotSection {
        lot: lot.lot.clone(),
        part: lot.part.clone(),
        supplier: lot.supplier.clone(),
        quantity: lot.quantity,
        date_code: lot.date_code.clone(),
        order: lot.order.clone(),
        label: lot.label.clone(),
        operator: lot.operator.clone(),
        measured: lot.measured.to_rfc3339(),
        temperature: lot.temperature,
        humidity: lot.humidity,
        drive: lot.drive,
        last_heat: lot
            .last_heat
            .map(|t| t.format("%Y-%m-%dT%H:%M:%S").to_string()),
        sweeps: lot.sweeps.clone(),
        run: run_section(lot),
        sha256: sha256.to_owned(),
    }
}

fn run_section(lot: &Lot) -> Option<RunSection> {
    let run = &lot.run;
    (*run != BenchRun::default()).then(|| RunSection {
        seed: run.seed,
        scans: run.scans.clone(),
        operators: run.operators.clone(),
        jig_checked: run.jig_checked.map(|t| t.to_rfc3339()),
        set_aside: run.set_aside.clone(),
    })
}

fn limits_section(
    limits: &Limits,
    sha256: &str,
    conditions: Vec<ConditionSection>,
) -> LimitsSection {
    LimitsSection {
        part: limits.part.clone(),
        revision: limits.revision.clone(),
        description: limits.description.clone(),
        sha256: sha256.to_owned(),
        decision_rule: decision_rule(limits.decision_rule.kind).to_owned(),
        coverage_factor: limits.decision_rule.coverage_factor,
        acceptance: acceptance(&limits.acceptance),
        characteristics: limits.bounds.iter().map(BoundSection::of).collect(),
        conditions,
    }
}

fn decision_rule(kind: DecisionRuleKind) -> &'static str {
    match kind {
        DecisionRuleKind::SimpleAcceptance => "simple_acceptance",
        DecisionRuleKind::GuardedAcceptance => "guarded_acceptance",
        DecisionRuleKind::GuardedRejection => "guarded_rejection",
    }
}

fn acceptance(acceptance: &Acceptance) -> String {
    let by_level = |scheme: &str, level: &str, aql: &[(String, f64)]| {
        let each: Vec<String> = aql
            .iter()
            .map(|(class, aql)| format!("{class} {aql}"))
            .collect();
        format!("{scheme}, level {level}, AQL {}", each.join(", "))
    };
    match acceptance {
        Acceptance::Attributes { level, aql } => by_level("attributes", level, aql),
        Acceptance::Variables {
            level,
            aql,
            not_normal,
        } => {
            let words = by_level("variables", level, aql);
            match not_normal {
                NotNormal::Hold => words,
                NotNormal::Attributes => format!("{words}, by attributes where not normal"),
            }
        }
        Acceptance::ZeroAcceptance {
            quality_limit,
            consumers_risk,
        } => format!(
            "zero acceptance, quality limit {}, consumer's risk {}",
            shortest(*quality_limit, "1"),
            shortest(*consumers_risk, "1")
        ),
        Acceptance::Fixed { sample, accept } => format!("fixed, sample {sample}, Ac {accept}"),
    }
}

impl BoundSection {
    /// A bound as documents show it.
    pub fn of(bound: &crate::limits::Bound) -> BoundSection {
        let title = bound.characteristic.title();
        let hz = |f: f64| shortest(f, "Hz");
        let (name, at, between) = match bound.place {
            Place::At(f) => (format!("{title} at {}", hz(f)), Some(f), None),
            Place::Between(from, to) => (
                format!("{title}, {} to {}", hz(from), hz(to)),
                None,
                Some([from, to]),
            ),
            Place::Anywhere => (title.to_owned(), None, None),
        };
        BoundSection {
            key: bound.key.clone(),
            name,
            unit: bound.characteristic.unit().to_owned(),
            class: bound.class.clone(),
            lower: bound.lower,
            upper: bound.upper,
            nominal: bound.nominal,
            at,
            between,
        }
    }
}

fn station_section(station: &Station, digests: &Digests) -> StationSection {
    let instrument = station.instrument.as_ref();
    let jig = station.jig.as_ref();
    StationSection {
        station: station.name.clone(),
        sha256: digests.station.clone(),
        method: method(station.method).to_owned(),
        reference: station.reference.map(|r| {
            let mut words = shortest(r.resistance, "Ω");
            if r.tolerance > 0.0 {
                words += &format!(" ± {}", shortest(r.tolerance, "1"));
            }
            if r.inductance > 0.0 {
                words += &format!(", {}", shortest(r.inductance, "H"));
            }
            words
        }),
        instrument: instrument.map(|i| i.asset.clone()),
        instrument_calibrated: instrument.and_then(|i| i.calibrated).map(|d| d.to_string()),
        instrument_due: instrument.and_then(|i| i.due).map(|d| d.to_string()),
        jig: jig.map(|j| j.asset.clone()),
        jig_checked: jig.and_then(|j| j.checked).map(|t| t.to_rfc3339()),
        jig_valid_for: jig.and_then(|j| j.valid_for),
        compensation: compensation(station, digests),
        uncertainty: uncertainty(station),
    }
}

/// As station files spell it.
pub fn method(method: Method) -> &'static str {
    match method {
        Method::Direct => "direct",
        Method::SeriesReference => "series_reference",
        Method::ShuntThrough => "shunt_through",
        Method::SeriesThrough => "series_through",
        Method::Reflection => "reflection",
    }
}

fn compensation(station: &Station, digests: &Digests) -> Vec<String> {
    let standards = &station.compensation;
    [
        ("open", &standards.open),
        ("short", &standards.short),
        ("load", &standards.load),
    ]
    .into_iter()
    .filter_map(|(kind, standard)| {
        let standard = standard.as_ref()?;
        let digest = digests
            .compensation
            .iter()
            .find(|(name, _)| *name == standard.sweep)
            .map_or("", |(_, d)| d);
        Some(format!("{kind}: {} (SHA-256 {digest})", standard.sweep))
    })
    .collect()
}

fn uncertainty(station: &Station) -> Vec<String> {
    let stated = &station.uncertainty;
    let mut words = Vec::new();
    if let Some(u) = stated.magnitude {
        words.push(format!("magnitude {}", shortest(u, "1")));
    }
    if let Some(u) = stated.phase {
        words.push(format!("phase {} °", significant(u.to_degrees())));
    }
    if let Some(u) = stated.temperature {
        words.push(format!("temperature {} K", significant(u)));
    }
    for (name, u) in &stated.repeatability {
        let value = match u {
            Repeatability::Relative(ratio) => shortest(*ratio, "1"),
            Repeatability::Absolute(value) => {
                let unit = crate::readings::Characteristic::ALL
                    .iter()
                    .find(|c| c.name() == name)
                    .map_or("", |c| c.unit());
                engineering(*value, unit, 3)
            }
        };
        words.push(format!(
            "repeatability of {} {value}",
            name.replace('_', " ")
        ));
    }
    words
}

/// Four significant digits without trailing zeros.
fn significant(value: f64) -> String {
    let rounded: f64 = format!("{value:.3e}").parse().unwrap_or(value);
    rounded.to_string()
}
