//! Which stretch of a characteristic a drawing shows.

/// The stretch shown, in the unit of the values.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(in crate::certificate) struct View {
    pub low: f64,
    pub high: f64,
}

/// Smallest and largest of the finite values.
pub(in crate::certificate) fn extent(values: impl IntoIterator<Item = f64>) -> Option<(f64, f64)> {
    values
        .into_iter()
        .filter(|v| v.is_finite())
        .fold(None, |e, v| match e {
            None => Some((v, v)),
            Some((low, high)) => Some((low.min(v), high.max(v))),
        })
}

impl View {
    /// Limits, nominal and all values; values far beyond the limits (more than the window again) are
    /// left to arrows at the edge, so that one wild part does not flatten the drawing.
    pub fn with_limits(values: &[f64], marks: &[f64]) -> View {
        let data = extent(values.iter().copied());
        let Some((mark_low, mark_high)) = extent(marks.iter().copied()) else {
            return View::padded(data.unwrap_or((0.0, 1.0)));
        };
        let mut window = mark_high - mark_low;
        if window <= 0.0 {
            // A single limit: the bulk of the values sets the measure.
            let bulk = bulk(values).unwrap_or((mark_low, mark_low));
            let reach = bulk.1.max(mark_high) - bulk.0.min(mark_low);
            window = (2.0 * reach).max(mark_high.abs() * 1e-3);
        }
        let (low, high) = data.unwrap_or((mark_low, mark_high));
        View::padded((
            mark_low.min(low.max(mark_low - window)),
            mark_high.max(high.min(mark_high + window)),
        ))
    }

    /// As `with_limits`, but where the values fill only a small part of that, the values alone.
    pub fn of_values(values: &[f64], marks: &[f64]) -> View {
        let whole = View::with_limits(values, marks);
        let inside = values
            .iter()
            .copied()
            .filter(|v| *v >= whole.low && *v <= whole.high);
        match extent(inside) {
            Some((low, high)) if high > low && (high - low) < (whole.high - whole.low) / 10.0 => {
                let spare = (high - low) * 0.8;
                View::padded((low - spare, high + spare))
            }
            _ => whole,
        }
    }

    /// A little room at both ends; a single value gets room in proportion to itself.
    fn padded((low, high): (f64, f64)) -> View {
        let span = high - low;
        let pad = if span > 0.0 {
            span * 0.06
        } else if low == 0.0 {
            1.0
        } else {
            low.abs() * 0.02
        };
        View {
            low: low - pad,
            high: high + pad,
        }
    }

    pub fn contains(&self, value: f64) -> bool {
        value >= self.low && value <= self.high
    }
}

/// Between the 5th and the 95th percentile (by rank).
fn bulk(values: &[f64]) -> Option<(f64, f64)> {
    let mut sorted: Vec<f64> = values.iter().copied().filter(|v| v.is_finite()).collect();
    sorted.sort_by(f64::total_cmp);
    let last = sorted.len().checked_sub(1)?;
    Some((*sorted.get(last / 20)?, *sorted.get(last - last / 20)?))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn limits_are_always_inside_and_a_wild_value_is_not() {
        let view = View::with_limits(&[4.6, 4.7, 900.0], &[4.23, 5.17]);
        assert!(view.contains(4.23) && view.contains(5.17) && !view.contains(900.0));
    }

    #[test]
    fn no_values_and_no_limits_still_have_a_length() {
        for (values, marks) in [
            (vec![], vec![]),
            (vec![2.0], vec![]),
            (vec![], vec![3.0]),
            (vec![0.0, 0.0], vec![0.0]),
        ] {
            let view = View::of_values(&values, &marks);
            assert!(view.high > view.low, "{values:?} {marks:?}");
        }
    }

    #[test]
    fn values_in_a_corner_are_shown_large() {
        let view = View::of_values(&[4.70, 4.71, 4.72], &[4.23, 5.17]);
        assert!(view.high - view.low < 0.1);
    }
}
