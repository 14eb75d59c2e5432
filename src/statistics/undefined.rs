//! Why a statistic does not exist.

/// Why a statistic does not exist. [`Undefined::text`] says it in a sentence.
#[derive(Debug, Clone, Copy, PartialEq)]
#[non_exhaustive]
pub enum Undefined {
    /// Fewer values than the statistic needs.
    #[allow(missing_docs)]
    TooFewValues { needed: u64, found: u64 },
    /// A value, or the result, is not a finite number.
    NotFinite,
    /// All values are equal, so that a ratio to their spread does not exist.
    ZeroSpread,
    /// Neither a lower nor an upper limit.
    NoLimit,
    /// Both limits are needed and one is not there.
    OneSided,
    /// The lower limit is not below the upper limit.
    LimitsReversed,
    /// A lot smaller than the table begins with.
    #[allow(missing_docs)]
    LotTooSmall { smallest: u64, found: u64 },
    /// An AQL that is not in the preferred series of ISO 2859-1.
    #[allow(missing_docs)]
    AqlNotInSeries { found: f64 },
    /// The table has no plan there.
    NoPlan,
    /// The sample would be the whole lot.
    #[allow(missing_docs)]
    WholeLot { sample: u64, lot: u64 },
    /// An argument outside its range: its name and range.
    #[allow(missing_docs)]
    OutOfRange {
        argument: &'static str,
        expected: &'static str,
    },
    /// Most of the spread is that of the measurement: its share of the variance, a ratio.
    #[allow(missing_docs)]
    MeasurementDominates { share: f64 },
    /// The variables depend linearly on one another, so that their scatter has no inverse.
    Collinear,
    /// A numerical solution was not found.
    NoSolution,
}

impl Undefined {
    /// One sentence, without a full stop.
    pub fn text(&self) -> String {
        match self {
            Self::TooFewValues { needed, found } => {
                let values = if *needed == 1 { "value" } else { "values" };
                format!("it needs at least {needed} {values} and there are {found}")
            }
            Self::NotFinite => "a value is not a finite number".to_owned(),
            Self::ZeroSpread => "all values are equal, so their spread is zero".to_owned(),
            Self::NoLimit => "there is neither a lower nor an upper limit".to_owned(),
            Self::OneSided => {
                "it needs a lower and an upper limit and there is only one".to_owned()
            }
            Self::LimitsReversed => "the lower limit is not below the upper limit".to_owned(),
            Self::LotTooSmall { smallest, found } => {
                format!("the table begins with lots of {smallest} and the lot is {found}")
            }
            Self::AqlNotInSeries { found } => {
                format!("the AQL {found} is not in the series of ISO 2859-1 from 0.010 to 10")
            }
            Self::NoPlan => "the table has no plan there".to_owned(),
            Self::WholeLot { sample, lot } => format!(
                "the sample of {sample} would be the whole lot of {lot}: every item is inspected and judged by itself"
            ),
            Self::OutOfRange { argument, expected } => {
                format!("{argument} is out of range: expected {expected}")
            }
            Self::MeasurementDominates { share } => format!(
                "{:.0} % of the variance is that of the measurement, so the spread says little of the parts",
                100.0 * share
            ),
            Self::Collinear => {
                "the characteristics depend linearly on one another, so a joint distance does not exist"
                    .to_owned()
            }
            Self::NoSolution => "no numerical solution was found".to_owned(),
        }
    }
}

impl std::fmt::Display for Undefined {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(&self.text())
    }
}

impl std::error::Error for Undefined {}
