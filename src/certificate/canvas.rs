//! Placed items of one page, in points from the top left corner. Knows nothing of the file format.

use super::ink::{Ink, PAPER, QUIET, RULE};
use super::text::{Piece, Style, pieces, tag, tag_pad, tag_style, tag_width, width};
use super::typeface::{ASCENT, CAP_HEIGHT, DESCENT};
use std::collections::BTreeSet;

/// A point: right and down are positive.
pub(super) type Point = (f64, f64);

/// A rectangle by its edges.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Area {
    pub left: f64,
    pub top: f64,
    pub right: f64,
    pub bottom: f64,
}

impl Area {
    pub fn width(&self) -> f64 {
        self.right - self.left
    }

    pub fn height(&self) -> f64 {
        self.bottom - self.top
    }
}

/// A pen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Pen {
    /// Points.
    pub width: f64,
    pub ink: Ink,
    pub dash: Dash,
}

/// Stroke pattern.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Dash {
    Solid,
    Dashed,
    Dotted,
}

impl Pen {
    pub const fn solid(width: f64, ink: Ink) -> Self {
        Pen {
            width,
            ink,
            dash: Dash::Solid,
        }
    }

    pub const fn dashed(width: f64, ink: Ink) -> Self {
        Pen {
            width,
            ink,
            dash: Dash::Dashed,
        }
    }

    pub const fn dotted(width: f64, ink: Ink) -> Self {
        Pen {
            width,
            ink,
            dash: Dash::Dotted,
        }
    }
}

/// Something placed on a page.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Item {
    /// `at` is the left end of the baseline.
    Text {
        at: Point,
        style: Style,
        text: String,
    },
    /// Open polylines with one pen.
    Lines { lines: Vec<Vec<Point>>, pen: Pen },
    /// A filled polygon.
    Fill { points: Vec<Point>, ink: Ink },
    /// A filled circle.
    Disc {
        centre: Point,
        radius: f64,
        ink: Ink,
    },
    /// A place to click that leads to an anchor.
    Link { area: Area, to: String },
    /// What follows belongs to this run of the document's structure; to none, if it is furniture.
    Run(Option<usize>),
}

/// Where text stands relative to its `x`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Anchor {
    Middle,
    End,
}

/// One page.
#[derive(Debug, Default)]
pub(super) struct Canvas {
    pub items: Vec<Item>,
    /// Characters that had no glyph.
    pub missing: BTreeSet<char>,
}

impl Canvas {
    /// Places one line of text on a baseline; answers its width.
    pub fn text(&mut self, (x, y): Point, style: Style, text: &str) -> f64 {
        let mut pen = x;
        // A no-break space has done its work by now; plain spaces are found and copied better.
        let text = text.replace('\u{a0}', " ");
        for piece in pieces(&text, style.weight) {
            match piece {
                Piece::Run(run) => {
                    let wide = width(&run, style);
                    if run.chars().any(|c| c != ' ') {
                        self.items.push(Item::Text {
                            at: (pen, y),
                            style,
                            text: run,
                        });
                    }
                    pen += wide;
                }
                Piece::Missing(c) => {
                    self.missing_glyph((pen, y), style, c);
                    pen += tag_width(c, style);
                }
            }
        }
        pen - x
    }

    /// The small box that stands for a character without a glyph.
    fn missing_glyph(&mut self, (x, y): Point, style: Style, c: char) {
        let pad = tag_pad(style);
        let wide = tag_width(c, style);
        let inner = tag_style(style);
        self.missing.insert(c);
        self.frame(
            Area {
                left: x + pad * 0.5,
                right: x + wide - pad * 0.5,
                top: y - inner.size * CAP_HEIGHT - pad * 1.3,
                bottom: y + pad * 0.6,
            },
            Pen::solid(0.4, QUIET),
        );
        self.items.push(Item::Text {
            at: (x + 2.0 * pad, y - pad * 0.35),
            style: inner,
            text: tag(c),
        });
    }

    /// Places one line of text around, before or after `x`.
    pub fn text_at(&mut self, (x, y): Point, anchor: Anchor, style: Style, text: &str) {
        let start = match anchor {
            Anchor::Middle => x - width(text, style) / 2.0,
            Anchor::End => x - width(text, style),
        };
        self.text((start, y), style, text);
    }

    pub fn line(&mut self, from: Point, to: Point, pen: Pen) {
        self.lines(vec![vec![from, to]], pen);
    }

    pub fn lines(&mut self, lines: Vec<Vec<Point>>, pen: Pen) {
        if !lines.is_empty() {
            self.items.push(Item::Lines { lines, pen });
        }
    }

    /// A horizontal hairline.
    pub fn rule(&mut self, left: f64, right: f64, y: f64) {
        self.line((left, y), (right, y), Pen::solid(0.5, RULE));
    }

    pub fn fill(&mut self, points: Vec<Point>, ink: Ink) {
        self.items.push(Item::Fill { points, ink });
    }

    pub fn fill_area(&mut self, a: Area, ink: Ink) {
        self.fill(
            vec![
                (a.left, a.top),
                (a.right, a.top),
                (a.right, a.bottom),
                (a.left, a.bottom),
            ],
            ink,
        );
    }

    pub fn frame(&mut self, a: Area, pen: Pen) {
        self.lines(
            vec![vec![
                (a.left, a.top),
                (a.right, a.top),
                (a.right, a.bottom),
                (a.left, a.bottom),
                (a.left, a.top),
            ]],
            pen,
        );
    }

    pub fn disc(&mut self, centre: Point, radius: f64, ink: Ink) {
        self.items.push(Item::Disc {
            centre,
            radius,
            ink,
        });
    }

    /// An open circle.
    pub fn ring(&mut self, (x, y): Point, radius: f64, pen: Pen) {
        const CORNERS: u32 = 24;
        let corner = |k: u32| {
            let angle = std::f64::consts::TAU * f64::from(k) / f64::from(CORNERS);
            (x + radius * angle.cos(), y + radius * angle.sin())
        };
        // Closed by its first corner.
        let outline = (0..CORNERS).chain([0]).map(corner).collect();
        self.lines(vec![outline], pen);
    }

    pub fn link(&mut self, area: Area, to: &str) {
        self.items.push(Item::Link {
            area,
            to: to.to_owned(),
        });
    }

    /// A verdict's mark: a shape for each, so that it needs no colour.
    pub fn mark(&mut self, mark: Mark, (x, y): Point, size: f64) {
        let r = size / 2.0;
        let ink = mark.ink();
        let pen = Pen::solid(size * 0.11, PAPER);
        match mark {
            Mark::Good => {
                self.disc((x, y), r, ink);
                let tick = vec![
                    (x - 0.45 * r, y + 0.02 * r),
                    (x - 0.12 * r, y + 0.36 * r),
                    (x + 0.46 * r, y - 0.34 * r),
                ];
                self.lines(vec![tick], pen);
            }
            Mark::Bad => {
                self.fill_area(square(x, y, 0.9 * r), ink);
                let k = 0.42 * r;
                self.lines(
                    vec![
                        vec![(x - k, y - k), (x + k, y + k)],
                        vec![(x - k, y + k), (x + k, y - k)],
                    ],
                    pen,
                );
            }
            Mark::Doubt => {
                let diamond = vec![(x, y - r), (x + r, y), (x, y + r), (x - r, y)];
                self.fill(diamond, ink);
                let (k, h) = (0.17 * r, 0.36 * r);
                self.lines(
                    vec![
                        vec![(x - k, y - h), (x - k, y + h)],
                        vec![(x + k, y - h), (x + k, y + h)],
                    ],
                    pen,
                );
            }
            Mark::None => {
                self.frame(square(x, y, 0.8 * r), Pen::solid(size * 0.1, ink));
                self.line(
                    (x - 0.4 * r, y),
                    (x + 0.4 * r, y),
                    Pen::solid(size * 0.1, ink),
                );
            }
        }
    }
}

fn square(x: f64, y: f64, r: f64) -> Area {
    Area {
        left: x - r,
        right: x + r,
        top: y - r,
        bottom: y + r,
    }
}

/// The shapes of verdicts.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Mark {
    /// Disc with a tick.
    Good,
    /// Square with a cross.
    Bad,
    /// Diamond with two bars.
    Doubt,
    /// Open square with a dash.
    None,
}

impl Mark {
    pub fn ink(self) -> Ink {
        match self {
            Mark::Good => super::ink::ACCEPT,
            Mark::Bad => super::ink::NONCONFORMING,
            Mark::Doubt => super::ink::UNDECIDED,
            Mark::None => super::ink::UNMEASURED,
        }
    }
}

/// The box of a placed text; `None` for other items.
pub(super) fn text_area(item: &Item) -> Option<Area> {
    let Item::Text { at, style, text } = item else {
        return None;
    };
    Some(Area {
        left: at.0,
        right: at.0 + width(text, *style),
        top: at.1 - style.size * ASCENT,
        bottom: at.1 + style.size * DESCENT,
    })
}
