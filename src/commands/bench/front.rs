//! The operator's side: lines in, scenes out.

use crate::bench::scene::{Page, Scene};
use crate::bench::{Message, plain};
use std::io::{self, Write};

/// What came in from the operator or the source.
pub enum In {
    /// A line that was typed or scanned.
    Line(String),
    /// The input is closed.
    Eof,
    /// Something happened at the terminal.
    Terminal(ratatui::crossterm::event::Event),
    #[allow(missing_docs)]
    Source(Result<crate::bench::source::Event, crate::bench::source::Trouble>),
}

/// What the operator wants.
pub enum Typed {
    #[allow(missing_docs)]
    Line(String),
    /// To leave at once; what is measured is kept.
    Leave,
}

/// Shows scenes and understands what happens at the terminal.
pub trait Front {
    /// A line was taken: what was said before is old.
    fn turn(&mut self);
    /// Shows the scene as it is now.
    ///
    /// # Errors
    /// Those of the terminal.
    fn draw(&mut self, scene: &Scene) -> io::Result<()>;
    /// What an event of the terminal means, if it means anything.
    fn take(&mut self, event: ratatui::crossterm::event::Event) -> Option<Typed>;
    /// The verdict on a part has come.
    fn bell(&mut self, good: bool);
    /// Gives the terminal back.
    fn close(&mut self);
}

/// Line by line.
pub struct Plain<'a> {
    out: &'a mut dyn Write,
    ring: bool,
    said: usize,
    before: usize,
    prompt: String,
    page: Shown,
}

/// What was printed last, so that nothing is printed twice.
#[derive(PartialEq, Clone, Copy)]
enum Shown {
    Nothing,
    Plan,
    Sweeps(usize),
    End,
}

impl<'a> Plain<'a> {
    #[allow(missing_docs)]
    pub fn new(out: &'a mut dyn Write, ring: bool) -> Plain<'a> {
        Plain {
            out,
            ring,
            said: 0,
            before: 0,
            prompt: String::new(),
            page: Shown::Nothing,
        }
    }
}

impl Front for Plain<'_> {
    fn turn(&mut self) {
        self.said = 0;
        self.prompt.clear();
        if self.page == Shown::Plan || self.page == Shown::End {
            self.page = Shown::Nothing;
        }
    }

    fn draw(&mut self, scene: &Scene) -> io::Result<()> {
        match scene.page {
            Page::Scan(_) => self.page = Shown::Nothing,
            Page::Plan(text) if self.page != Shown::Plan => {
                self.page = Shown::Plan;
                self.out.write_all(plain::plan(text).as_bytes())?;
            }
            Page::Work {
                run, desk, told, ..
            } => {
                let sweeps = Shown::Sweeps(run.tries.len());
                if self.page != sweeps {
                    let first = matches!(self.page, Shown::Sweeps(_));
                    self.page = sweeps;
                    if let Some(told) = told.filter(|_| first) {
                        self.out
                            .write_all(plain::told(told, run, desk).as_bytes())?;
                    }
                }
            }
            Page::End(ending) if self.page != Shown::End => {
                self.page = Shown::End;
                self.out.write_all(plain::ending(ending).as_bytes())?;
            }
            Page::Plan(_) | Page::End(_) => {}
        }
        if scene.said_before < self.before {
            self.said = 0;
        }
        self.before = scene.said_before;
        let known = self.said.saturating_sub(scene.said_before);
        let new: Vec<&Message> = scene.said.iter().skip(known).collect();
        self.said = scene.said_before + scene.said.len();
        for one in new {
            self.out.write_all(plain::message(one).as_bytes())?;
        }
        if self.prompt != scene.prompt {
            self.prompt = scene.prompt.to_owned();
            writeln!(self.out, "> {}", scene.prompt)?;
        }
        self.out.flush()
    }

    fn take(&mut self, _: ratatui::crossterm::event::Event) -> Option<Typed> {
        None
    }

    fn bell(&mut self, good: bool) {
        if self.ring {
            let _ = self
                .out
                .write_all(if good { b"\x07" } else { b"\x07\x07\x07" });
        }
    }

    fn close(&mut self) {}
}
