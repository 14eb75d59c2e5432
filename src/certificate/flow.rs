//! Content poured down pages: a cursor, page breaks, headings, paragraphs, notes of where things are.

use super::canvas::{Area, Canvas, Item};
use super::ink::QUIET;
use super::paper::Sheet;
use super::structure::{Role, Structure};
use super::text::{Style, wrap};
use std::collections::BTreeMap;

/// A place in the document.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Place {
    /// From 0.
    pub page: usize,
    /// Points from the top of the page.
    pub y: f64,
}

/// A bookmark.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Bookmark {
    pub title: String,
    pub place: Place,
}

/// The document while it grows.
pub(super) struct Flow {
    pub sheet: Sheet,
    pub pages: Vec<Canvas>,
    /// Cursor: points from the top of the current page.
    pub y: f64,
    pub anchors: BTreeMap<String, Place>,
    pub bookmarks: Vec<Bookmark>,
    pub structure: Structure,
}

pub(super) const BODY: Style = Style::regular(10.5);
pub(super) const BODY_LEADING: f64 = 13.5;
pub(super) const SMALL: Style = Style::regular(8.6).ink(QUIET);
pub(super) const SMALL_LEADING: f64 = 11.0;
const HEADING: Style = Style::bold(16.0);
const SUBHEADING: Style = Style::bold(11.0);

impl Flow {
    pub fn new(sheet: Sheet) -> Self {
        Flow {
            sheet,
            pages: vec![Canvas::default()],
            y: sheet.top,
            anchors: BTreeMap::new(),
            bookmarks: Vec::new(),
            structure: Structure::default(),
        }
    }

    /// Whatever is placed until [`Flow::leave`] belongs to a new element; answers where the cursor
    /// was in the structure.
    pub fn enter(&mut self, role: Role) -> Option<usize> {
        let element = self.structure.add(role);
        self.resume(element)
    }

    /// Goes on with an element that was left.
    pub fn resume(&mut self, element: usize) -> Option<usize> {
        let before = self.structure.go(Some(element));
        self.belong();
        before
    }

    /// Whatever is placed until [`Flow::leave`] is furniture.
    pub fn aside(&mut self) -> Option<usize> {
        let before = self.structure.go(None);
        self.belong();
        before
    }

    /// Goes back to where the cursor was in the structure.
    pub fn leave(&mut self, before: Option<usize>) {
        self.structure.go(before);
        self.belong();
    }

    /// Begins a run on this page.
    fn belong(&mut self) {
        let run = self.structure.run();
        self.page().items.push(Item::Run(run));
    }

    /// The page at the cursor.
    pub fn page(&mut self) -> &mut Canvas {
        if self.pages.is_empty() {
            self.pages.push(Canvas::default());
        }
        let last = self.pages.len() - 1;
        &mut self.pages[last]
    }

    pub fn here(&self) -> Place {
        Place {
            page: self.pages.len().saturating_sub(1),
            y: self.y,
        }
    }

    pub fn left(&self) -> f64 {
        self.sheet.left
    }

    pub fn right(&self) -> f64 {
        self.sheet.right
    }

    /// Room left on the page.
    pub fn room(&self) -> f64 {
        self.sheet.bottom - self.y
    }

    pub fn new_page(&mut self) {
        self.pages.push(Canvas::default());
        self.y = self.sheet.top;
        self.belong();
    }

    /// Starts a new page unless so much room is left (or the page is still empty).
    pub fn need(&mut self, height: f64) {
        if self.room() < height && self.y > self.sheet.top {
            self.new_page();
        }
    }

    /// Space, unless at the top of a page.
    pub fn gap(&mut self, height: f64) {
        if self.y > self.sheet.top {
            self.y += height;
        }
    }

    /// Takes a full-width area of the height.
    pub fn take(&mut self, height: f64) -> Area {
        self.need(height);
        let area = Area {
            left: self.left(),
            right: self.right(),
            top: self.y,
            bottom: self.y + height,
        };
        self.y += height;
        area
    }

    pub fn anchor(&mut self, name: &str) {
        let here = self.here();
        self.anchors.entry(name.to_owned()).or_insert(here);
    }

    /// Section heading with its bookmark; stays with at least `with` points of what follows.
    pub fn heading(&mut self, title: &str, with: f64) {
        self.gap(24.0);
        self.need(30.0 + with);
        let place = self.here();
        self.bookmarks.push(Bookmark {
            title: title.to_owned(),
            place,
        });
        let at = (self.left(), self.y + 13.0);
        let before = self.enter(Role::Heading(1));
        self.page().text(at, HEADING, title);
        self.leave(before);
        self.y += 26.0;
    }

    /// A heading within a section.
    pub fn subheading(&mut self, title: &str, with: f64) {
        self.gap(12.0);
        self.need(18.0 + with);
        let before = self.enter(Role::Heading(2));
        self.lines_of(title, SUBHEADING, 14.0);
        self.leave(before);
        self.y += 2.0;
    }

    pub fn paragraph(&mut self, text: &str) {
        self.paragraph_of(text, BODY, BODY_LEADING);
        self.y += 3.0;
    }

    pub fn small(&mut self, text: &str) {
        self.paragraph_of(text, SMALL, SMALL_LEADING);
        self.y += 2.0;
    }

    /// A paragraph of its own, wrapped over the full measure.
    pub fn paragraph_of(&mut self, text: &str, style: Style, leading: f64) {
        let lines = wrap(text, style, self.sheet.measure()).len();
        // A short one stays together.
        if lines <= 6 {
            self.need(lines as f64 * leading);
        }
        let before = self.enter(Role::Paragraph);
        self.lines_of(text, style, leading);
        self.leave(before);
    }

    /// Wrapped text over the full measure.
    pub fn lines_of(&mut self, text: &str, style: Style, leading: f64) {
        for line in wrap(text, style, self.sheet.measure()) {
            let area = self.take(leading);
            let baseline = area.bottom - (leading - style.size) / 2.0 - style.size * 0.22;
            self.page().text((area.left, baseline), style, &line);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::certificate::Paper;

    #[test]
    fn text_longer_than_a_page_flows_on_and_stays_within_the_margins() {
        let mut flow = Flow::new(Sheet::new(Paper::Letter));
        flow.paragraph(&"word ".repeat(3000));
        assert!(flow.pages.len() > 1);
        for page in &flow.pages {
            for item in &page.items {
                let Some(area) = super::super::canvas::text_area(item) else {
                    assert!(matches!(item, Item::Run(_)), "only text here");
                    continue;
                };
                assert!(area.top >= flow.sheet.top - 1.0 && area.bottom <= flow.sheet.bottom + 1.0);
                assert!(area.left >= flow.sheet.left && area.right <= flow.sheet.right + 0.01);
            }
        }
    }
}
