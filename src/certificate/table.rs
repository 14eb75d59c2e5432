//! Tables: set with rules, figures aligned on the decimal point, heads repeated on every page.

use super::canvas::{Area, Canvas, Mark, Pen};
use super::flow::Flow;
use super::ink::{ACCEPT, Ink, QUIET, TEXT};
use super::structure::{Role, Scope};
use super::text::{Style, width, wrap};
use super::typeface::Weight;

/// How the cells of a column stand.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Align {
    Left,
    Right,
    /// On the decimal point.
    Decimal,
}

/// How wide a column is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Span {
    /// As its widest cell.
    Natural,
    /// Points.
    Fixed(f64),
    /// A share of what is left over.
    Share(f64),
}

/// A column.
#[derive(Debug, Clone)]
pub(super) struct Column {
    pub head: String,
    /// Unit, on a line below the head.
    pub unit: String,
    pub align: Align,
    pub span: Span,
}

impl Column {
    pub fn new(head: &str, align: Align, span: Span) -> Self {
        Column {
            head: head.to_owned(),
            unit: String::new(),
            align,
            span,
        }
    }

    pub fn unit(mut self, unit: &str) -> Self {
        self.unit = unit.to_owned();
        self
    }
}

/// A drawing in a cell.
type Drawing<'a> = Box<dyn Fn(&mut Canvas, Area) + 'a>;

/// A cell.
#[derive(Default)]
pub(super) struct Cell<'a> {
    pub text: String,
    pub bold: bool,
    pub ink: Option<Ink>,
    pub mark: Option<Mark>,
    /// Anchor it leads to.
    pub link: Option<String>,
    pub drawing: Option<Drawing<'a>>,
    /// What a mark or drawing says, where no text beside it does.
    pub spoken: Option<String>,
}

impl<'a> Cell<'a> {
    pub fn text(text: impl Into<String>) -> Self {
        Cell {
            text: text.into(),
            ..Cell::default()
        }
    }

    pub fn bold(mut self) -> Self {
        self.bold = true;
        self
    }

    pub fn ink(mut self, ink: Ink) -> Self {
        self.ink = Some(ink);
        self
    }

    pub fn mark(mut self, mark: Option<Mark>) -> Self {
        self.mark = mark;
        self
    }

    pub fn link(mut self, to: String) -> Self {
        self.link = Some(to);
        self
    }

    /// What the mark says to whoever cannot see it.
    pub fn spoken(mut self, words: &str) -> Self {
        self.spoken = Some(words.to_owned());
        self
    }

    /// A drawing with words for whoever cannot see it.
    pub fn drawing(words: String, draw: impl Fn(&mut Canvas, Area) + 'a) -> Self {
        Cell {
            drawing: Some(Box::new(draw)),
            spoken: Some(words),
            ..Cell::default()
        }
    }

    fn style(&self, size: f64) -> Style {
        Style {
            size,
            weight: if self.bold {
                Weight::Bold
            } else {
                Weight::Regular
            },
            ink: self
                .ink
                .unwrap_or(if self.link.is_some() { ACCEPT } else { TEXT }),
        }
    }
}

/// A row of cells.
#[derive(Default)]
pub(super) struct Row<'a> {
    pub cells: Vec<Cell<'a>>,
    /// Name of this row as a place to link to.
    pub anchor: Option<String>,
}

/// A table.
pub(super) struct Table<'a> {
    pub columns: Vec<Column>,
    pub rows: Vec<Row<'a>>,
    /// Text size; shrinks where the columns would not fit.
    pub size: f64,
    /// Least height of a row, for drawings.
    pub row_height: f64,
    /// A hairline after every so many rows; 0 for none.
    pub rule_every: usize,
}

impl<'a> Table<'a> {
    pub fn new(columns: Vec<Column>) -> Self {
        Table {
            columns,
            rows: Vec::new(),
            size: 9.2,
            row_height: 0.0,
            rule_every: 1,
        }
    }

    pub fn row(&mut self, cells: Vec<Cell<'a>>) {
        self.rows.push(Row {
            cells,
            anchor: None,
        });
    }

    pub fn row_at(&mut self, anchor: String, cells: Vec<Cell<'a>>) {
        self.rows.push(Row {
            cells,
            anchor: Some(anchor),
        });
    }

    /// How high the table is on one page.
    pub fn height(&self, flow: &Flow) -> f64 {
        let grid = Grid::fit(self, flow.left(), flow.sheet.measure());
        let row = |row: &Row| grid.row_height(self.row_height, &grid.lines(row));
        let bare = self.columns.iter().all(|c| c.head.is_empty());
        let head = if bare { 0.0 } else { grid.head_height() };
        head + self.rows.iter().map(row).sum::<f64>()
    }

    /// Pours the table into the flow.
    pub fn set(&self, flow: &mut Flow) {
        let grid = Grid::fit(self, flow.left(), flow.sheet.measure());
        let head = grid.head_height();
        let height = |row: &Row| grid.row_height(self.row_height, &grid.lines(row));
        let first = self.rows.first().map_or(0.0, height);
        flow.need(head + first.min(60.0));
        // The last page of a table has some rows of it.
        let end = self.rows.len().checked_sub(TOGETHER);
        let end = end.filter(|at| *at >= TOGETHER);
        let before = flow.enter(Role::Table);
        grid.head(flow, false);
        for (index, row) in self.rows.iter().enumerate() {
            if Some(index) == end {
                let last: f64 = self.rows.iter().skip(index).map(height).sum();
                if last < FEW && flow.room() < last {
                    grid.turn(flow);
                }
            }
            grid.row(flow, self, row);
            let last = index + 1 == self.rows.len();
            if self.rule_every > 0 && ((index + 1) % self.rule_every == 0 || last) {
                let (l, r, y) = (flow.left(), flow.right(), flow.y);
                flow.page().rule(l, r, y);
            }
        }
        flow.leave(before);
    }
}

const GAP: f64 = 9.0;
/// Rows at the end of a table that stay on one page.
const TOGETHER: usize = 3;
/// Unless they are higher than this.
const FEW: f64 = 130.0;
const MARK: f64 = 0.78;

/// Resolved geometry of a table.
struct Grid<'t> {
    columns: &'t [Column],
    size: f64,
    leading: f64,
    /// Left edge and width of each column.
    edges: Vec<(f64, f64)>,
    /// Width before and after the decimal point.
    halves: Vec<(f64, f64)>,
    /// Room for the marks of each column.
    marks: Vec<f64>,
    /// How far each head is indented: as its words are, where not all of them have a mark.
    indents: Vec<f64>,
}

/// What stands before the decimal point, and the rest.
fn halves(text: &str) -> (&str, &str) {
    let end = text
        .find('.')
        .or_else(|| text.find([' ', 'e']))
        .unwrap_or(text.len());
    text.split_at(end)
}

fn mark_width(cell: &Cell, size: f64) -> f64 {
    if cell.mark.is_some() {
        size * (MARK + 0.35)
    } else {
        0.0
    }
}

/// Where a cell, or the part of it on this page, stands.
struct Spot {
    area: Area,
    /// Not the continuation of a cell from the page before.
    first: bool,
    /// In a row that drawings made taller than its text.
    tall: bool,
}

impl<'t> Grid<'t> {
    fn fit(table: &'t Table, left: f64, measure: f64) -> Grid<'t> {
        let mut size = table.size;
        // Heads of two lines where there is room, of a word a line where there is not.
        let mut lines = 2.0;
        loop {
            let mut grid = Grid {
                columns: &table.columns,
                size,
                leading: size * 1.28,
                edges: Vec::new(),
                halves: Vec::new(),
                marks: Vec::new(),
                indents: Vec::new(),
            };
            let natural = grid.natural(table, measure, lines);
            if grid.place(&natural, left, measure) || size < 5.4 {
                return grid;
            }
            if lines < 3.0 {
                lines = f64::INFINITY;
            } else {
                size *= 0.94;
            }
        }
    }

    /// Widest content of each column, its head on so many lines.
    fn natural(&mut self, table: &Table, measure: f64, head_lines: f64) -> Vec<f64> {
        let head = self.head_style();
        let mut widths = Vec::with_capacity(self.columns.len());
        for (index, column) in self.columns.iter().enumerate() {
            let words = column.head.split(' ').chain([column.unit.as_str()]);
            let mut widest = words.map(|w| width(w, head)).fold(0.0, f64::max);
            // Lines of unequal words are a little longer than their share.
            widest = widest.max(width(&column.head, head) / head_lines * 1.15);
            let cells = || table.rows.iter().filter_map(|r| r.cells.get(index));
            let mark = cells()
                .map(|cell| mark_width(cell, self.size))
                .fold(0.0, f64::max);
            self.marks.push(mark);
            let some = cells().any(|cell| cell.mark.is_none());
            let indent = if some && column.align == Align::Left {
                mark
            } else {
                0.0
            };
            self.indents.push(indent);
            let (mut before, mut after) = (0.0f64, 0.0f64);
            for cell in cells() {
                let style = cell.style(self.size);
                if column.align == Align::Decimal {
                    let (whole, rest) = halves(&cell.text);
                    before = before.max(width(whole, style) + mark);
                    after = after.max(width(rest, style));
                } else {
                    widest = widest.max(width(&cell.text, style) + mark);
                }
            }
            self.halves.push((before, after));
            widest = widest.max(before + after);
            if column.align == Align::Left {
                widest = widest.min(measure * 0.5);
            }
            widths.push(widest.min(measure));
        }
        widths
    }

    /// Gives every column its place; false where the natural widths do not fit.
    fn place(&mut self, natural: &[f64], left: f64, measure: f64) -> bool {
        let gaps = GAP * (self.columns.len().saturating_sub(1)) as f64;
        let mut taken = gaps;
        let mut shares = 0.0;
        for (column, natural) in self.columns.iter().zip(natural) {
            match column.span {
                Span::Natural => taken += natural,
                Span::Fixed(w) => taken += w,
                Span::Share(s) => shares += s,
            }
        }
        let shared = self
            .columns
            .iter()
            .filter(|c| matches!(c.span, Span::Share(_)))
            .count();
        let over = measure - taken;
        let fits = over >= 52.0 * shared as f64;
        // Where even the smallest size does not fit, all columns shrink alike and their cells wrap.
        let squeeze = if fits {
            1.0
        } else {
            (measure - gaps).max(1.0) / (taken - gaps + 52.0 * shared as f64)
        };
        // Without a column that takes what is left over, the gaps do, within reason.
        let spare = if shared == 0 && fits {
            (over / self.columns.len().saturating_sub(1).max(1) as f64).min(26.0)
        } else {
            0.0
        };
        let mut x = left;
        for (column, natural) in self.columns.iter().zip(natural) {
            let w = match column.span {
                Span::Natural => natural * squeeze,
                Span::Fixed(w) => w * squeeze,
                Span::Share(s) if fits => over * s / shares,
                Span::Share(_) => 52.0 * squeeze,
            };
            self.edges.push((x, w));
            x += w + GAP + spare;
        }
        fits
    }

    fn head_style(&self) -> Style {
        Style::regular(self.size * 0.92).ink(QUIET)
    }

    fn head_lines(&self) -> Vec<Vec<String>> {
        let style = self.head_style();
        self.columns
            .iter()
            .zip(&self.edges)
            .zip(&self.indents)
            .map(|((c, (_, w)), indent)| {
                let room = w - indent + 0.01;
                let mut lines = wrap(&c.head, style, room);
                if !c.unit.is_empty() {
                    lines.extend(wrap(&c.unit, style, room));
                }
                lines
            })
            .collect()
    }

    fn head_height(&self) -> f64 {
        let lines = self.head_lines().iter().map(Vec::len).max().unwrap_or(0);
        lines as f64 * self.leading + 5.0
    }

    /// The heads of the columns; those of a further page are furniture.
    fn head(&self, flow: &mut Flow, again: bool) {
        let heads = self.head_lines();
        let most = heads.iter().map(Vec::len).max().unwrap_or(0);
        if self.columns.iter().all(|c| c.head.is_empty()) {
            return;
        }
        let area = flow.take(self.head_height());
        let style = self.head_style();
        let before = if again {
            flow.aside()
        } else {
            flow.enter(Role::Row)
        };
        let places = self.columns.iter().zip(&self.edges).zip(&self.indents);
        for (((column, (x, w)), indent), lines) in places.zip(&heads) {
            let outside = (!again).then(|| flow.enter(Role::Head(Scope::Column)));
            for (n, line) in lines.iter().enumerate() {
                let row = most - lines.len() + n;
                let y = area.top + (row as f64 + 0.78) * self.leading;
                let start = match column.align {
                    Align::Left => x + indent,
                    Align::Right | Align::Decimal => x + w - width(line, style),
                };
                flow.page().text((start, y), style, line);
            }
            if let Some(outside) = outside {
                flow.leave(outside);
            }
        }
        flow.leave(before);
        let y = area.bottom - 1.5;
        flow.page()
            .line((area.left, y), (area.right, y), Pen::solid(0.8, TEXT));
    }

    /// The lines of every cell of a row.
    fn lines(&self, row: &Row) -> Vec<Vec<String>> {
        row.cells
            .iter()
            .zip(&self.edges)
            .zip(&self.marks)
            .map(|((cell, (_, w)), mark)| {
                if cell.text.is_empty() {
                    return Vec::new();
                }
                let room = w - mark + 0.01;
                wrap(&cell.text, cell.style(self.size), room.max(8.0))
            })
            .collect()
    }

    fn row_height(&self, least: f64, lines: &[Vec<String>]) -> f64 {
        let most = lines.iter().map(Vec::len).max().unwrap_or(0).max(1);
        (most as f64 * self.leading + 2.4).max(least)
    }

    /// Goes on on a new page.
    fn turn(&self, flow: &mut Flow) {
        flow.new_page();
        self.head(flow, true);
    }

    fn row(&self, flow: &mut Flow, table: &Table, row: &Row) {
        let mut lines = self.lines(row);
        let whole = flow.sheet.bottom - flow.sheet.top - self.head_height();
        let height = self.row_height(table.row_height, &lines);
        if flow.room() < height.min(whole) {
            self.turn(flow);
        }
        let outside = flow.enter(Role::Row);
        let mut elements: Vec<usize> = Vec::new();
        for index in 0..row.cells.len() {
            elements.push(flow.structure.add(if index == 0 {
                Role::Head(Scope::Row)
            } else {
                Role::Cell
            }));
        }
        if let Some(anchor) = &row.anchor {
            flow.anchor(anchor);
        }
        let mut first = true;
        // A row taller than a page goes on over the next ones.
        loop {
            let fit = (((flow.room() - 2.4) / self.leading).floor() as usize).max(1);
            let rest: Vec<Vec<String>> = lines
                .iter_mut()
                .map(|l| l.split_off(l.len().min(fit)))
                .collect();
            let height = self.row_height(if first { table.row_height } else { 0.0 }, &lines);
            let area = flow.take(height);
            for (index, cell) in row.cells.iter().enumerate() {
                let (Some(text), Some((x, w))) = (lines.get(index), self.edges.get(index)) else {
                    continue;
                };
                let edge = Area {
                    left: *x,
                    right: x + w,
                    ..area
                };
                let spot = Spot {
                    area: edge,
                    first,
                    tall: table.row_height > 0.0,
                };
                let Some(element) = elements.get(index) else {
                    continue;
                };
                let before = flow.resume(*element);
                self.cell(flow, index, cell, text, spot);
                flow.leave(before);
            }
            if rest.iter().all(Vec::is_empty) {
                break;
            }
            lines = rest;
            first = false;
            self.turn(flow);
        }
        flow.leave(outside);
    }

    fn cell(&self, flow: &mut Flow, index: usize, cell: &Cell, lines: &[String], spot: Spot) {
        let Spot { area, first, tall } = spot;
        if let (Some(draw), true) = (&cell.drawing, first) {
            let words = cell.spoken.clone().unwrap_or_default();
            let before = flow.enter(Role::Figure(words));
            draw(flow.page(), area);
            flow.leave(before);
        }
        let style = cell.style(self.size);
        // Text stands in the middle of a row that a drawing made taller.
        let block = lines.len() as f64 * self.leading + 2.4;
        let lead = if tall {
            (area.height() - block).max(0.0) / 2.0
        } else {
            0.0
        };
        let top = area.top + lead + 1.2;
        let mark = self.marks.get(index).copied().unwrap_or(0.0);
        for (n, line) in lines.iter().enumerate() {
            let y = top + (n as f64 + 0.76) * self.leading;
            let x = self.start(index, area, line, style, mark);
            if let (Some(kind), 0, true) = (cell.mark, n, first) {
                let centre = (
                    x + self.size * MARK / 2.0,
                    y - self.size * super::typeface::CAP_HEIGHT / 2.0,
                );
                let spoken = cell.spoken.as_ref();
                let before = spoken.map(|words| flow.enter(Role::Figure(words.clone())));
                flow.page().mark(kind, centre, self.size * MARK);
                if let Some(before) = before {
                    flow.leave(before);
                }
            }
            let wide = flow.page().text((x + mark, y), style, line);
            if let Some(to) = &cell.link {
                let target = Area {
                    left: x,
                    right: x + mark + wide,
                    top: y - self.size * 0.8,
                    bottom: y + self.size * 0.25,
                };
                flow.page().link(target, to);
            }
        }
    }

    /// Where a line of a cell begins.
    fn start(&self, index: usize, area: Area, line: &str, style: Style, mark: f64) -> f64 {
        let align = self.columns.get(index).map_or(Align::Left, |c| c.align);
        let free = match align {
            Align::Left => 0.0,
            Align::Right => area.width() - width(line, style) - mark,
            Align::Decimal => {
                let (whole, _) = halves(line);
                let after = self.halves.get(index).map_or(0.0, |h| h.1);
                area.width() - after - width(whole, style) - mark
            }
        };
        area.left + free.max(0.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn figures_split_at_their_point() {
        assert_eq!(halves("4.683 ± 0.010"), ("4", ".683 ± 0.010"));
        assert_eq!(halves("12"), ("12", ""));
        assert_eq!(halves("−4e−5"), ("−4", "e−5"));
        assert_eq!(halves("–"), ("–", ""));
    }
}
