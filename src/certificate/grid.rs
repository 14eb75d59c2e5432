//! The grid of page one, drawn over it with the names of its lines: for whoever changes the layout.

use super::canvas::{Anchor, Item, Pen};
use super::flow::Flow;
use super::furniture::{FOOT_FROM_BOTTOM, HEAD};
use super::ink::{ACCEPT, Ink, NONCONFORMING};
use super::paper::Sheet;
use super::section::answer::{LABEL, SENTENCE, WORD, WORD_LEFT, split};
use super::text::Style;

/// A line of the grid.
pub(super) struct Line {
    pub name: &'static str,
    /// Points from the left (upright lines) or from the top.
    pub at: f64,
    pub upright: bool,
}

/// The lines that page one is set on.
pub(super) fn lines(sheet: &Sheet) -> Vec<Line> {
    let upright = |name, at| Line {
        name,
        at,
        upright: true,
    };
    let level = |name, at| Line {
        name,
        at,
        upright: false,
    };
    vec![
        upright("left margin", sheet.left),
        upright("verdict", sheet.left + WORD_LEFT),
        upright("identity", split(sheet)),
        upright("its values", split(sheet) + LABEL),
        upright("right margin", sheet.right),
        level("running head", HEAD),
        level("top", sheet.top),
        level("verdict", sheet.top + WORD),
        level("sentence", sheet.top + SENTENCE),
        level("bottom", sheet.bottom),
        level("running foot", sheet.height - FOOT_FROM_BOTTOM),
    ]
}

/// Draws the lines over the first page.
pub(super) fn draw(flow: &mut Flow) {
    let sheet = flow.sheet;
    let Some(page) = flow.pages.first_mut() else {
        return;
    };
    page.items.push(Item::Run(None));
    const NAME: Style = Style::regular(6.4);
    let ink = |line: &Line| -> Ink { if line.upright { NONCONFORMING } else { ACCEPT } };
    for line in lines(&sheet) {
        let pen = Pen::dashed(0.4, ink(&line));
        let words = format!("{} {:.1}", line.name, line.at);
        let style = NAME.ink(ink(&line));
        if line.upright {
            page.line((line.at, 0.0), (line.at, sheet.height), pen);
            let anchor = if line.at > sheet.width * 0.9 {
                Anchor::End
            } else {
                Anchor::Middle
            };
            page.text_at((line.at, 12.0), anchor, style, &words);
        } else {
            page.line((0.0, line.at), (sheet.width, line.at), pen);
            page.text((3.0, line.at - 2.0), style, line.name);
            page.text_at(
                (sheet.width - 3.0, line.at - 2.0),
                Anchor::End,
                style,
                &format!("{:.1}", line.at),
            );
        }
    }
}
