//! Pages of placed items to a PDF object tree. Each page is written for itself, so that the number of
//! cores does not show.

use super::content::{Content, hundredths};
use crate::certificate::canvas::{Canvas, Dash, Item, Pen, Point};
use crate::certificate::flow::Flow;
use crate::certificate::ink::Ink;
use crate::certificate::structure::Structure;
use crate::certificate::text::Style;
use crate::certificate::typeface::{Weight, face};
use printpdf as pdf;
use rayon::prelude::*;
use std::collections::BTreeSet;

/// The resource names of the two weights; fixed, so that the same record gives the same bytes.
fn font_name(weight: Weight) -> &'static str {
    match weight {
        Weight::Regular => "FR",
        Weight::Bold => "FB",
    }
}

fn font_id(weight: Weight) -> pdf::FontId {
    pdf::FontId(font_name(weight).to_owned())
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
    let mut document = skeleton(flow)?;
    let ids: Vec<lopdf::ObjectId> = document.page_iter().collect();
    let pages: Vec<(Vec<u8>, Vec<usize>)> = flow
        .pages
        .par_iter()
        .map(|page| Writer::new(flow.sheet.height, &flow.structure).page(page))
        .collect();
    let mut marked = Vec::with_capacity(pages.len());
    for (id, (content, runs)) in ids.into_iter().zip(pages) {
        let contents = document.get_dictionary(id).ok()?.get(b"Contents").ok()?;
        let contents = contents.as_reference().ok()?;
        let stream = lopdf::Stream::new(lopdf::Dictionary::new(), content);
        document.set_object(contents, stream);
        marked.push(runs);
    }
    Some(Written { document, marked })
}

/// The fonts with what is used of them, and pages without content: the first only names the
/// characters of the document.
fn skeleton(flow: &Flow) -> Option<lopdf::Document> {
    let mut document = pdf::PdfDocument::new("");
    let mut ops = vec![pdf::Op::StartTextSection];
    for weight in [Weight::Regular, Weight::Bold] {
        let font = pdf::PdfFont::new(face(weight)?.font.clone());
        document.resources.fonts.map.insert(font_id(weight), font);
        let text = used(flow, weight);
        if text.is_empty() {
            continue;
        }
        ops.push(pdf::Op::SetFont {
            font: pdf::PdfFontHandle::External(font_id(weight)),
            size: pdf::Pt(1.0),
        });
        ops.push(pdf::Op::ShowText {
            items: vec![pdf::TextItem::Text(text)],
        });
    }
    ops.push(pdf::Op::EndTextSection);
    let length = |value: f64| pdf::Pt(hundredths(value) as f32 / 100.0);
    let (width, height) = (length(flow.sheet.width), length(flow.sheet.height));
    for _ in &flow.pages {
        let ops = std::mem::take(&mut ops);
        let page = pdf::PdfPage::new(width.into(), height.into(), ops);
        document.pages.push(page);
    }
    let options = pdf::PdfSaveOptions::default();
    Some(document.to_lopdf_document(&options, &mut Vec::new()))
}

/// Every character that is set in a weight, the last of the code first: of two with one glyph, the
/// one named last is what is copied from the document, and that is the commoner one.
fn used(flow: &Flow, weight: Weight) -> String {
    let mut used = BTreeSet::new();
    let mut ascii = [false; 128];
    for item in flow.pages.iter().flat_map(|page| &page.items) {
        let Item::Text { style, text, .. } = item else {
            continue;
        };
        if style.weight != weight {
            continue;
        }
        for c in text.chars() {
            match ascii.get_mut(c as usize) {
                Some(seen) => *seen = true,
                None => {
                    used.insert(c);
                }
            }
        }
    }
    let seen = (0u8..128).filter(|c| ascii[usize::from(*c)]);
    used.extend(seen.map(char::from));
    if !used.is_empty() {
        // Stands between lines though no item has it.
        used.insert(' ');
    }
    used.into_iter().rev().collect()
}

/// Graphics state as last set, to leave out what would not change.
struct Writer<'s> {
    /// Hundredths of a point.
    height: i64,
    structure: &'s Structure,
    /// What the next item belongs to.
    run: Option<usize>,
    /// What the open marked content belongs to; the outer `None` where none is open.
    open: Option<Option<usize>>,
    marked: Vec<usize>,
    content: Content,
    fill: Option<Ink>,
    stroke: Option<Pen>,
    font: Option<(Weight, f64)>,
    /// Where the last line of the open text object began.
    line: Option<(i64, i64)>,
}

impl<'s> Writer<'s> {
    fn new(height: f64, structure: &'s Structure) -> Self {
        Writer {
            height: hundredths(height),
            structure,
            run: None,
            open: None,
            marked: Vec::new(),
            content: Content::default(),
            fill: None,
            stroke: None,
            font: None,
            line: None,
        }
    }

    fn page(mut self, canvas: &Canvas) -> (Vec<u8>, Vec<usize>) {
        // Round joins.
        self.content.integer(1).operator("j");
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
                Item::Fill { points, ink } => self.polygon(points, *ink),
                Item::Disc {
                    centre,
                    radius,
                    ink,
                } => self.disc(*centre, *radius, *ink),
                Item::Link { .. } | Item::Run(_) => {}
            }
        }
        self.close();
        (self.content.bytes, self.marked)
    }

    /// Opens the marked content that the next item belongs to.
    fn mark(&mut self) {
        if self.open == Some(self.run) {
            return;
        }
        self.close();
        match self.run {
            None => self.content.name("Artifact").operator("BMC"),
            Some(run) => {
                let number = self.marked.len();
                self.marked.push(run);
                self.content.name(self.structure.name(run));
                self.content.raw("<</MCID").integer(number);
                self.content.raw(">>").operator("BDC");
            }
        }
        self.open = Some(self.run);
    }

    fn close(&mut self) {
        self.end_text();
        if self.open.take().is_some() {
            self.content.operator("EMC");
        }
    }

    /// A point as the page counts: from the bottom left corner, in hundredths.
    fn point(&self, (x, y): Point) -> (i64, i64) {
        (hundredths(x), self.height - hundredths(y))
    }

    fn end_text(&mut self) {
        if self.line.take().is_some() {
            self.content.operator("ET");
        }
    }

    fn set_fill(&mut self, ink: Ink) {
        if self.fill != Some(ink) {
            self.colour(ink, "rg");
            self.fill = Some(ink);
        }
    }

    fn colour(&mut self, Ink(red, green, blue): Ink, operator: &str) {
        let content = self.content.share(red).share(green).share(blue);
        content.operator(operator);
    }

    fn text(&mut self, at: Point, style: Style, text: &str, goes_on: bool) {
        if self.line.is_none() {
            self.content.operator("BT");
        }
        let (from_x, from_y) = self.line.unwrap_or((0, 0));
        self.set_fill(style.ink);
        if self.font != Some((style.weight, style.size)) {
            let size = hundredths(style.size);
            self.content.name(font_name(style.weight));
            self.content.number(size).operator("Tf");
            self.font = Some((style.weight, style.size));
        }
        let (x, y) = self.point(at);
        let content = self.content.number(x - from_x).number(y - from_y);
        content.operator("Td");
        self.line = Some((x, y));
        let face = face(style.weight);
        let glyph = |c: char| face.map_or(0, |f| f.glyph(c));
        let space = goes_on.then_some(' ');
        self.content.glyphs(text.chars().chain(space).map(glyph));
        self.content.operator("Tj");
    }

    fn lines(&mut self, lines: &[Vec<Point>], pen: Pen) {
        self.end_text();
        self.set_stroke(pen);
        for line in lines.iter().filter(|l| l.len() > 1) {
            let closed = line.len() > 3 && line.first() == line.last();
            let kept = if closed { line.len() - 1 } else { line.len() };
            let mut before = None;
            for point in line.iter().take(kept) {
                let (x, y) = self.point(*point);
                let operator = match before {
                    None => "m",
                    // Not to be seen.
                    Some(at) if at == (x, y) && kept > 2 => continue,
                    Some(_) => "l",
                };
                self.content.number(x).number(y).operator(operator);
                before = Some((x, y));
            }
            if closed {
                self.content.operator("h");
            }
            self.content.operator("S");
        }
    }

    fn set_stroke(&mut self, pen: Pen) {
        if self.stroke == Some(pen) {
            return;
        }
        let before = self.stroke;
        if before.is_none_or(|p| p.ink != pen.ink) {
            self.colour(pen.ink, "RG");
        }
        if before.is_none_or(|p| p.width != pen.width) {
            self.content.number(hundredths(pen.width)).operator("w");
        }
        if before.map_or(Dash::Solid, |p| p.dash) != pen.dash {
            let pattern = match pen.dash {
                Dash::Solid => "[] 0",
                Dash::Dashed => "[4 2] 0",
                Dash::Dotted => "[1 1.6] 0",
            };
            self.content.raw(pattern).operator("d");
        }
        self.stroke = Some(pen);
    }

    /// A filled shape from a point on.
    fn shape(&mut self, start: Point, ink: Ink) {
        self.end_text();
        self.set_fill(ink);
        let (x, y) = self.point(start);
        self.content.number(x).number(y).operator("m");
    }

    fn polygon(&mut self, points: &[Point], ink: Ink) {
        let Some((first, rest)) = points.split_first() else {
            return;
        };
        self.shape(*first, ink);
        for point in rest {
            let (x, y) = self.point(*point);
            self.content.number(x).number(y).operator("l");
        }
        self.content.operator("f");
    }

    fn disc(&mut self, centre: Point, radius: f64, ink: Ink) {
        self.shape((centre.0 + radius, centre.1), ink);
        for points in circle(centre, radius) {
            for point in points {
                let (x, y) = self.point(point);
                self.content.number(x).number(y);
            }
            self.content.operator("c");
        }
        self.content.operator("f");
    }
}

/// A circle as four cubic curves from its rightmost point on; control points at 0.5523 of the radius.
fn circle((x, y): Point, r: f64) -> [[Point; 3]; 4] {
    let k = 0.5523 * r;
    [
        [(x + r, y + k), (x + k, y + r), (x, y + r)],
        [(x - k, y + r), (x - r, y + k), (x - r, y)],
        [(x - r, y - k), (x - k, y - r), (x, y - r)],
        [(x + k, y - r), (x + r, y - k), (x + r, y)],
    ]
}
