//! |Z| and ESR of a part against frequency, with the windows of its limits.

use crate::limits::Limits;
use crate::quantity::shortest;
use crate::readings::{Characteristic, Place};
use crate::sweep::Sweep;
use ratatui::Frame;
use ratatui::layout::Rect;
use ratatui::style::{Color, Modifier, Style};
use ratatui::text::Span;
use ratatui::widgets::canvas::{Canvas, Context, Line};
use std::f64::consts::TAU;

/// A limit as a stroke in hertz and ohm.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stroke {
    from: (f64, f64),
    to: (f64, f64),
}

/// The limits that can be shown beside |Z| and ESR. A window at one frequency is a pair of short bars; a capacitance
/// is shown as the reactance that it means.
pub fn strokes(limits: &Limits, (low, high): (f64, f64), (bottom, top): (f64, f64)) -> Vec<Stroke> {
    let mut all = Vec::new();
    // A bar is a third of a decade wide.
    let bar = |f: f64, z: f64| Stroke {
        from: (f / 1.45, z),
        to: (f * 1.45, z),
    };
    for bound in &limits.bounds {
        let ends = [bound.lower, bound.upper].into_iter().flatten();
        match (bound.characteristic, bound.place) {
            (Characteristic::Capacitance, Place::At(f)) => {
                all.extend(ends.map(|c| bar(f, 1.0 / (TAU * f * c))));
            }
            (Characteristic::Impedance | Characteristic::Esr, Place::At(f)) => {
                all.extend(ends.map(|z| bar(f, z)));
            }
            (Characteristic::Impedance | Characteristic::Esr, Place::Between(f, g)) => {
                all.extend(ends.map(|z| Stroke {
                    from: (f, z),
                    to: (g, z),
                }));
            }
            (Characteristic::EsrMinimum, place) => {
                let (f, g) = match place {
                    Place::Between(f, g) => (f, g),
                    _ => (low, high),
                };
                all.extend(ends.map(|z| Stroke {
                    from: (f, z),
                    to: (g, z),
                }));
            }
            (Characteristic::Srf, _) => {
                all.extend(ends.map(|f| Stroke {
                    from: (f, bottom),
                    to: (f, top),
                }));
            }
            _ => {}
        }
    }
    all.retain(|s| s.from.0 >= low / 1.5 && s.to.0 <= high * 1.5);
    all
}

/// Least and greatest of positive values.
fn range(values: impl Iterator<Item = f64>) -> Option<(f64, f64)> {
    values
        .filter(|v| v.is_finite() && *v > 0.0)
        .fold(None, |r, v| {
            Some(r.map_or((v, v), |(a, b): (f64, f64)| (a.min(v), b.max(v))))
        })
}

/// Draws the curve.
pub fn draw(frame: &mut Frame, area: Rect, sweep: &Sweep, limits: &Limits, colour: bool) {
    let magnitudes = || sweep.impedance.iter().map(|z| z.norm());
    let resistances = || sweep.impedance.iter().map(|z| z.re);
    let (Some((f0, f1)), Some((z0, z1))) = (
        range(sweep.frequency.iter().copied()),
        range(magnitudes().chain(resistances().filter(|r| *r > 1e-5))),
    ) else {
        return;
    };
    let strokes = strokes(limits, (f0, f1), (z0, z1));
    let (x0, x1) = (f0.log10(), f1.log10());
    let (y0, y1) = ((z0 / 1.3).log10(), (z1 * 1.3).log10());
    let styled = |c: Color| Style::new().fg(if colour { c } else { Color::Reset });
    let shade = |c: Color| if colour { c } else { Color::Reset };
    let [axis, plot] = ratatui::layout::Layout::horizontal([
        ratatui::layout::Constraint::Length(8),
        ratatui::layout::Constraint::Min(10),
    ])
    .areas(area);
    let plot_height = plot.height.saturating_sub(1);
    let canvas = Canvas::default()
        .x_bounds([x0, x1])
        .y_bounds([y0, y1])
        .marker(ratatui::symbols::Marker::Braille)
        .paint(|context: &mut Context| {
            for s in &strokes {
                let x = |f: f64| f.log10().clamp(x0, x1);
                let line = Line::new(
                    x(s.from.0),
                    s.from.1.log10(),
                    x(s.to.0),
                    s.to.1.log10(),
                    shade(Color::Magenta),
                );
                context.draw(&line);
            }
            context.layer();
            let mut curve = |values: Vec<f64>, colour: Color| {
                let points: Vec<(f64, f64)> = sweep
                    .frequency
                    .iter()
                    .zip(values)
                    .filter(|(_, z)| *z > 1e-5)
                    .map(|(f, z)| (f.log10(), z.log10()))
                    .collect();
                for pair in points.windows(2) {
                    context.draw(&Line::new(
                        pair[0].0, pair[0].1, pair[1].0, pair[1].1, colour,
                    ));
                }
            };
            curve(resistances().collect(), shade(Color::DarkGray));
            curve(magnitudes().collect(), shade(Color::Cyan));
        });
    let upper = Rect {
        height: plot_height,
        ..plot
    };
    frame.render_widget(canvas, upper);
    let foot = Rect {
        y: plot.y + plot_height,
        height: 1.min(plot.height),
        ..plot
    };
    let quiet = styled(Color::DarkGray).add_modifier(if colour {
        Modifier::empty()
    } else {
        Modifier::DIM
    });
    let left = shortest(rounded(f0), "Hz");
    let right = shortest(rounded(f1), "Hz");
    let middle = "|Z| and ESR";
    let gap = usize::from(foot.width).saturating_sub(left.chars().count() + right.chars().count());
    let text = format!("{left}{middle:^gap$}{right}");
    frame.render_widget(Span::styled(text, quiet), foot);
    for (at, z) in [(axis.y, z1), (axis.y + plot_height.saturating_sub(1), z0)] {
        let row = Rect {
            y: at,
            height: 1.min(axis.height),
            ..axis
        };
        let text = format!("{:>7} ", crate::quantity::engineering(z, "Ω", 2));
        frame.render_widget(Span::styled(text, quiet), row);
    }
}

/// Two significant digits, for an axis.
fn rounded(value: f64) -> f64 {
    format!("{value:.1e}").parse().unwrap_or(value)
}
