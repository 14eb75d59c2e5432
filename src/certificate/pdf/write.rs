//! Pages of placed items to a PDF object tree.

use crate::certificate::canvas::{Canvas, Dash, Item, Pen, Point};
use crate::certificate::flow::Flow;
use crate::certificate::ink::Ink;
use crate::certificate::structure::Structure;
use crate::certificate::text::Style;
use crate::certificate::typeface::{Weight, face};
use printpdf as pdf;

/// The resource names of the two weights; fixed, so that the same record gives the same bytes.
fn font_id(weight: Weight) -> pdf::FontId {
    pdf::FontId(
        match weight {
            Weight::Regular => "FR",
            Weight::Bold => "FB",
        }
        .to_owned(),
    )
}

/// Pages as a PDF object tree.
pub(in crate::certificate) struct Written {
    pub document: lopdf::Document,
    /// The runs of each page that something was placed in, in the order of their numbers in its
    /// content (marked-content identifiers).
    pub marked: Vec<Vec<usize>>,
}

/// The document of the pages; `None` only if the embedded typeface is unreadable.
pub(in crate::certificate) fn write(flow: &Flow) -> Option<Written> {
    let sheet = &flow.sheet;
    let mut document = pdf::PdfDocument::new("");
    for weight in [Weight::Regular, Weight::Bold] {
        let font = pdf::PdfFont::new(face(weight)?.font.clone());
        document.resources.fonts.map.insert(font_id(weight), font);
    }
    let (width, height) = (pt(sheet.width), pt(sheet.height));
    let mut marked = Vec::new();
    for page in &flow.pages {
        let (ops, runs) = Writer::new(sheet.height, &flow.structure).page(page);
        let page = pdf::PdfPage::new(width.into(), height.into(), ops);
        document.pages.push(page);
        marked.push(runs);
    }
    let options = pdf::PdfSaveOptions::default();
    let document = document.to_lopdf_document(&options, &mut Vec::new());
    Some(Written { document, marked })
}

/// To a hundredth of a point: finer than any printer, and short in the file. What is not a number
/// or off any page must never be in a content stream.
fn pt(value: f64) -> pdf::Pt {
    let safe = if value.is_finite() {
        value.clamp(-5000.0, 5000.0)
    } else {
        0.0
    };
    pdf::Pt(((safe * 100.0).round() / 100.0) as f32)
}

/// Graphics state as last set, to leave out what would not change.
struct Writer<'s> {
    height: f64,
    structure: &'s Structure,
    /// What the next item belongs to.
    run: Option<usize>,
    /// What the open marked content belongs to; the outer `None` where none is open.
    open: Option<Option<usize>>,
    marked: Vec<usize>,
    ops: Vec<pdf::Op>,
    fill: Option<Ink>,
    stroke: Option<Pen>,
    font: Option<(Weight, f64)>,
    in_text: bool,
}

impl<'s> Writer<'s> {
    fn new(height: f64, structure: &'s Structure) -> Self {
        Writer {
            height,
            structure,
            run: None,
            open: None,
            marked: Vec::new(),
            ops: Vec::new(),
            fill: None,
            stroke: None,
            font: None,
            in_text: false,
        }
    }

    fn page(mut self, canvas: &Canvas) -> (Vec<pdf::Op>, Vec<usize>) {
        self.ops.push(pdf::Op::SetLineJoinStyle {
            join: pdf::LineJoinStyle::Round,
        });
        self.ops.push(pdf::Op::SetLineCapStyle {
            cap: pdf::LineCapStyle::Butt,
        });
        let mut items = canvas.items.iter().peekable();
        while let Some(item) = items.next() {
            match item {
                Item::Run(run) => {
                    self.run = *run;
                    continue;
                }
                Item::Link { .. } => continue,
                _ => self.mark(),
            }
            match item {
                Item::Text { at, style, text } => {
                    // Words at the end of one line and the beginning of the next are not one word.
                    let goes_on =
                        matches!(items.peek(), Some(Item::Text { at: next, .. }) if next.1 > at.1);
                    self.text(*at, *style, text, goes_on);
                }
                Item::Lines { lines, pen } => self.lines(lines, *pen),
                Item::Fill { points, ink } => {
                    self.polygon(points.iter().map(|p| (*p, false)), *ink)
                }
                Item::Disc {
                    centre,
                    radius,
                    ink,
                } => self.polygon(circle(*centre, *radius), *ink),
                Item::Link { .. } | Item::Run(_) => {}
            }
        }
        self.close();
        (self.ops, self.marked)
    }

    /// Opens the marked content that the next item belongs to.
    fn mark(&mut self) {
        if self.open == Some(self.run) {
            return;
        }
        self.close();
        let op = match self.run {
            None => pdf::Op::BeginMarkedContent {
                tag: "Artifact".to_owned(),
            },
            Some(run) => {
                let number = i64::try_from(self.marked.len()).unwrap_or(i64::MAX);
                self.marked.push(run);
                let map = [("MCID".to_owned(), pdf::DictItem::Int(number))];
                pdf::Op::BeginMarkedContentWithProperties {
                    tag: self.structure.name(run).to_owned(),
                    properties: pdf::DictItem::Dict { map: map.into() },
                }
            }
        };
        self.ops.push(op);
        self.open = Some(self.run);
    }

    fn close(&mut self) {
        self.end_text();
        if self.open.take().is_some() {
            self.ops.push(pdf::Op::EndMarkedContent);
        }
    }

    fn point(&self, (x, y): Point) -> pdf::Point {
        pdf::Point {
            x: pt(x),
            y: pt(self.height - y),
        }
    }

    fn end_text(&mut self) {
        if self.in_text {
            self.ops.push(pdf::Op::EndTextSection);
            self.in_text = false;
        }
    }

    fn set_fill(&mut self, ink: Ink) {
        if self.fill != Some(ink) {
            self.ops.push(pdf::Op::SetFillColor { col: colour(ink) });
            self.fill = Some(ink);
        }
    }

    fn text(&mut self, at: Point, style: Style, text: &str, goes_on: bool) {
        if !self.in_text {
            self.ops.push(pdf::Op::StartTextSection);
            self.in_text = true;
        }
        self.set_fill(style.ink);
        if self.font != Some((style.weight, style.size)) {
            self.ops.push(pdf::Op::SetFont {
                font: pdf::PdfFontHandle::External(font_id(style.weight)),
                size: pt(style.size),
            });
            self.font = Some((style.weight, style.size));
        }
        let p = self.point(at);
        self.ops.push(pdf::Op::SetTextMatrix {
            matrix: pdf::TextMatrix::Translate(p.x, p.y),
        });
        let mut text = text.to_owned();
        if goes_on {
            text.push(' ');
        }
        self.ops.push(pdf::Op::ShowText {
            items: vec![pdf::TextItem::Text(text)],
        });
    }

    fn lines(&mut self, lines: &[Vec<Point>], pen: Pen) {
        self.end_text();
        self.set_stroke(pen);
        for line in lines.iter().filter(|l| l.len() > 1) {
            let closed = line.len() > 3 && line.first() == line.last();
            let kept = if closed { line.len() - 1 } else { line.len() };
            let points = line
                .iter()
                .take(kept)
                .map(|p| pdf::LinePoint {
                    p: self.point(*p),
                    bezier: false,
                })
                .collect();
            self.ops.push(pdf::Op::DrawLine {
                line: pdf::Line {
                    points,
                    is_closed: closed,
                },
            });
        }
    }

    fn set_stroke(&mut self, pen: Pen) {
        if self.stroke == Some(pen) {
            return;
        }
        self.ops.push(pdf::Op::SetOutlineColor {
            col: colour(pen.ink),
        });
        self.ops
            .push(pdf::Op::SetOutlineThickness { pt: pt(pen.width) });
        let pattern: &[f32] = match pen.dash {
            Dash::Solid => &[],
            Dash::Dashed => &[4.0, 2.0],
            Dash::Dotted => &[1.0, 1.6],
        };
        if self.stroke.map_or(Dash::Solid, |p| p.dash) != pen.dash {
            self.ops.push(pdf::Op::SetLineDashPattern {
                dash: pdf::LineDashPattern::new(0.0, pattern),
            });
        }
        self.stroke = Some(pen);
    }

    fn polygon(&mut self, points: impl IntoIterator<Item = (Point, bool)>, ink: Ink) {
        self.end_text();
        self.set_fill(ink);
        let points = points
            .into_iter()
            .map(|(p, bezier)| pdf::LinePoint {
                p: self.point(p),
                bezier,
            })
            .collect();
        self.ops.push(pdf::Op::DrawPolygon {
            polygon: pdf::Polygon {
                rings: vec![pdf::PolygonRing { points }],
                mode: pdf::PaintMode::Fill,
                winding_order: pdf::WindingOrder::NonZero,
            },
        });
    }
}

fn colour(ink: Ink) -> pdf::Color {
    let part = |v: f64| ((v.clamp(0.0, 1.0) * 1000.0).round() / 1000.0) as f32;
    pdf::Color::Rgb(pdf::Rgb::new(part(ink.0), part(ink.1), part(ink.2), None))
}

/// A circle as four cubic curves; control points at 0.5523 of the radius.
fn circle((x, y): Point, r: f64) -> Vec<(Point, bool)> {
    let k = 0.5523 * r;
    vec![
        ((x + r, y), false),
        ((x + r, y + k), true),
        ((x + k, y + r), true),
        ((x, y + r), false),
        ((x - k, y + r), true),
        ((x - r, y + k), true),
        ((x - r, y), false),
        ((x - r, y - k), true),
        ((x - k, y - r), true),
        ((x, y - r), false),
        ((x + k, y - r), true),
        ((x + r, y - k), true),
        ((x + r, y), false),
    ]
}
