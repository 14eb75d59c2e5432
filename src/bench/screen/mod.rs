//! The run on a full screen, from 80 × 24 up. Draws a scene and decides nothing; colour only repeats what words and
//! marks say.

mod big;
mod curve;

use super::run::{CheckReason, Step};
use super::scene::{Ending, Page, PlanText, Scene, reading_rows};
use super::{Message, Tone, words};
use crate::bench::desk::{Desk, Told};
use crate::bench::run::Run;
use crate::diagnostic::printable;
use crate::judgement::PartVerdict;
use crate::lot::LotVerdict;
use ratatui::Frame;
use ratatui::layout::{Constraint, Layout, Margin, Position, Rect};
use ratatui::style::{Color, Modifier, Style};
use ratatui::text::{Line, Span, Text};
use ratatui::widgets::{Paragraph, Wrap};
use unicode_width::UnicodeWidthStr;

/// Smallest screen that everything fits.
pub const SMALLEST: (u16, u16) = (80, 24);

/// How it is drawn.
#[derive(Debug, Clone, Copy)]
pub struct Look {
    /// Whether colours may be used.
    pub colour: bool,
}

impl Look {
    fn ink(self, colour: Color) -> Style {
        if self.colour {
            Style::new().fg(colour)
        } else {
            Style::new()
        }
    }

    fn quiet(self) -> Style {
        if self.colour {
            Style::new().fg(Color::DarkGray)
        } else {
            Style::new().add_modifier(Modifier::DIM)
        }
    }

    fn strong(self) -> Style {
        Style::new().add_modifier(Modifier::BOLD)
    }

    fn part(self, verdict: PartVerdict) -> Style {
        self.ink(match verdict {
            PartVerdict::Conforming => Color::Green,
            PartVerdict::Nonconforming => Color::Red,
            PartVerdict::Undecided | PartVerdict::Unmeasured => Color::Yellow,
        })
    }

    fn lot(self, verdict: LotVerdict) -> Style {
        self.ink(match verdict {
            LotVerdict::Accept => Color::Green,
            LotVerdict::Reject => Color::Red,
            LotVerdict::Hold => Color::Yellow,
        })
    }

    fn tone(self, tone: Tone) -> Style {
        match tone {
            Tone::Plain => Style::new(),
            Tone::Quiet => self.quiet(),
            Tone::Good => self.ink(Color::Green),
            Tone::Warn => self.ink(Color::Yellow).add_modifier(Modifier::BOLD),
            Tone::Bad => self.ink(Color::Red).add_modifier(Modifier::BOLD),
        }
    }
}

/// Draws a scene with what is typed so far.
pub fn draw(frame: &mut Frame, scene: &Scene, typed: &str, look: Look) {
    let all = frame.area();
    if all.width < 20 || all.height < 8 {
        frame.render_widget(Paragraph::new(scene.prompt).wrap(Wrap { trim: true }), all);
        return;
    }
    let inner = all.inner(Margin::new(1, 0));
    let width = usize::from(inner.width);
    let said = said(scene.said, width, look);
    let prompt = Paragraph::new(Text::styled(scene.prompt.to_owned(), look.strong()))
        .wrap(Wrap { trim: true });
    let asked = lines(scene.prompt, width).clamp(1, 3);
    let spoken = said.lines.len().min(usize::from(all.height) / 3);
    let [head, strip, body, told, ask, line] = Layout::vertical([
        Constraint::Length(1),
        Constraint::Length(1),
        Constraint::Min(4),
        Constraint::Length(spoken as u16),
        Constraint::Length(asked as u16),
        Constraint::Length(1),
    ])
    .areas(inner);
    header(frame, head, scene, look);
    match scene.page {
        Page::Scan(fields) => scan(frame, body, fields, look),
        Page::Plan(text) => plan(frame, body, text, look),
        Page::Work {
            run,
            desk,
            positions,
            told,
        } => {
            reel(frame, strip, run, positions, look);
            work(frame, body, (run, desk, told), look);
        }
        Page::End(ending) => end(frame, body, ending, look),
    }
    frame.render_widget(Paragraph::new(said), told);
    frame.render_widget(prompt, ask);
    input(frame, line, scene, typed, look);
}

fn lines(text: &str, width: usize) -> usize {
    textwrap::wrap(text, width.max(10)).len()
}

/// What was said, the newest at the bottom.
fn said<'a>(messages: &[Message], width: usize, look: Look) -> Text<'a> {
    let mut out = Vec::new();
    for message in messages {
        let style = look.tone(message.tone);
        let head = match message.tone {
            Tone::Warn => "! ",
            Tone::Bad => "✘ ",
            _ => "  ",
        };
        let text = printable(&message.text.replace('\n', " "));
        for (i, line) in textwrap::wrap(&text, width.saturating_sub(2).max(10))
            .iter()
            .enumerate()
        {
            let head = if i == 0 { head } else { "  " };
            out.push(Line::styled(format!("{head}{line}"), style));
        }
    }
    // Of many, the last are the ones to act on.
    let from = out.len().saturating_sub(8);
    Text::from(out.split_off(from))
}

fn header(frame: &mut Frame, area: Rect, scene: &Scene, look: Look) {
    let (left, right) = match scene.page {
        Page::Scan(_) => ("goods-in".to_owned(), String::new()),
        Page::Plan(text) => (text.title.clone(), String::new()),
        Page::Work { run, desk, .. } => {
            let b = &run.began;
            (
                format!("lot {}   {} rev {}", b.lot, b.part, desk.limits.revision),
                format!("{}   {}", b.station, run.operator),
            )
        }
        Page::End(e) => (
            format!("lot {}   {}", e.record.lot.lot, e.record.lot.part),
            String::new(),
        ),
    };
    let (left, right) = (printable(&left), printable(&right));
    let gap = usize::from(area.width).saturating_sub(left.width() + right.width());
    let line = Line::from(vec![
        Span::styled(left, look.strong()),
        Span::raw(" ".repeat(gap)),
        Span::styled(right, look.quiet()),
    ]);
    frame.render_widget(line, area);
}

/// The reel from its beginning to its end, with the places that parts are drawn from.
fn reel(frame: &mut Frame, area: Rect, run: &Run, positions: &[u64], look: Look) {
    let done = run.done();
    let count = format!("  {done}/{}", run.parts);
    let width = usize::from(area.width).saturating_sub(count.width()).max(1);
    let next = match run.step() {
        Step::Measure { index, .. } => Some(index as usize),
        _ => None,
    };
    let mut cells = vec![(0_u8, ""); width];
    let last = run.began.quantity.max(1) as usize;
    for (i, position) in positions.iter().take(run.parts as usize).enumerate() {
        let at = ((*position as usize - 1) * width / last).min(width - 1);
        let rank = if next == Some(i) {
            3
        } else if (i as u64) < done {
            1
        } else {
            2
        };
        if cells[at].0 < rank {
            cells[at].0 = rank;
        }
    }
    let mut spans: Vec<Span> = cells
        .into_iter()
        .map(|(rank, _)| match rank {
            1 => Span::styled("━", look.ink(Color::Green)),
            2 => Span::styled("┿", look.quiet()),
            3 => Span::styled("▼", look.strong()),
            _ => Span::styled("─", look.quiet()),
        })
        .collect();
    spans.push(Span::raw(count));
    frame.render_widget(Line::from(spans), area);
}

/// A word in large letters.
fn banner(frame: &mut Frame, area: Rect, text: &str, style: Style) {
    let rows = big::word(text);
    let lines: Vec<Line> = rows.into_iter().map(|r| Line::styled(r, style)).collect();
    frame.render_widget(Paragraph::new(lines), area);
}

fn work(
    frame: &mut Frame,
    area: Rect,
    (run, desk, told): (&Run, &Desk, Option<&Told>),
    look: Look,
) {
    let wide = usize::from(area.width).max(10);
    let lines = told.map_or(0, |told| note_lines(run, told, wide).len());
    let [_, top, note, middle, foot] = Layout::vertical([
        Constraint::Length(u16::from(area.height > 14)),
        Constraint::Length(big::ROWS as u16),
        // What is wrong with a sweep and what to do is never cut off for the curve's sake.
        Constraint::Length(lines.clamp(2, 6) as u16),
        Constraint::Min(0),
        Constraint::Length(1),
    ])
    .areas(area);
    let stopped = matches!(
        run.step(),
        Step::Check {
            reason: CheckReason::Failed,
            ..
        }
    );
    match told.filter(|_| !stopped) {
        Some(told) => verdict(frame, (top, note, middle), (run, desk, told), look),
        None => {
            let (word, style) = match run.step() {
                Step::Check { .. } if stopped => ("✘ STOP", look.ink(Color::Red)),
                Step::Check { .. } => ("CHECK", look.strong()),
                Step::Measure { .. } => ("PLACE", look.strong()),
                Step::Ask(_) => ("SET", look.strong()),
                _ => ("JUDGE", look.strong()),
            };
            banner(frame, top, word, style);
            let cautions: Vec<Line> = super::cautions::cautions(&desk.limits)
                .iter()
                .flat_map(|c| {
                    textwrap::wrap(
                        &format!("{}: {}", words::CAUTION, printable(c)),
                        usize::from(middle.width).max(10),
                    )
                    .into_iter()
                    .map(|l| Line::styled(l.into_owned(), look.quiet()))
                    .collect::<Vec<_>>()
                })
                .collect();
            frame.render_widget(Paragraph::new(cautions), middle);
        }
    }
    let left = run.parts.saturating_sub(run.done());
    let standing = words::standing(&run.chances(), left);
    let style = if run.acceptable() {
        look.quiet()
    } else {
        look.tone(Tone::Bad)
    };
    let clipped = clip(&standing, usize::from(foot.width));
    frame.render_widget(Line::styled(clipped, style), foot);
}

fn verdict(
    frame: &mut Frame,
    (top, note, middle): (Rect, Rect, Rect),
    (run, desk, told): (&Run, &Desk, &Told),
    look: Look,
) {
    let verdict = told.verdict();
    let style = look.part(verdict).add_modifier(Modifier::BOLD);
    let text = format!("{} {}", words::mark(verdict), words::verdict(verdict));
    banner(frame, top, &text, style);
    let wide = usize::from(note.width).max(10);
    let wrapped: Vec<Line> = note_lines(run, told, wide)
        .into_iter()
        .map(|l| Line::styled(l, look.strong()))
        .collect();
    frame.render_widget(Paragraph::new(wrapped), note);
    let rows = reading_rows(&desk.limits, told);
    let room = middle.width;
    let table_width = if room >= 110 { 60 } else { room / 2 };
    let [left, right] =
        Layout::horizontal([Constraint::Min(20), Constraint::Length(table_width)]).areas(middle);
    if let Some(sweep) = &told.sweep {
        curve::draw(frame, left, sweep, &desk.limits, look.colour);
    }
    readings(frame, right, &rows, look);
}

/// What was found of the last sweep, and what to do.
fn note_lines(run: &Run, told: &Told, wide: usize) -> Vec<String> {
    let verdict = told.verdict();
    let again = match told.attempt {
        1 => String::new(),
        n => format!(", try {n}"),
    };
    let fault = told.judged.faults.first().map(|f| format!("{}. ", f.text));
    let may_follow = run.standing(&told.part).may_follow;
    let text = format!(
        "part {}{again}: {}{} {}",
        told.part,
        words::verdict(verdict).to_lowercase(),
        fault.map_or(".".to_owned(), |f| format!(": {}", f.trim_end())),
        words::after(verdict, &told.part, may_follow)
    );
    textwrap::wrap(&printable(&text), wide)
        .into_iter()
        .map(std::borrow::Cow::into_owned)
        .collect()
}

/// The readings: name and limits, value below each other where the column is narrow.
fn readings(frame: &mut Frame, area: Rect, rows: &[[String; 4]], look: Look) {
    let width = usize::from(area.width);
    let tall = rows.len() * 2 <= usize::from(area.height);
    let mut out = Vec::new();
    for [mark, name, value, limits] in rows {
        let style = if mark == words::mark(PartVerdict::Conforming) {
            Style::new()
        } else {
            look.tone(Tone::Warn)
        };
        // Where both do not fit, the value goes without its uncertainty, which the record has.
        let fits = 4 + name.width() + value.width() <= width;
        let value = match value.split_once(" ± ") {
            Some((short, _)) if !fits => short,
            _ => value.as_str(),
        };
        let gap = width
            .saturating_sub(3 + name.width() + value.width())
            .max(1);
        let first = format!(" {mark} {name}{}{value}", " ".repeat(gap));
        out.push(Line::styled(clip(&first, width), style));
        if tall {
            let room = width.saturating_sub(3);
            out.push(Line::styled(
                format!("   {:>room$}", clip(limits, room)),
                look.quiet(),
            ));
        }
    }
    frame.render_widget(Paragraph::new(out), area);
}

/// At most `width` columns.
fn clip(text: &str, width: usize) -> String {
    if text.width() <= width {
        return text.to_owned();
    }
    let mut used = 0;
    let mut out: String = text
        .chars()
        .take_while(|c| {
            used += unicode_width::UnicodeWidthChar::width(*c).unwrap_or(0);
            used < width
        })
        .collect();
    out.push('…');
    out
}

fn scan(frame: &mut Frame, area: Rect, fields: &[(&'static str, String)], look: Look) {
    let [_, top, _, list] = Layout::vertical([
        Constraint::Length(u16::from(area.height > 14)),
        Constraint::Length(big::ROWS as u16),
        Constraint::Length(1),
        Constraint::Min(0),
    ])
    .areas(area);
    banner(frame, top, "SCAN", look.strong());
    frame.render_widget(
        Paragraph::new(table(
            fields.iter().map(|(n, v)| (*n, v.clone())),
            usize::from(list.width),
            look,
        )),
        list,
    );
}

/// Names and texts in two columns.
fn table<'a>(
    rows: impl Iterator<Item = (&'a str, String)>,
    width: usize,
    look: Look,
) -> Vec<Line<'static>> {
    const NAME: usize = 12;
    let mut out = Vec::new();
    for (name, text) in rows {
        let safe = printable(&text);
        for (i, line) in textwrap::wrap(&safe, width.saturating_sub(NAME).max(10))
            .iter()
            .enumerate()
        {
            let head = if i == 0 { name } else { "" };
            out.push(Line::from(vec![
                Span::styled(format!("{head:<NAME$}"), look.quiet()),
                Span::raw(line.to_string()),
            ]));
        }
    }
    out
}

fn plan(frame: &mut Frame, area: Rect, text: &PlanText, look: Look) {
    let width = usize::from(area.width);
    let mut out = table(text.rows.iter().map(|(n, t)| (*n, t.clone())), width, look);
    if area.height > 14 {
        out.insert(0, Line::default());
        out.push(Line::default());
    }
    for (head, all, style) in [
        (words::CAUTION, &text.cautions, look.strong()),
        (words::FORESEEN, &text.foreseen, look.tone(Tone::Warn)),
    ] {
        for one in all {
            for line in textwrap::wrap(&printable(&format!("{head}: {one}")), width.max(10)) {
                out.push(Line::styled(line.into_owned(), style));
            }
        }
    }
    frame.render_widget(Paragraph::new(out), area);
}

fn end(frame: &mut Frame, area: Rect, ending: &Ending, look: Look) {
    let record = &ending.record;
    let [_, top, _, rest] = Layout::vertical([
        Constraint::Length(u16::from(area.height > 14)),
        Constraint::Length(big::ROWS as u16),
        Constraint::Length(1),
        Constraint::Min(0),
    ])
    .areas(area);
    let text = format!(
        "{} {}",
        words::lot_mark(record.verdict),
        words::lot_verdict(record.verdict)
    );
    banner(
        frame,
        top,
        &text,
        look.lot(record.verdict).add_modifier(Modifier::BOLD),
    );
    let [why, label] = Layout::horizontal([
        Constraint::Min(30),
        Constraint::Length(if area.width >= 78 { 34 } else { 0 }),
    ])
    .spacing(2)
    .areas(rest);
    let width = usize::from(why.width).max(10);
    let mut out = vec![];
    let mut push = |text: &str, style: Style| {
        for line in textwrap::wrap(&printable(text), width) {
            out.push(Line::styled(line.into_owned(), style));
        }
    };
    push(words::reel(record.verdict), look.strong());
    for reason in &record.reasons {
        push(&reason.text, Style::new());
    }
    push(&words::record(&ending.certificate), look.quiet());
    push(&words::label_written(&ending.tag_path), look.quiet());
    push(words::NOT_SAFETY, look.quiet());
    frame.render_widget(Paragraph::new(out), why);
    let inside = usize::from(label.width).saturating_sub(2);
    let mut lines = vec![Line::raw(format!("┌{}┐", "─".repeat(inside)))];
    for text in ending.tag.lines() {
        let text = clip(text, inside);
        let pad = inside.saturating_sub(text.width());
        lines.push(Line::raw(format!("│{text}{}│", " ".repeat(pad))));
    }
    lines.push(Line::raw(format!("└{}┘", "─".repeat(inside))));
    if label.width > 2 {
        frame.render_widget(Paragraph::new(lines), label);
    }
}

/// What is typed, and what could be.
fn input(frame: &mut Frame, area: Rect, scene: &Scene, typed: &str, look: Look) {
    let shown = printable(typed);
    let room = usize::from(area.width).saturating_sub(4);
    // Of a long scan the end shows.
    let from = shown.chars().count().saturating_sub(room);
    let tail: String = shown.chars().skip(from).collect();
    let hint = match (scene.activity, &scene.page) {
        ("", Page::Work { .. }) => words::KEYS,
        (activity, _) => activity,
    };
    let used = 2 + tail.width();
    let gap = usize::from(area.width).saturating_sub(used + hint.width());
    let hint = if gap > 1 { hint } else { "" };
    let line = Line::from(vec![
        Span::styled("> ", look.strong()),
        Span::raw(tail),
        Span::raw(" ".repeat(gap)),
        Span::styled(hint.to_owned(), look.quiet()),
    ]);
    frame.render_widget(line, area);
    let x = area.x + (used as u16).min(area.width.saturating_sub(1));
    frame.set_cursor_position(Position::new(x, area.y));
}
