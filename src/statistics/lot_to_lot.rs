//! A lot against the lots before it: shift of the mean, change of the spread, EWMA and run rules on
//! lot means.
//!
//! The histories are those of one supplier, part and characteristic, oldest first. Nothing here
//! decides how many lots make a history; [`LOTS_MIN`] is a suggestion.

use super::Undefined;
use super::distributions::{f_sf, student_t_sf};
use super::summary::{Summary, moving_range_sigma, sum};

/// Previous lots from which control limits mean something. Common practice asks for 20 or more;
/// below 8 the limits of an individuals chart are off by a quarter and more. No source.
pub const LOTS_MIN: u64 = 8;

/// Smoothing and width of an EWMA with a mean run of 500 lots between false alarms, and of 10.5 to
/// a shift of one sigma: Lucas & Saccucci (1990).
pub const EWMA_LAMBDA: f64 = 0.2;
/// See [`EWMA_LAMBDA`].
pub const EWMA_WIDTH: f64 = 2.962;

/// Control limits of single values in sequence, here lot means.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct ControlLimits {
    pub centre: f64,
    /// Mean moving range of two over d2.
    pub sigma: f64,
    /// Centre − 3 sigma.
    pub lower: f64,
    /// Centre + 3 sigma.
    pub upper: f64,
}

/// Limits of an individuals chart from previous lot means: ISO 7870-2; NIST/SEMATECH e-Handbook 6.3.2.2.
///
/// # Errors
/// [`Undefined::TooFewValues`] below 2, [`Undefined::ZeroSpread`], [`Undefined::NotFinite`].
pub fn control_limits(previous: &[f64]) -> Result<ControlLimits, Undefined> {
    let centre = Summary::of(previous)?.mean;
    let sigma = moving_range_sigma(previous)?;
    if sigma == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    Ok(ControlLimits {
        centre,
        sigma,
        lower: centre - 3.0 * sigma,
        upper: centre + 3.0 * sigma,
    })
}

/// A comparison with its two-sided p-value.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Comparison {
    /// t of a shift, F of a change of spread.
    pub statistic: f64,
    #[allow(missing_docs)]
    pub p_value: f64,
}

/// Whether a lot mean belongs to the previous lot means: t = (x − x̄)/(s √(1 + 1/m)) with m − 1
/// degrees of freedom, the prediction of one more normal value from m.
///
/// # Errors
/// [`Undefined::TooFewValues`] below 3 previous lots, [`Undefined::ZeroSpread`], [`Undefined::NotFinite`].
pub fn mean_shift(mean: f64, previous: &[f64]) -> Result<Comparison, Undefined> {
    let m = previous.len();
    if m < 3 {
        return Err(Undefined::TooFewValues {
            needed: 3,
            found: m as u64,
        });
    }
    let summary = Summary::of(previous)?;
    let s = summary.standard_deviation?;
    if s == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    if !mean.is_finite() {
        return Err(Undefined::NotFinite);
    }
    let m = m as f64;
    let statistic = (mean - summary.mean) / (s * (1.0 + 1.0 / m).sqrt());
    Ok(Comparison {
        statistic,
        p_value: 2.0 * student_t_sf(statistic.abs(), m - 1.0),
    })
}

/// Standard deviation and number of values of a lot's sample.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct LotSpread {
    pub standard_deviation: f64,
    pub n: u64,
}

/// Whether the spread within a lot is that of the previous lots: F = s²/pooled s², two-sided
/// (Snedecor & Cochran; NIST/SEMATECH e-Handbook 1.3.5.9).
///
/// # Errors
/// [`Undefined::TooFewValues`] where either side has no degree of freedom,
/// [`Undefined::ZeroSpread`], [`Undefined::NotFinite`].
pub fn spread_change(lot: LotSpread, previous: &[LotSpread]) -> Result<Comparison, Undefined> {
    let freedom = |l: &LotSpread| l.n.saturating_sub(1) as f64;
    let nu = freedom(&lot);
    let pooled_nu = sum(previous.iter().map(freedom));
    if nu == 0.0 || pooled_nu == 0.0 {
        return Err(Undefined::TooFewValues {
            needed: 2,
            found: if nu == 0.0 { lot.n } else { 0 },
        });
    }
    let squares = previous
        .iter()
        .map(|l| freedom(l) * l.standard_deviation.powi(2));
    let pooled = sum(squares) / pooled_nu;
    if pooled == 0.0 || lot.standard_deviation == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    let statistic = lot.standard_deviation.powi(2) / pooled;
    if !statistic.is_finite() {
        return Err(Undefined::NotFinite);
    }
    let above = f_sf(statistic, nu, pooled_nu);
    let below = f_sf(1.0 / statistic, pooled_nu, nu);
    Ok(Comparison {
        statistic,
        p_value: (2.0 * above.min(below)).min(1.0),
    })
}

/// One point of an exponentially weighted moving average.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct EwmaPoint {
    pub value: f64,
    pub lower: f64,
    pub upper: f64,
    /// Beyond its limits.
    pub signal: bool,
}

/// The EWMA z = λx + (1 − λ)z of values in sequence, from the target on, with limits target ± width
/// σ √(λ/(2 − λ) (1 − (1 − λ)^2t)).
///
/// Roberts (1959); NIST/SEMATECH e-Handbook 6.3.2.4, which prints the limits for large t.
///
/// # Errors
/// [`Undefined::OutOfRange`] for a λ not in (0, 1] or a width not above 0,
/// [`Undefined::ZeroSpread`], [`Undefined::NotFinite`].
pub fn ewma(
    values: &[f64],
    target: f64,
    sigma: f64,
    lambda: f64,
    width: f64,
) -> Result<Vec<EwmaPoint>, Undefined> {
    if !(lambda > 0.0 && lambda <= 1.0) {
        return Err(Undefined::OutOfRange {
            argument: "smoothing factor",
            expected: "a ratio above 0 and at most 1",
        });
    }
    if width.is_nan() || width <= 0.0 {
        return Err(Undefined::OutOfRange {
            argument: "width",
            expected: "a number above 0",
        });
    }
    if sigma == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    let all_finite = values.iter().all(|x| x.is_finite());
    if !(all_finite && target.is_finite() && sigma.is_finite() && sigma > 0.0) {
        return Err(Undefined::NotFinite);
    }
    let mut value = target;
    let mut forgotten = 1.0;
    let points = values.iter().map(|x| {
        value = lambda * x + (1.0 - lambda) * value;
        forgotten *= (1.0 - lambda).powi(2);
        let reach = width * sigma * (lambda / (2.0 - lambda) * (1.0 - forgotten)).sqrt();
        EwmaPoint {
            value,
            lower: target - reach,
            upper: target + reach,
            signal: (value - target).abs() > reach,
        }
    });
    Ok(points.collect())
}

/// A pattern of values in sequence that a stable process seldom makes. Nelson (1984), The Shewhart
/// control chart: tests for special causes; Western Electric, Statistical quality control handbook
/// (1956).
///
/// "Beyond" is strictly; a value on the centre line is on neither side; a rule looks at the newest
/// values only once it has as many as it needs; of "two of three" and "four of five" the newest
/// need not be one.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RunRule {
    /// One value beyond 3 sigma.
    BeyondThreeSigma,
    /// That many in a row on one side of the centre: 9 (Nelson), 8 (Western Electric), 7 (ISO 7870-2).
    OneSide(usize),
    /// Six in a row steadily rising or falling.
    Trend,
    /// Fourteen in a row alternately up and down.
    Alternating,
    /// Two of three beyond 2 sigma on one side.
    TwoOfThree,
    /// Four of five beyond 1 sigma on one side.
    FourOfFive,
    /// Fifteen in a row within 1 sigma.
    FifteenWithin,
    /// Eight in a row beyond 1 sigma, on either side.
    EightBeyond,
}

impl RunRule {
    /// Nelson's eight rules. All together they signal about once in 90 values of a stable process.
    pub const NELSON: [Self; 8] = [
        Self::BeyondThreeSigma,
        Self::OneSide(9),
        Self::Trend,
        Self::Alternating,
        Self::TwoOfThree,
        Self::FourOfFive,
        Self::FifteenWithin,
        Self::EightBeyond,
    ];

    /// In words.
    pub fn text(self) -> String {
        match self {
            Self::BeyondThreeSigma => "one beyond 3 sigma".to_owned(),
            Self::OneSide(length) => format!("{length} in a row on one side of the centre"),
            Self::Trend => "6 in a row steadily rising or falling".to_owned(),
            Self::Alternating => "14 in a row alternately up and down".to_owned(),
            Self::TwoOfThree => "2 of 3 beyond 2 sigma on one side".to_owned(),
            Self::FourOfFive => "4 of 5 beyond 1 sigma on one side".to_owned(),
            Self::FifteenWithin => "15 in a row within 1 sigma".to_owned(),
            Self::EightBeyond => "8 in a row beyond 1 sigma".to_owned(),
        }
    }

    /// How many values it looks at.
    fn length(self) -> usize {
        match self {
            Self::BeyondThreeSigma => 1,
            Self::OneSide(length) => length.max(1),
            Self::Trend => 6,
            Self::Alternating => 14,
            Self::TwoOfThree => 3,
            Self::FourOfFive => 5,
            Self::FifteenWithin => 15,
            Self::EightBeyond => 8,
        }
    }

    /// Whether a window of its length, in deviations from the centre, has the pattern.
    fn holds(self, window: &[f64], sigma: f64) -> bool {
        let beyond = |count: usize, limit: f64| {
            window.iter().filter(|d| **d > limit).count() >= count
                || window.iter().filter(|d| **d < -limit).count() >= count
        };
        let steps = || {
            window.windows(2).map(|pair| match pair {
                [a, b] => b - a,
                _ => 0.0,
            })
        };
        match self {
            Self::BeyondThreeSigma => beyond(1, 3.0 * sigma),
            Self::OneSide(_) => beyond(window.len(), 0.0),
            Self::Trend => steps().all(|s| s > 0.0) || steps().all(|s| s < 0.0),
            Self::Alternating => {
                let signs: Vec<f64> = steps().map(sign).collect();
                signs.iter().all(|s| *s != 0.0)
                    && signs.windows(2).all(|pair| pair.first() != pair.last())
            }
            Self::TwoOfThree => beyond(2, 2.0 * sigma),
            Self::FourOfFive => beyond(4, sigma),
            Self::FifteenWithin => window.iter().all(|d| d.abs() < sigma),
            Self::EightBeyond => window.iter().all(|d| d.abs() > sigma),
        }
    }
}

fn sign(x: f64) -> f64 {
    if x == 0.0 { 0.0 } else { x.signum() }
}

/// A rule and the index of the value at which its pattern is complete.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct RunSignal {
    pub rule: RunRule,
    pub index: usize,
}

/// Every signal of the rules in values in sequence, in the order of the values; a pattern that goes
/// on signals at every further value.
pub fn run_signals(values: &[f64], centre: f64, sigma: f64, rules: &[RunRule]) -> Vec<RunSignal> {
    let deviations: Vec<f64> = values.iter().map(|x| x - centre).collect();
    let mut signals = Vec::new();
    for end in 1..=deviations.len() {
        for rule in rules {
            let window = end
                .checked_sub(rule.length())
                .and_then(|start| deviations.get(start..end));
            if window.is_some_and(|window| rule.holds(window, sigma)) {
                signals.push(RunSignal {
                    rule: *rule,
                    index: end - 1,
                });
            }
        }
    }
    signals
}
