//! What depends on a sweep's frequencies alone. Sweeps of a lot share their frequencies, so that it
//! is worked out for the first and kept for the next; the values are the same either way.

use crate::statistics::lanes::filled;
use std::cell::RefCell;
use std::f64::consts::TAU;
use std::ops::Range;
use std::rc::Rc;

/// Frequency that logarithms are relative to, Hz.
pub(super) const LN_AT: f64 = 1e3;
/// Frequency that roots are relative to, Hz.
pub(super) const ROOT_AT: f64 = 1e6;
/// Every so manieth point is in the thin axis.
const THIN: usize = 8;

/// Functions of some frequencies, filled up to whole lanes with those of the last one.
#[derive(Debug, Clone, Default)]
pub(super) struct Axis {
    /// 2πf in rad/s
    pub(super) omega: Vec<f64>,
    /// ln(f / 1 kHz)
    pub(super) ln: Vec<f64>,
    /// √(f / 1 MHz)
    pub(super) root: Vec<f64>,
    /// The middle of all ln, and how far they reach from it.
    pub(super) middle: f64,
    pub(super) reach: f64,
}

impl Axis {
    pub(super) fn new(frequency: &[f64]) -> Axis {
        let of = |f: fn(f64) -> f64| {
            let mut all = filled(frequency.iter().map(|frequency| f(*frequency)));
            if let Some(last) = frequency.last() {
                all[frequency.len()..].fill(f(*last));
            }
            all
        };
        let ln = of(|f| (f / LN_AT).ln());
        let [first, last] = [ln.first(), ln.last()].map(|ln| *ln.unwrap_or(&0.0));
        let middle = 0.5 * (first + last);
        Axis {
            middle,
            reach: ln.iter().fold(0.0, |far, ln| (ln - middle).abs().max(far)),
            ln,
            omega: of(|f| TAU * f),
            root: of(|f| (f / ROOT_AT).sqrt()),
        }
    }
}

/// The frequencies of a sweep.
#[derive(Debug)]
pub(super) struct Grid {
    /// Hz
    frequency: Vec<f64>,
    pub(super) all: Axis,
    /// Of every `STEP`th point.
    pub(super) thin: Axis,
}

impl Grid {
    /// From one point of the thin axis to the next.
    pub(super) const STEP: usize = THIN;
}

/// Whether these are the same numbers. All are looked at, which is quicker than to stop at one.
fn same(a: Option<&[f64]>, b: Option<&[f64]>) -> bool {
    let (Some(a), Some(b)) = (a, b) else {
        return a.is_none() && b.is_none();
    };
    let equal: u64 = a.iter().zip(b).map(|(a, b)| u64::from(a == b)).sum();
    a.len() == b.len() && equal == a.len() as u64
}

thread_local! {
    static LAST: RefCell<Option<Rc<Grid>>> = const { RefCell::new(None) };
}

/// The grid of these frequencies, of which `range` alone may be looked at: no more need be the same
/// for a grid to be used again.
pub(super) fn grid(frequency: &[f64], range: Range<usize>) -> Rc<Grid> {
    let wanted = frequency.get(range.clone());
    LAST.with_borrow_mut(|last| {
        let known = last
            .take()
            .filter(|grid| grid.frequency.len() == frequency.len())
            .filter(|grid| same(grid.frequency.get(range), wanted));
        let grid = known.unwrap_or_else(|| {
            let thin: Vec<f64> = frequency.iter().copied().step_by(THIN).collect();
            Rc::new(Grid {
                frequency: frequency.to_vec(),
                all: Axis::new(frequency),
                thin: Axis::new(&thin),
            })
        });
        last.insert(grid).clone()
    })
}
