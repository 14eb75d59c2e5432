//! Overlaid |Z| and ESR of all parts on log-log axes, with the limit windows.

use super::{part_anchor, part_ink, part_mark, part_word};
use crate::certificate::Curve;
use crate::certificate::canvas::{Anchor, Area, Canvas, Dash, Pen, Point};
use crate::certificate::figures::short;
use crate::certificate::flow::{Flow, SMALL, SMALL_LEADING};
use crate::certificate::ink::{CONFORMING, QUIET, TEXT};
use crate::certificate::plot::axis::{Axis, Kind, log_grid};
use crate::certificate::plot::limit::{Side, limit};
use crate::certificate::plot::trace::{Coverage, clip, columns, simplify};
use crate::certificate::plot::view::extent;
use crate::certificate::structure::Role;
use crate::certificate::text::{Style, width};
use crate::quantity::{engineering, with_uncertainty};
use crate::record::{BoundSection, LotRecord, PartVerdict};
use rayon::prelude::*;

/// Most curves that carry their part's number.
const NAMED: usize = 14;
const GUTTER: f64 = 46.0;
/// Least height of a plot that shares its page with other things.
const LEAST: f64 = 170.0;

/// What a plot shows of an impedance.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Quantity {
    Magnitude,
    Resistance,
}

impl Quantity {
    fn title(self) -> &'static str {
        match self {
            Quantity::Magnitude => "Magnitude of impedance |Z|",
            Quantity::Resistance => "Equivalent series resistance",
        }
    }

    /// Whether a bound is a level of this quantity.
    fn bounded_by(self, bound: &BoundSection) -> bool {
        let kind = bound.key.split('@').next().unwrap_or_default();
        match self {
            Quantity::Magnitude => kind == "impedance",
            Quantity::Resistance => kind == "esr" || kind == "esr_minimum",
        }
    }
}

pub(in crate::certificate) fn curves(flow: &mut Flow, record: &LotRecord, curves: &[Curve]) {
    if curves.is_empty() {
        flow.heading("Curves", 40.0);
        flow.paragraph("No curves: no part of this lot has a sweep that could be read.");
        return;
    }
    // Two plots share a page of either paper. On what other things left of one they stand together
    // if they fit, else the upper one alone.
    let both = |room: f64| (room - 26.0 - 14.0 - 176.0) / 2.0;
    let whole = both(flow.sheet.bottom - flow.sheet.top);
    let (rest, alone) = (both(flow.room() - 24.0), flow.room() - 124.0);
    let height = match (rest, alone) {
        (rest, _) if rest > LEAST => rest.min(whole),
        (_, alone) if alone > LEAST => alone.min(whole),
        _ => whole,
    };
    flow.heading("Curves", height + 70.0);
    key(flow, record, curves);
    for quantity in [Quantity::Magnitude, Quantity::Resistance] {
        plot(flow, record, curves, quantity, height);
    }
    if let Some(words) = circuit_words(record) {
        flow.gap(3.0);
        flow.paragraph_of(&words, SMALL, SMALL_LEADING);
    }
}

/// The curve of the equivalent circuit, above the others and thin.
fn fitted(page: &mut Canvas, frame: &Frame, record: &LotRecord, quantity: Quantity) {
    let Some(circuit) = &record.circuit else {
        return;
    };
    let value = |p: &[f64; 3]| match quantity {
        Quantity::Magnitude => p[1],
        Quantity::Resistance => p[2],
    };
    let placed: Vec<Point> = circuit
        .curve
        .iter()
        .filter(|p| p[0] > 0.0 && value(p) > 0.0)
        .map(|p| frame.place((p[0].log10(), value(p).log10())))
        .collect();
    page.lines(clip(&placed, frame.area), Pen::dashed(0.7, TEXT));
}

/// What the dashed curve is, and the elements of the circuit, for the document and its text
/// twin.
pub(in crate::certificate) fn circuit_words(record: &LotRecord) -> Option<String> {
    let circuit = record.circuit.as_ref()?;
    let share = |v: f64| engineering(v, "1", 2);
    let mut text = format!(
        "Equivalent circuit of part {}, the middle of the lot: {}",
        circuit.part, circuit.model
    );
    if circuit.described {
        text.push_str(&format!(
            ", dashed; it leaves {} of |Z| (root mean square), where the sweep's own noise is {}. ",
            share(circuit.residual),
            share(circuit.noise)
        ));
        let each: Vec<String> = circuit
            .parameters
            .iter()
            .map(|(name, p)| {
                let value = match p.standard_uncertainty {
                    Some(u) => with_uncertainty(p.value, u, &p.unit),
                    None => "not visible".to_owned(),
                };
                format!("{name} {value}")
            })
            .collect();
        text.push_str(&format!("{}.", each.join("; ")));
    } else {
        let why: Vec<&str> = circuit.notes.iter().map(|n| n.text.as_str()).collect();
        text.push_str(&format!(
            " does not describe it and is not drawn: {}.",
            why.join("; ")
        ));
    }
    Some(text)
}

/// The curve's points (hertz, ohm) as logarithms; points without a logarithm are gaps.
fn logarithms(curve: &Curve, quantity: Quantity) -> Vec<Point> {
    curve
        .frequency
        .iter()
        .zip(&curve.impedance)
        .map(|(f, z)| {
            let value = match quantity {
                Quantity::Magnitude => z.norm(),
                Quantity::Resistance => z.re,
            };
            let log = |v: f64| if v > 0.0 { v.log10() } else { f64::NAN };
            (log(*f), log(value))
        })
        .collect()
}

/// Everything a plot needs to place a value.
struct Frame {
    area: Area,
    x: Axis,
    y: Axis,
    /// Place of the logarithm 0 and length of a decade, along each axis.
    decades: [(f64, f64); 2],
}

impl Frame {
    fn new(area: Area, x: Axis, y: Axis) -> Frame {
        let decades = [&x, &y].map(|axis| {
            let (low, high) = (axis.low.log10(), axis.high.log10());
            let decade = (axis.to - axis.from) / (high - low);
            (axis.from - low * decade, decade)
        });
        Frame {
            area,
            x,
            y,
            decades,
        }
    }

    /// Logarithms to the page.
    fn place(&self, (f, v): Point) -> Point {
        let [(x, across), (y, up)] = self.decades;
        (x + f * across, y + v * up)
    }
}

fn plot(flow: &mut Flow, record: &LotRecord, curves: &[Curve], quantity: Quantity, height: f64) {
    flow.need(height + 40.0);
    flow.subheading(quantity.title(), height + 20.0);
    let outer = flow.take(height + 18.0);
    let area = Area {
        left: outer.left + 40.0,
        right: outer.right - GUTTER,
        top: outer.top + 4.0,
        bottom: outer.bottom - 16.0,
    };
    let logs: Vec<Vec<Point>> = curves.par_iter().map(|c| logarithms(c, quantity)).collect();
    let bounds: Vec<&BoundSection> = record
        .limits
        .characteristics
        .iter()
        .filter(|b| quantity.bounded_by(b))
        .collect();
    let Some(frame) = frame(area, curves, &logs, &bounds) else {
        let at = (area.left, (area.top + area.bottom) / 2.0);
        let before = flow.enter(Role::Paragraph);
        flow.page().text(at, SMALL, "No positive values to draw.");
        flow.leave(before);
        return;
    };
    let before = flow.enter(Role::Figure(in_words(quantity, curves)));
    let page = flow.page();
    log_grid(page, area, (&frame.x, "Hz"), (&frame.y, "Ω"));
    let unseen = traces(page, &frame, curves, &logs);
    fitted(page, &frame, record, quantity);
    let mut drawn = Vec::new();
    for bound in bounds {
        drawn.extend(level(page, &frame, bound, where_found(record, bound)));
    }
    if quantity == Quantity::Magnitude {
        for bound in record
            .limits
            .characteristics
            .iter()
            .filter(|b| b.key == "srf")
        {
            drawn.extend(resonance(page, &frame, bound));
        }
    }
    flow.leave(before);
    if !drawn.is_empty() {
        let text = format!("Limits drawn: {}.", drawn.join("; "));
        flow.paragraph_of(&text, SMALL, SMALL_LEADING);
    }
    if !unseen.is_empty() {
        let text = format!("Outside these axes: {}.", listed(&unseen));
        flow.paragraph_of(&text, SMALL, SMALL_LEADING);
    }
}

/// What the plot shows, for whoever cannot see it.
fn in_words(quantity: Quantity, curves: &[Curve]) -> String {
    let each: Vec<String> = counts(curves).into_iter().map(|(_, words)| words).collect();
    format!(
        "{} against frequency, one curve a part: {}",
        quantity.title(),
        each.join(", ")
    )
}

/// The first parts by number, and how many more.
fn listed(parts: &[&str]) -> String {
    let mut text = parts
        .iter()
        .take(NAMED)
        .map(|p| format!("part {p}"))
        .collect::<Vec<_>>()
        .join(", ");
    if parts.len() > NAMED {
        text.push_str(&format!(" and {} more", parts.len() - NAMED));
    }
    text
}

/// Axes that hold the judged parts' curves and the limits; a part without a valid sweep does not
/// stretch them.
fn frame(
    area: Area,
    curves: &[Curve],
    logs: &[Vec<Point>],
    bounds: &[&BoundSection],
) -> Option<Frame> {
    let judged = |only: bool| {
        let points = curves
            .iter()
            .zip(logs)
            .filter(move |(c, _)| !only || c.verdict != PartVerdict::Unmeasured)
            .flat_map(|(_, l)| l.iter())
            .filter(|p| p.0.is_finite() && p.1.is_finite());
        points.fold(None, |e: Option<[f64; 4]>, p| {
            let e = e.unwrap_or([p.0, p.0, p.1, p.1]);
            Some([e[0].min(p.0), e[1].max(p.0), e[2].min(p.1), e[3].max(p.1)])
        })
    };
    let [left, right, mut low, mut high] = judged(true).or_else(|| judged(false))?;
    for value in bounds.iter().flat_map(|b| [b.lower, b.upper]).flatten() {
        if value > 0.0 {
            low = low.min(value.log10());
            high = high.max(value.log10());
        }
    }
    let (left, right) = if right > left {
        (left, right)
    } else {
        (left - 0.5, right + 0.5)
    };
    let pad = ((high - low) * 0.05).max(0.1);
    // Sixteen decades are more than any bench spans.
    let low = low.max(high - 16.0) - pad;
    let axis = |low: f64, high: f64, from: f64, to: f64| Axis {
        kind: Kind::Log,
        low: 10f64.powf(low),
        high: 10f64.powf(high),
        from,
        to,
    };
    let x = axis(left, right, area.left, area.right);
    let y = axis(low, high + pad, area.bottom, area.top);
    Some(Frame::new(area, x, y))
}

/// Quiet curves first, then the ones that are not conforming on top, with their names. Answers the
/// parts of which nothing lies within the axes.
fn traces<'c>(
    page: &mut Canvas,
    frame: &Frame,
    curves: &'c [Curve],
    logs: &[Vec<Point>],
) -> Vec<&'c str> {
    let mut unseen = Vec::new();
    let order = [
        (PartVerdict::Conforming, Pen::solid(0.5, CONFORMING)),
        (
            PartVerdict::Unmeasured,
            Pen::dotted(0.6, part_ink(PartVerdict::Unmeasured)),
        ),
        (
            PartVerdict::Undecided,
            Pen::dashed(0.8, part_ink(PartVerdict::Undecided)),
        ),
        (
            PartVerdict::Nonconforming,
            Pen::solid(0.9, part_ink(PartVerdict::Nonconforming)),
        ),
    ];
    let thinned: Vec<Vec<Vec<Point>>> = logs
        .par_iter()
        .map(|log| {
            let placed: Vec<Point> = log.iter().map(|p| frame.place(*p)).collect();
            let lines = clip(&placed, frame.area);
            lines.iter().map(|l| simplify(&columns(l))).collect()
        })
        .collect();
    let mut names = Vec::new();
    for (verdict, pen) in order {
        let mut coverage = Coverage::new(frame.area);
        let of_kind = curves.iter().zip(&thinned);
        for (curve, lines) in of_kind.filter(|(c, _)| c.verdict == verdict) {
            for line in lines {
                // A dash pattern starts anew with every stretch: patterned curves stay whole.
                let parts = if pen.dash == Dash::Solid {
                    coverage.visible(line)
                } else {
                    vec![line.clone()]
                };
                page.lines(parts, pen);
            }
            match lines.iter().rev().find_map(|line| line.last()) {
                None => unseen.push(curve.part.as_str()),
                Some(end) if verdict != PartVerdict::Conforming => names.push((curve, *end)),
                Some(_) => {}
            }
        }
    }
    label(page, frame, names);
    unseen
}

/// Numbers of the parts that are not conforming, right of the plot, led to the ends of their curves.
fn label(page: &mut Canvas, frame: &Frame, names: Vec<(&Curve, Point)>) {
    let more = names.len().saturating_sub(NAMED);
    // The gravest last in drawing order are named first.
    let mut chosen: Vec<(&Curve, Point)> = names.into_iter().rev().take(NAMED).collect();
    chosen.sort_by(|a, b| a.1.1.total_cmp(&b.1.1));
    let ends: Vec<f64> = chosen.iter().map(|(_, end)| end.1).collect();
    let places = apart(&ends, 9.0, (frame.area.top, frame.area.bottom));
    for ((curve, end), y) in chosen.iter().zip(places) {
        let style = Style::regular(7.6).ink(part_ink(curve.verdict));
        let x = frame.area.right + 12.0;
        page.line(*end, (x - 2.0, y), Pen::solid(0.35, QUIET));
        if let Some(mark) = part_mark(curve.verdict) {
            page.mark(mark, (x + 2.5, y), 5.0);
        }
        let text = crate::certificate::text::elide(&curve.part, style, GUTTER - 20.0);
        let wide = page.text((x + 7.0, y + 2.5), style, &text);
        let target = Area {
            left: x,
            right: x + 7.0 + wide,
            top: y - 4.5,
            bottom: y + 4.5,
        };
        page.link(target, &part_anchor(&curve.part));
    }
    if more > 0 {
        let style = Style::regular(7.6).ink(QUIET);
        let text = format!("and {more} more");
        page.text_at(
            (frame.area.right + GUTTER, frame.area.bottom + 10.0),
            Anchor::End,
            style,
            &text,
        );
    }
}

/// Places as near as can be (least squares) to the ascending ones wanted, at least a step from one
/// another, within the ends where they all fit between.
fn apart(wanted: &[f64], step: f64, (low, high): (f64, f64)) -> Vec<f64> {
    // Less the steps before each, they only must not descend: neighbours that do are pooled
    // (Ayer and others 1955).
    let mut pools: Vec<(f64, usize)> = Vec::new();
    for (index, place) in wanted.iter().enumerate() {
        let mut pool = (place - index as f64 * step, 1);
        while let Some((sum, count)) = pools.pop() {
            if sum / count as f64 <= pool.0 / pool.1 as f64 {
                pools.push((sum, count));
                break;
            }
            pool = (pool.0 + sum, pool.1 + count);
        }
        pools.push(pool);
    }
    let level = pools
        .iter()
        .flat_map(|(sum, count)| std::iter::repeat_n(sum / *count as f64, *count));
    let last = wanted.len().saturating_sub(1) as f64 * step;
    let most = (high - last).max(low);
    level
        .enumerate()
        .map(|(index, v)| v.clamp(low, most) + index as f64 * step)
        .collect()
}

/// Between which frequencies the readings of a characteristic were found, where they have one.
fn where_found(record: &LotRecord, bound: &BoundSection) -> Option<(f64, f64)> {
    let found = record
        .parts
        .iter()
        .filter_map(|p| p.readings.get(&bound.key)?.frequency)
        .filter(|f| *f > 0.0);
    extent(found)
}

/// A limit on the level of the curve: at a frequency, over a band, or anywhere.
fn level(
    page: &mut Canvas,
    frame: &Frame,
    bound: &BoundSection,
    found: Option<(f64, f64)>,
) -> Vec<String> {
    let x = |f: f64| frame.x.at(f).clamp(frame.area.left, frame.area.right);
    let (from, to) = match (bound.between, bound.at, found) {
        (Some([low, high]), _, _) => (x(low), x(high)),
        (None, Some(at), _) => (
            (x(at) - 9.0).max(frame.area.left),
            (x(at) + 9.0).min(frame.area.right),
        ),
        (None, None, Some((low, high))) => (x(low / 2.0), x(high * 2.0)),
        (None, None, None) => (frame.area.left, frame.area.right),
    };
    let mut words = Vec::new();
    for (value, side, sign) in [
        (bound.lower, Side::Below, "≥"),
        (bound.upper, Side::Above, "≤"),
    ] {
        let Some(value) = value.filter(|v| frame.y.contains(*v)) else {
            continue;
        };
        let y = frame.y.at(value);
        limit(page, (from, y), (to, y), side);
        words.push(format!(
            "{} {sign} {}",
            bound.name,
            short(value, &bound.unit)
        ));
    }
    words
}

/// A limit on the self-resonance: hatched lines at the foot of the plot.
fn resonance(page: &mut Canvas, frame: &Frame, bound: &BoundSection) -> Vec<String> {
    let mut words = Vec::new();
    for (value, side, sign) in [
        (bound.lower, Side::Left, "≥"),
        (bound.upper, Side::Right, "≤"),
    ] {
        let Some(value) = value.filter(|v| frame.x.contains(*v)) else {
            continue;
        };
        let x = frame.x.at(value);
        limit(
            page,
            (x, frame.area.bottom),
            (x, frame.area.bottom - 34.0),
            side,
        );
        words.push(format!(
            "{} {sign} {}",
            bound.name,
            short(value, &bound.unit)
        ));
    }
    words
}

/// What the strokes mean that there are.
fn key(flow: &mut Flow, record: &LotRecord, curves: &[Curve]) {
    let area = flow.take(14.0);
    let before = flow.enter(Role::Paragraph);
    let y = area.top + 7.0;
    let stroke = |verdict| match verdict {
        PartVerdict::Conforming => Pen::solid(1.0, CONFORMING),
        PartVerdict::Nonconforming => Pen::solid(1.0, part_ink(verdict)),
        PartVerdict::Undecided => Pen::dashed(1.0, part_ink(verdict)),
        PartVerdict::Unmeasured => Pen::dotted(1.0, part_ink(verdict)),
    };
    let mut entries: Vec<(Pen, String)> = counts(curves)
        .into_iter()
        .map(|(kind, words)| (stroke(kind), words))
        .collect();
    if let Some(circuit) = record.circuit.as_ref().filter(|c| c.described) {
        let words = format!("equivalent circuit of part {}", circuit.part);
        entries.push((Pen::dashed(0.7, TEXT), words));
    }
    let mut x = area.left;
    for (pen, words) in entries {
        let wide = 24.0 + width(&words, SMALL);
        // A very long part number stands below the plots.
        if x + wide > area.right {
            break;
        }
        flow.page().line((x, y), (x + 20.0, y), pen);
        flow.page()
            .text((x + 24.0, y + 3.0), SMALL.ink(TEXT), &words);
        x += wide + 16.0;
    }
    flow.leave(before);
}

/// How many curves of each kind there are, in words; kinds without any are left out.
fn counts(curves: &[Curve]) -> Vec<(PartVerdict, String)> {
    let kinds = [
        PartVerdict::Conforming,
        PartVerdict::Nonconforming,
        PartVerdict::Undecided,
        PartVerdict::Unmeasured,
    ];
    kinds
        .into_iter()
        .map(|kind| (kind, curves.iter().filter(|c| c.verdict == kind).count()))
        .filter(|(_, count)| *count > 0)
        .map(|(kind, count)| (kind, format!("{count} {}", part_word(kind))))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn labels_of_one_place_stand_around_it() {
        let places = apart(&[50.0, 50.0, 50.0], 9.0, (0.0, 100.0));
        assert_eq!(places, [41.0, 50.0, 59.0]);
        assert_eq!(apart(&[99.0, 99.5], 9.0, (0.0, 100.0)), [91.0, 100.0]);
        assert_eq!(apart(&[10.0, 40.0], 9.0, (0.0, 100.0)), [10.0, 40.0]);
    }

    proptest! {
        #[test]
        fn labels_keep_apart_and_within(mut wanted in prop::collection::vec(0.0f64..200.0, 0..14)) {
            wanted.sort_by(f64::total_cmp);
            let places = apart(&wanted, 9.0, (0.0, 200.0));
            prop_assert_eq!(places.len(), wanted.len());
            for pair in places.windows(2) {
                prop_assert!(pair[1] - pair[0] > 9.0 - 1e-9);
            }
            for place in places {
                prop_assert!((-1e-9..=200.0 + 1e-9).contains(&place));
            }
        }
    }
}
