//! Capacitance against self-resonant frequency: a part whose combination is unlike its lot is of
//! another construction, though perhaps inside every limit.

use super::Characteristic;
use super::distributions::{FEWEST, figure};
use crate::certificate::canvas::Point;
use crate::certificate::figures::{plain, significant};
use crate::certificate::flow::{Flow, SMALL, SMALL_LEADING};
use crate::certificate::plot::scatter::{Pair, scatter as draw};
use crate::record::{JointSection, LotRecord, PartVerdict};

const HEIGHT: f64 = 240.0;

/// The core of the parts by two characteristics, in the units of the axes.
pub(in crate::certificate) struct Core {
    centre: Point,
    /// Lower triangle of the Cholesky factor of the covariance: xx, yx, yy.
    factor: [f64; 3],
    /// Critical squared distance.
    critical: f64,
}

impl Core {
    /// The part of a section that is about two keys.
    fn of(section: &JointSection, x: &Characteristic, y: &Characteristic) -> Option<Core> {
        let place = |key: &str| section.of.iter().position(|k| k == key);
        let (i, j) = (place(&x.bound.key)?, place(&y.bound.key)?);
        let value = |row: usize, column: usize| section.covariance.get(row)?.get(column).copied();
        let (ux, uy) = (x.scale.scaled(1.0), y.scale.scaled(1.0));
        let xx = (value(i, i)? * ux * ux).sqrt();
        let yx = value(j, i)? * ux * uy / xx;
        let yy = (value(j, j)? * uy * uy - yx * yx).sqrt();
        let core = Core {
            centre: (
                x.scale.scaled(*section.centre.get(i)?),
                y.scale.scaled(*section.centre.get(j)?),
            ),
            factor: [xx, yx, yy],
            critical: section.critical?,
        };
        let sound = [xx, yx, yy, core.centre.0, core.centre.1, core.critical];
        sound.iter().all(|v| v.is_finite()).then_some(core)
    }

    /// The ellipse at the critical distance, closed.
    pub fn ellipse(&self) -> Vec<Point> {
        const STEPS: u32 = 96;
        let reach = self.critical.sqrt();
        let [xx, yx, yy] = self.factor;
        (0..=STEPS)
            .map(|k| {
                let angle = std::f64::consts::TAU * f64::from(k) / f64::from(STEPS);
                let (u, v) = (reach * angle.cos(), reach * angle.sin());
                (self.centre.0 + xx * u, self.centre.1 + yx * u + yy * v)
            })
            .collect()
    }
}

/// The two characteristics, where a record has both.
fn axes<'c, 'r>(all: &'c [Characteristic<'r>]) -> Option<[&'c Characteristic<'r>; 2]> {
    let first = |kind: &str| {
        all.iter()
            .find(|c| c.bound.key.split('@').next() == Some(kind) && !c.values.is_empty())
    };
    Some([first("capacitance")?, first("srf")?])
}

/// What the record has of both together.
fn section<'r>(record: &'r LotRecord, [x, y]: [&Characteristic; 2]) -> Option<&'r JointSection> {
    let about = |s: &&JointSection| [x, y].iter().all(|c| s.of.contains(&c.bound.key));
    let found = &record.findings;
    found.joint.iter().chain(&found.scatter).find(about)
}

pub(in crate::certificate) fn scatter(flow: &mut Flow, record: &LotRecord, all: &[Characteristic]) {
    let Some([x, y]) = axes(all) else { return };
    let found = section(record, [x, y]);
    let outliers: Vec<&str> = found.map_or_else(Vec::new, |s| {
        s.outliers.iter().map(|o| o.part.as_str()).collect()
    });
    let pairs: Vec<Pair> = x
        .values
        .iter()
        .filter_map(|v| {
            let other = y.values.iter().find(|o| o.order == v.order)?;
            Some(Pair {
                part: v.part,
                at: (x.scale.scaled(v.value), y.scale.scaled(other.value)),
                verdict: worse(v.verdict, other.verdict),
                second: x.in_second_group(v.part) || y.in_second_group(v.part),
                outlier: outliers.contains(&v.part),
            })
        })
        .collect();
    if pairs.len() < FEWEST {
        return;
    }
    let core = found.and_then(|s| Core::of(s, x, y));
    flow.heading("Capacitance against self-resonance", HEIGHT + 40.0);
    let area = flow.take(HEIGHT);
    let words = format!(
        "Scatter plot of {} parts: {} against {}",
        pairs.len(),
        y.bound.name,
        x.bound.name
    );
    figure(flow, words, |page| {
        draw(page, area, (x, y), &pairs, core.as_ref());
    });
    flow.y += 3.0;
    let text = format!(
        "Abscissa: {}; ordinate: {}. {}",
        x.title(),
        y.title(),
        caption(record, all).unwrap_or_default()
    );
    flow.paragraph_of(&text, SMALL, SMALL_LEADING);
}

fn worse(a: PartVerdict, b: PartVerdict) -> PartVerdict {
    let grave = |v: &PartVerdict| match v {
        PartVerdict::Nonconforming => 2,
        PartVerdict::Undecided => 1,
        _ => 0,
    };
    std::cmp::max_by_key(a, b, grave)
}

/// What the ellipse is and which parts lie beyond it, for the document and its text twin.
pub(in crate::certificate) fn caption(
    record: &LotRecord,
    all: &[Characteristic],
) -> Option<String> {
    let pair = axes(all)?;
    let Some((s, critical)) = section(record, pair).and_then(|s| Some((s, s.critical?))) else {
        return Some(
            "No ellipse: too few parts have both values, or the values have no spread.".to_owned(),
        );
    };
    let shadow = if s.of.len() > 2 {
        format!(
            ", the shadow of an ellipsoid of {} characteristics",
            s.of.len()
        )
    } else {
        String::new()
    };
    let rule = if record.findings.joint.iter().any(|j| j == s) {
        ""
    } else {
        "; no rule looks at both together, so that it decided nothing"
    };
    let beyond = if s.outliers.is_empty() {
        "no part lies beyond it".to_owned()
    } else {
        let each: Vec<String> = s
            .outliers
            .iter()
            .map(|o| format!("{} ({})", o.part, significant(o.squared_distance, 3)))
            .collect();
        format!("beyond it (squared distance): {}", each.join(", "))
    };
    Some(format!(
        "Ellipse: robust squared distance {} from the core of {} parts, significance {}{shadow}; {beyond}{rule}.",
        significant(critical, 3),
        s.n,
        plain(s.alpha)
    ))
}
