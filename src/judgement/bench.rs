//! Can this bench decide it? The expanded uncertainty of a reading that lies on a limit, against the
//! room that the limits leave.
//!
//! First-order propagation (JCGM 100:2008, 5.1.2) of what the station states, at the limit itself:
//! no sweep is needed. The reactance that ESR is read against comes from the nominal capacitance,
//! where the limit file gives one.

use crate::diagnostic::Note;
use crate::limits::{Bound, Limits};
use crate::readings::{Characteristic, Place};
use crate::station::{Repeatability, Station};
use serde::Serialize;
use std::f64::consts::TAU;

/// Up to this share of the room the bench decides (the ratio of four to one of common practice, no
/// source).
const DECIDES: f64 = 0.25;
/// Coverage factor of the expanded uncertainty where the limit file states none of its own.
const COVERAGE: f64 = 2.0;

/// What a bench can make of a bound.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Ability {
    /// The uncertainty is small against the room.
    Decides,
    /// Many readings will be undecided.
    WideGreyZone,
    /// The uncertainty is as large as the room, or larger.
    CannotDecide,
    /// The station states no uncertainty, or the limit file no nominal capacitance.
    NotKnown,
}

impl Ability {
    /// For people.
    pub fn words(self) -> &'static str {
        match self {
            Ability::Decides => "decides",
            Ability::WideGreyZone => "decides with a wide grey zone",
            Ability::CannotDecide => "cannot decide",
            Ability::NotKnown => "not known",
        }
    }
}

/// One bound on one bench.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct BenchAbility {
    #[allow(missing_docs)]
    pub key: String,
    /// The limit looked at, in the unit of the characteristic.
    pub limit: f64,
    /// `k u` of a reading that lies on the limit, in the same unit.
    pub expanded_uncertainty: Option<f64>,
    /// Half the distance between two limits, or the limit itself where there is one.
    pub room: f64,
    /// Expanded uncertainty over room.
    pub ratio: Option<f64>,
    #[allow(missing_docs)]
    pub ability: Ability,
    /// Why, where the bench does not simply decide.
    pub why: String,
}

/// Every bound of a limit file on a station, at its most critical limit.
pub fn abilities(limits: &Limits, station: &Station) -> Vec<BenchAbility> {
    limits
        .bounds
        .iter()
        .filter_map(|bound| of_bound(bound, limits, station))
        .collect()
}

/// A warning for each limit that this bench cannot decide.
pub fn undecidable(limits: &Limits, station: &Station) -> Vec<Note> {
    abilities(limits, station)
        .into_iter()
        .filter(|a| a.ability == Ability::CannotDecide)
        .map(|a| {
            let ratio = a.ratio.unwrap_or(f64::INFINITY);
            let text = format!(
                "{} cannot decide {}: the expanded uncertainty at the limit is {ratio:.1} times the room ({})",
                station.name, a.key, a.why
            );
            Note::new("bench_cannot_decide", text)
        })
        .collect()
}

fn of_bound(bound: &Bound, limits: &Limits, station: &Station) -> Option<BenchAbility> {
    let limit = bound.upper.or(bound.lower)?;
    let room = match (bound.lower, bound.upper) {
        (Some(l), Some(u)) => 0.5 * (u - l),
        _ => limit.abs(),
    };
    let k = if limits.decision_rule.coverage_factor > 0.0 {
        limits.decision_rule.coverage_factor
    } else {
        COVERAGE
    };
    let (u, why) = match standard_uncertainty(bound, limit, limits, station) {
        Ok((u, why)) => (Some(u), why),
        Err(why) => (None, why),
    };
    let expanded = u.map(|u| k * u);
    let ratio = expanded.map(|e| e / room).filter(|r| r.is_finite());
    let ability = match ratio {
        None => Ability::NotKnown,
        Some(r) if r <= DECIDES => Ability::Decides,
        Some(r) if r < 1.0 => Ability::WideGreyZone,
        Some(_) => Ability::CannotDecide,
    };
    let why = if ability == Ability::Decides {
        String::new()
    } else {
        why
    };
    Some(BenchAbility {
        key: bound.key.clone(),
        limit,
        expanded_uncertainty: expanded,
        room,
        ratio,
        ability,
        why,
    })
}

/// Standard uncertainty of a reading that lies on the limit, and what dominates it.
fn standard_uncertainty(
    bound: &Bound,
    limit: f64,
    limits: &Limits,
    station: &Station,
) -> Result<(f64, String), String> {
    use Characteristic::*;
    let stated = &station.uncertainty;
    let reference = station.reference.map_or(0.0, |r| r.tolerance / 3f64.sqrt());
    let magnitude = || {
        stated
            .magnitude
            .map(|m| m.hypot(reference))
            .ok_or("the station states no uncertainty of magnitude")
    };
    let phase = || {
        stated
            .phase
            .ok_or("the station states no uncertainty of phase")
    };
    let repeatability = stated
        .repeatability
        .iter()
        .find(|(name, _)| name == bound.characteristic.name())
        .map_or(0.0, |(_, r)| match r {
            Repeatability::Relative(ratio) => ratio * limit.abs(),
            Repeatability::Absolute(value) => *value,
        });
    let temperature = limits
        .conditions
        .temperature_coefficients
        .iter()
        .find(|(of, _)| *of == bound.characteristic)
        .map_or(0.0, |(_, share)| {
            share * limit * stated.temperature.unwrap_or(0.0)
        });
    let (instrument, why) = match bound.characteristic {
        Capacitance | FittedCapacitance | Impedance | Esl => {
            (magnitude()? * limit.abs(), "magnitude dominates".to_owned())
        }
        DissipationFactor => (
            (1.0 + limit * limit) * phase()?,
            "the phase uncertainty is all of it".to_owned(),
        ),
        // At the minimum the reactance is small against the resistance.
        EsrMinimum | FittedResistance => (
            magnitude()? * limit.abs(),
            "magnitude and repeatability".to_owned(),
        ),
        Srf => (0.0, "repeatability".to_owned()),
        Esr => {
            let x = reactance(bound, limits)
                .ok_or("the limit file gives no nominal capacitance to know the reactance by")?;
            let (of_magnitude, of_phase) = (magnitude()? * limit.abs(), phase()? * x);
            let why = format!(
                "the reactance there is {:.0} times the limit, and phase times reactance is the uncertainty",
                x / limit.abs()
            );
            (of_magnitude.hypot(of_phase), why)
        }
    };
    let others = instrument.hypot(repeatability);
    let why = if temperature.abs() > others {
        "the uncertainty of the temperature dominates".to_owned()
    } else {
        why
    };
    Ok((others.hypot(temperature), why))
}

/// |X| where ESR is bounded, from the nominal capacitance; of a band its lower end, where it is
/// largest.
fn reactance(bound: &Bound, limits: &Limits) -> Option<f64> {
    let frequency = match bound.place {
        Place::At(f) | Place::Between(f, _) => f,
        Place::Anywhere => return None,
    };
    let capacitance = limits
        .bounds
        .iter()
        .find(|b| b.characteristic == Characteristic::Capacitance)?
        .nominal?;
    let x = 1.0 / (TAU * frequency * capacitance);
    x.is_finite().then_some(x)
}
