//! Single sampling by variables for a normally distributed characteristic, s method: ISO 3951-1;
//! MIL-STD-414 section B.
//!
//! Code letters are those of ISO 2859-1 Table 1 (with A taken as B, as in ISO 3951-1 Table A.1).
//! The acceptability constants k and the largest estimated percentages M are those of MIL-STD-414
//! Tables B-1 and B-3; ISO 3951:1989 took the same constants over, later editions recalculated them
//! and are not tabled here. Letter H takes 25 items (the standards of the 1980s give it 20 or 25 by
//! lot size), Q and R the largest sample, 200.
//!
//! Tightened inspection takes the normal plan of the next smaller AQL, reduced inspection that of the
//! smaller sample and the next larger AQL. This is how the published tables of reduced inspection
//! (MIL-STD-414 B-2 and B-4, ANSI/ASQ Z1.9 B-4) are made; they are not copied here: the plans follow from
//! the normal tables. A public reprint of Z1.9 Table B-4 agrees in the sample sizes, and in M within
//! the recalculation that Z1.9 made of its normal table.
//!
//! Normality must have been tested first
//! ([`anderson_darling`](super::normality::anderson_darling)): the shares that these plans control
//! lie in the tails of the assumed distribution.

mod tables;

use super::Undefined;
use super::distributions::{
    beta_cdf, noncentral_t_sf, noncentrality_at, normal_sf, normal_upper_quantile,
};
use super::sampling::{
    CodeLetter, InspectionLevel, Severity, aql_index, code_letter, neighbouring_aqls,
};
use super::summary::Summary;
use tables::{COLUMNS, FIRST_COLUMN, REDUCED, REDUCED_ONLY, ROWS, Row};

/// A single sampling plan by variables, standard deviation unknown.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Plan {
    /// Sample size.
    pub n: u64,
    /// Acceptability constant of Form k: one limit, accepted where Q ≥ k.
    pub k: f64,
    /// Largest estimated share nonconforming (a ratio) of Form M: two limits, accepted where p̂ ≤ M.
    pub m: f64,
}

/// How the sample was judged.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Form {
    /// One limit: Q ≥ k.
    K,
    /// Two limits with one AQL: p̂ = p̂(lower) + p̂(upper) ≤ M.
    M,
}

/// The outcome of a sample against a plan.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Outcome {
    #[allow(missing_docs)]
    pub form: Form,
    #[allow(missing_docs)]
    pub mean: f64,
    /// Divisor n − 1.
    pub standard_deviation: f64,
    /// (x̄ − L)/s, infinite at zero spread; `None` without a lower limit.
    pub q_lower: Option<f64>,
    /// (U − x̄)/s, infinite at zero spread; `None` without an upper limit.
    pub q_upper: Option<f64>,
    /// Estimated share below the lower limit, a ratio.
    pub p_lower: f64,
    /// Estimated share above the upper limit, a ratio.
    pub p_upper: f64,
    #[allow(missing_docs)]
    pub accepted: bool,
}

impl Outcome {
    /// Estimated share nonconforming of the lot, a ratio.
    pub fn p(&self) -> f64 {
        self.p_lower + self.p_upper
    }

    /// Whether another plan's constants accept the same sample.
    pub fn accepted_by(&self, plan: &Plan) -> bool {
        match (self.form, self.q_lower.or(self.q_upper)) {
            (Form::K, Some(q)) => q >= plan.k,
            _ => self.p() <= plan.m,
        }
    }
}

impl Plan {
    /// Judges the first n values against one limit (Form k) or two (Form M). On the boundary the
    /// lot is accepted.
    ///
    /// # Errors
    /// [`Undefined::TooFewValues`], [`Undefined::NoLimit`], [`Undefined::LimitsReversed`],
    /// [`Undefined::NotFinite`].
    pub fn judge(
        &self,
        values: &[f64],
        lower: Option<f64>,
        upper: Option<f64>,
    ) -> Result<Outcome, Undefined> {
        let sample = usize::try_from(self.n).ok().and_then(|n| values.get(..n));
        let sample = sample.ok_or(Undefined::TooFewValues {
            needed: self.n,
            found: values.len() as u64,
        })?;
        if let (Some(l), Some(u)) = (lower, upper)
            && l >= u
        {
            return Err(Undefined::LimitsReversed);
        }
        let summary = Summary::of(sample)?;
        let s = summary.standard_deviation?;
        let q_lower = lower.map(|l| quality_index(summary.mean - l, s));
        let q_upper = upper.map(|u| quality_index(u - summary.mean, s));
        let share = |q: Option<f64>| q.map_or(0.0, |q| estimated_share(q, self.n));
        let (p_lower, p_upper) = (share(q_lower), share(q_upper));
        let (form, accepted) = match (q_lower, q_upper) {
            (None, None) => return Err(Undefined::NoLimit),
            (Some(q), None) | (None, Some(q)) => (Form::K, q >= self.k),
            (Some(_), Some(_)) => (Form::M, p_lower + p_upper <= self.m),
        };
        Ok(Outcome {
            form,
            mean: summary.mean,
            standard_deviation: s,
            q_lower,
            q_upper,
            p_lower,
            p_upper,
            accepted,
        })
    }
}

/// Distance to a limit over s; at zero spread +∞ on or inside the limit, −∞ outside.
fn quality_index(distance: f64, s: f64) -> f64 {
    if s > 0.0 {
        return distance / s;
    }
    if distance >= 0.0 {
        f64::INFINITY
    } else {
        f64::NEG_INFINITY
    }
}

/// Estimated share of the lot beyond a limit (a ratio) at the quality index Q of a sample of n ≥ 3:
/// I_B(n/2 − 1, n/2 − 1) with B = (1 − Q √n/(n − 1))/2, at least 0.
///
/// The unbiased estimate of least variance, Lieberman & Resnikoff (1955); MIL-STD-414 Table B-5;
/// ISO 3951-2. NaN for n below 3.
pub fn estimated_share(q: f64, n: u64) -> f64 {
    if n < 3 {
        return f64::NAN;
    }
    let size = n as f64;
    let b = 0.5 * (1.0 - q * size.sqrt() / (size - 1.0));
    beta_cdf(b.clamp(0.0, 1.0), 0.5 * size - 1.0, 0.5 * size - 1.0)
}

/// The plan for a lot, an inspection level and an AQL in percent from 0.040 to 10.
///
/// Tightened inspection takes the column of the next smaller AQL, reduced inspection the smaller
/// sample of the code letter and the column of the next larger AQL.
///
/// # Errors
/// [`Undefined::LotTooSmall`]; [`Undefined::AqlNotInSeries`]; [`Undefined::NoPlan`] for an AQL below the
/// table's, or where no sample is large enough;
/// [`Undefined::WholeLot`] where the sample would be the whole lot.
pub fn plan_for(
    lot: u64,
    level: InspectionLevel,
    aql: f64,
    severity: Severity,
) -> Result<Plan, Undefined> {
    let plan = plan_of_letter(code_letter(lot, level)?, aql, severity)?;
    if plan.n >= lot {
        return Err(Undefined::WholeLot {
            sample: plan.n,
            lot,
        });
    }
    Ok(plan)
}

/// The plan for a code letter of ISO 2859-1, an AQL in percent and a severity, arrows followed.
///
/// # Errors
/// [`Undefined::AqlNotInSeries`], [`Undefined::NoPlan`].
pub fn plan_of_letter(letter: CodeLetter, aql: f64, severity: Severity) -> Result<Plan, Undefined> {
    let column = column(aql)?;
    match severity {
        Severity::Normal => plan_of_size(smallest_sample(letter), aql),
        Severity::Tightened => {
            let tighter = column.checked_sub(1).ok_or(Undefined::NoPlan)?;
            find(tighter, smallest_sample(letter), |n| {
                !REDUCED_ONLY.contains(&n)
            })
        }
        Severity::Reduced => find(column + 1, reduced_sample(letter), |n| REDUCED.contains(&n)),
    }
}

/// The plan by which the same sample is judged with the AQL one step tighter, which the switching
/// rules ask for; `None` below the table.
pub fn one_step_tighter(letter: CodeLetter, aql: f64, severity: Severity) -> Option<Plan> {
    let tighter = neighbouring_aqls(aql).0?;
    plan_of_letter(letter, tighter, severity).ok()
}

/// The normal-inspection plan of the smallest sample from a size on that has one for the AQL
/// (arrows down followed).
///
/// # Errors
/// [`Undefined::AqlNotInSeries`], [`Undefined::NoPlan`].
pub fn plan_of_size(smallest: u64, aql: f64) -> Result<Plan, Undefined> {
    find(column(aql)?, smallest, |n| !REDUCED_ONLY.contains(&n))
}

/// Of an AQL from 0.040 to 10.
fn column(aql: f64) -> Result<usize, Undefined> {
    aql_index(aql)
        .ok_or(Undefined::AqlNotInSeries { found: aql })?
        .checked_sub(FIRST_COLUMN)
        .filter(|column| *column < COLUMNS - 1)
        .ok_or(Undefined::NoPlan)
}

fn find(column: usize, smallest: u64, used: impl Fn(u64) -> bool) -> Result<Plan, Undefined> {
    let plan = |row: &Row| {
        let (k, m) = (*row.k.get(column)?, *row.m.get(column)?);
        (!k.is_nan()).then_some(Plan {
            n: row.n,
            k,
            m: m / 100.0,
        })
    };
    ROWS.iter()
        .filter(|row| row.n >= smallest && used(row.n))
        .find_map(plan)
        .ok_or(Undefined::NoPlan)
}

/// Sample size of a code letter before arrows.
fn smallest_sample(letter: CodeLetter) -> u64 {
    match letter {
        CodeLetter::A | CodeLetter::B => 3,
        CodeLetter::C => 4,
        CodeLetter::D => 5,
        CodeLetter::E => 7,
        CodeLetter::F => 10,
        CodeLetter::G => 15,
        CodeLetter::H => 25,
        CodeLetter::J => 35,
        CodeLetter::K => 50,
        CodeLetter::L => 75,
        CodeLetter::M => 100,
        CodeLetter::N => 150,
        CodeLetter::P | CodeLetter::Q | CodeLetter::R | CodeLetter::S => 200,
    }
}

/// Sample size of reduced inspection of a code letter before arrows.
fn reduced_sample(letter: CodeLetter) -> u64 {
    match letter {
        CodeLetter::A | CodeLetter::B | CodeLetter::C | CodeLetter::D | CodeLetter::E => 3,
        CodeLetter::F => 4,
        CodeLetter::G => 5,
        CodeLetter::H => 10,
        CodeLetter::J => 15,
        CodeLetter::K => 20,
        CodeLetter::L => 25,
        CodeLetter::M => 30,
        CodeLetter::N => 50,
        CodeLetter::P | CodeLetter::Q | CodeLetter::R | CodeLetter::S => 75,
    }
}

/// The probability that a normal lot with that share beyond its one limit (a ratio) is accepted by
/// Form k: P(T ≥ k√n) for the noncentral t of n − 1 degrees of freedom and noncentrality √n z, z
/// the normal quantile of the conforming share. NaN for n below 2.
pub fn acceptance_probability(n: u64, k: f64, p: f64) -> f64 {
    if n < 2 || !(0.0..=1.0).contains(&p) {
        return f64::NAN;
    }
    if p == 0.0 || p == 1.0 {
        return 1.0 - p;
    }
    let root_n = (n as f64).sqrt();
    noncentral_t_sf(
        k * root_n,
        (n - 1) as f64,
        root_n * normal_upper_quantile(p),
    )
}

/// The share beyond the one limit (a ratio) at which a normal lot is accepted by Form k with probability pa.
pub fn quality_at(n: u64, k: f64, pa: f64) -> f64 {
    if n < 2 {
        return f64::NAN;
    }
    let root_n = (n as f64).sqrt();
    normal_sf(noncentrality_at(k * root_n, (n - 1) as f64, pa) / root_n)
}
