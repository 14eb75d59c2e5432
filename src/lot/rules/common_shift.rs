//! A shift common to the whole lot, against the lots before it on the same station: the mark that
//! a jig or a reference leaves, which no limit on a single part can tell from the part's own.
//!
//! ESL, computed from SRF and capacitance, depends on geometry and jig and not on the capacitance.
//! A reference that is not what the station file says makes every |Z| read by one factor: the
//! capacitance goes down by it, resistance and ESL go up, SRF and C R stay. A lot that truly has
//! another capacitance has another SRF too.

use super::trend::comparable_lots;
use super::{Judged, Ruled, warnings};
use crate::diagnostic::Note;
use crate::judgement::PartRecord;
use crate::limits::Limits;
use crate::lot::explain::step;
use crate::quantity::{engineering, shortest};
use crate::readings::{Characteristic, Place};
use crate::station::{Method, Station};
use crate::statistics::lot_to_lot::mean_shift;
use crate::statistics::summary::quartiles_of;
use serde::{Deserialize, Serialize};

/// Significance of a shift, two-sided; what stays must stay at it. Common practice, no source.
const ALPHA: f64 = 0.01;
/// Two-sided normal quantile of it: what the spread within the lots may explain.
const WITHIN: f64 = 2.576;
/// Fewest lots before with which a lot is compared, and fewest parts with which it has quartiles.
const LOTS_LEAST: usize = 3;
const PARTS_LEAST: usize = 5;
/// Standard deviation of a median over that of the mean of as many normal values.
const MEDIAN: f64 = 1.2533;
/// Distance of the quartiles of a normal distribution in standard deviations.
const QUARTILES: f64 = 1.34898;

/// First quartile, median, third quartile over the parts of a lot.
type Quartiles = [f64; 3];

/// What the series circuits of a lot's parts have in common.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct LotSeries {
    /// Hz: where the capacitance is read.
    pub at: f64,
    /// Parts whose sweep holds a self-resonance.
    pub n: u64,
    /// F, as measured.
    pub capacitance: Quartiles,
    /// Hz.
    pub srf: Quartiles,
    /// Ω: ESR at the self-resonance.
    pub resistance: Quartiles,
    /// H: from SRF and capacitance.
    pub esl: Quartiles,
}

/// One quantity of the lot against the lots before.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Shift {
    /// `capacitance`, `srf`, `esr_at_srf`, `esl`, `capacitance_times_esr`.
    pub of: String,
    /// Geometric mean of the lot medians before.
    pub previous: f64,
    /// Of the lot's median from that, as a ratio: 0.02 is 2 % up.
    pub shift: f64,
    /// Two-sided, by t of one more lot median.
    pub p_value: f64,
}

/// What a whole lot has in common that parts do not do by themselves.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Common {
    /// Capacitance and ESR by one factor.
    ImpedanceScaled,
    /// The ESL.
    EslShifted,
}

/// A lot against the lots before it on the same station.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CommonShift {
    #[allow(missing_docs)]
    pub lot: LotSeries,
    /// Records compared with, oldest first.
    pub history: Vec<String>,
    /// Empty where too few lots went before.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub shifts: Vec<Shift>,
    /// What was found, where something was.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub found: Option<Common>,
    /// |Z| reads by this factor, where it is scaled.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub factor: Option<f64>,
}

impl LotSeries {
    /// Of the parts that have a series circuit; `None` for fewer than five of them, or where the
    /// limit file bounds no capacitance at a frequency.
    pub fn of(parts: &[PartRecord], limits: &Limits) -> Option<LotSeries> {
        let capacitance =
            |b: &&crate::limits::Bound| b.characteristic == Characteristic::Capacitance;
        let Place::At(at) = limits.bounds.iter().find(capacitance)?.place else {
            return None;
        };
        let all: Vec<_> = parts.iter().filter_map(|part| part.series).collect();
        if all.len() < PARTS_LEAST {
            return None;
        }
        let of = |value: &dyn Fn(&crate::readings::SeriesCircuit) -> f64| {
            let values: Vec<f64> = all.iter().map(value).collect();
            quartiles_of(&values).ok()
        };
        Some(LotSeries {
            at,
            n: all.len() as u64,
            capacitance: of(&|s| s.capacitance)?,
            srf: of(&|s| s.srf)?,
            resistance: of(&|s| s.resistance)?,
            esl: of(&|s| s.inductance())?,
        })
    }
}

/// One quantity of all lots, as logarithms.
struct Course {
    now: Quartiles,
    /// Of each lot, with its number of parts.
    before: Vec<(Quartiles, f64)>,
    shift: f64,
    p: f64,
}

impl Course {
    fn of(
        lot: &LotSeries,
        before: &[LotSeries],
        value: impl Fn(&LotSeries) -> Quartiles,
    ) -> Option<Course> {
        let logarithms = |lot: &LotSeries| value(lot).map(f64::ln);
        let now = logarithms(lot);
        let before: Vec<_> = before
            .iter()
            .map(|lot| (logarithms(lot), lot.n as f64))
            .collect();
        let medians: Vec<f64> = before.iter().map(|(q, _)| q[1]).collect();
        let compared = mean_shift(now[1], &medians).ok()?;
        let centre = medians.iter().sum::<f64>() / medians.len() as f64;
        Some(Course {
            now,
            before,
            shift: now[1] - centre,
            p: compared.p_value,
        })
    }

    fn section(&self, of: &str) -> Shift {
        Shift {
            of: of.to_owned(),
            previous: (self.now[1] - self.shift).exp(),
            shift: self.shift.exp_m1(),
            p_value: self.p,
        }
    }

    fn moved(&self) -> bool {
        self.p < ALPHA
    }

    /// The whole lot has moved: the spread within the lots explains no such shift of the median,
    /// and both quartiles have gone the same way by half of it or more.
    fn common(&self, lot: &LotSeries) -> bool {
        let variance = |q: &Quartiles, n: f64| (MEDIAN * (q[2] - q[0]) / QUARTILES).powi(2) / n;
        let m = self.before.len() as f64;
        let of_before: f64 = self.before.iter().map(|(q, n)| variance(q, *n)).sum();
        let within = (variance(&self.now, lot.n as f64) + of_before / (m * m)).sqrt();
        let quartile_moved = |i: usize| {
            let centre = self.before.iter().map(|(q, _)| q[i]).sum::<f64>() / m;
            (self.now[i] - centre) * self.shift.signum() >= 0.5 * self.shift.abs()
        };
        self.moved() && self.shift.abs() > WITHIN * within && quartile_moved(0) && quartile_moved(2)
    }
}

/// A lot against the lots before it: `records` names them.
///
/// *Scaled*: the capacitance has moved, and ESR or ESL has moved the other way, each at 1 % by the t
/// of one more lot median (ISO 16269-8:2004, prediction of one further value); SRF and C R, which a
/// factor leaves as they are, have not moved at 1 %, and the SRF by less than a quarter of what the
/// capacitance did (half of it would be a lot of truly another capacitance). *ESL shifted*: the ESL
/// has moved, and no factor explains it. Either only where the whole lot has moved: more than the
/// spread within the lots explains, and with both quartiles.
pub fn common_shift(lot: LotSeries, before: &[LotSeries], records: Vec<String>) -> CommonShift {
    let mut section = CommonShift {
        lot,
        history: records,
        shifts: Vec::new(),
        found: None,
        factor: None,
    };
    if before.len() < LOTS_LEAST {
        return section;
    }
    let product = |l: &LotSeries| [0, 1, 2].map(|i| l.capacitance[i] * l.resistance[i]);
    let courses = (
        Course::of(&lot, before, |l| l.capacitance),
        Course::of(&lot, before, |l| l.srf),
        Course::of(&lot, before, |l| l.resistance),
        Course::of(&lot, before, |l| l.esl),
        Course::of(&lot, before, product),
    );
    let (Some(c), Some(f), Some(r), Some(l), Some(cr)) = courses else {
        return section;
    };
    section.shifts = vec![
        c.section("capacitance"),
        f.section("srf"),
        r.section("esr_at_srf"),
        l.section("esl"),
        cr.section("capacitance_times_esr"),
    ];
    let against = |other: &Course| other.common(&lot) && other.shift * c.shift < 0.0;
    let stays = !f.moved() && !cr.moved() && f.shift.abs() < 0.25 * c.shift.abs();
    if c.common(&lot) && (against(&r) || against(&l)) && stays {
        section.found = Some(Common::ImpedanceScaled);
        section.factor = Some((-c.shift).exp());
    } else if l.common(&lot) {
        section.found = Some(Common::EslShifted);
    }
    section
}

pub(super) fn evaluate(judged: &Judged, ruled: &mut Ruled) {
    let Some(lot) = LotSeries::of(judged.parts, judged.limits) else {
        return;
    };
    let (mut before, mut records) = (Vec::new(), Vec::new());
    for past in comparable_lots(judged) {
        let here = past.station == judged.station.name;
        if let Some(series) = past.series.filter(|s| here && s.at == lot.at) {
            before.push(series);
            records.push(past.record.clone());
        }
    }
    let section = common_shift(lot, &before, records);
    let warning = warning(&section, judged.station);
    if !section.shifts.is_empty() {
        let result = match section.found {
            Some(Common::ImpedanceScaled) => "one factor on |Z|: a warning",
            Some(_) => "the ESL of the whole lot has shifted: a warning",
            None => "no shift common to the whole lot",
        };
        ruled.steps.push(step(
            "whole lot",
            "like the accepted lots before on this station in ESL, and in capacitance and ESR together: t of one more lot median at p 0.01, the whole lot with both quartiles",
            "ISO 16269-8:2004, prediction of one further value; L = 1/((2π SRF)² C)",
            numbers(&section),
            result.to_owned(),
        ));
    }
    ruled.warnings.extend(warning);
    ruled.findings.common_shift = Some(section);
}

fn numbers(section: &CommonShift) -> String {
    let each: Vec<String> = section
        .shifts
        .iter()
        .map(|s| {
            format!(
                "{} {} (p {:.3})",
                s.of.replace('_', " "),
                percent(s.shift),
                s.p_value
            )
        })
        .collect();
    format!(
        "{} accepted lots before on this station; {}",
        section.history.len(),
        each.join(", ")
    )
}

fn percent(ratio: f64) -> String {
    format!("{:+.2} %", 100.0 * ratio)
}

/// The sentence for an operator and a quality engineer.
fn warning(section: &CommonShift, station: &Station) -> Option<Note> {
    let found = section.found?;
    let shift = |of: &str| {
        let one = section.shifts.iter().find(|s| s.of == of);
        one.map_or((0.0, 1.0), |s| (s.shift, s.p_value))
    };
    let lots = section.history.len();
    Some(match found {
        Common::ImpedanceScaled => warnings::impedance_scaled(format!(
            "the whole lot reads as if every impedance were multiplied by {:.4}: capacitance {}, ESR {}, ESL {} against the {lots} accepted lots before on {}, SRF and C × ESR as before (p {:.1e}): \
             a lot of truly other capacitance would have another SRF. Suspect {}; measure a part of known value, and a part kept from an earlier lot",
            section.factor.unwrap_or(1.0),
            percent(shift("capacitance").0),
            percent(shift("esr_at_srf").0),
            percent(shift("esl").0),
            station.name,
            shift("capacitance").1,
            suspect(station),
        )),
        Common::EslShifted => {
            let now = section.lot.esl[1];
            let (ratio, p) = shift("esl");
            let previous = now / (1.0 + ratio);
            let sign = if ratio < 0.0 { "-" } else { "+" };
            warnings::esl_shifted(format!(
                "the ESL of the whole lot, from SRF and capacitance, is {}; in the {lots} accepted lots before on {} it was {} ({sign}{}, p {p:.1e}). It depends on the part's geometry and on the jig, not on the capacitance: \
                 check how parts sit in the jig and its short, and measure a part kept from an earlier lot; if that reads as before, ask the supplier what has changed in the part",
                engineering(now, "H", 4),
                station.name,
                engineering(previous, "H", 4),
                engineering((now - previous).abs(), "H", 3),
            ))
        }
    })
}

/// What scales every impedance by one factor with the station's method. A load standard takes the
/// place of the reference: what is read is relative to it.
fn suspect(station: &Station) -> String {
    if let Some(load) = &station.compensation.load {
        return format!(
            "the load standard of the compensation, which the station file states as {}, and its sweep",
            shortest(load.resistance, "Ω")
        );
    }
    match (station.method, station.reference) {
        (Method::SeriesReference, Some(reference)) => format!(
            "the reference resistor, which the station file states as {}",
            shortest(reference.resistance, "Ω")
        ),
        (Method::ShuntThrough | Method::SeriesThrough | Method::Reflection, _) => {
            "the reference impedance that the sweep files state, and the analyser's calibration"
                .to_owned()
        }
        _ => {
            "the instrument's calibration and range, and the unit of the sweep's columns".to_owned()
        }
    }
}
