//! The full screen: keys to lines, scenes to the terminal, and the terminal given back whatever happens.

use super::front::{Front, Typed};
use crate::bench::scene::Scene;
use crate::bench::screen::{self, Look};
use ratatui::DefaultTerminal;
use ratatui::crossterm::event::{Event, KeyCode, KeyEvent, KeyEventKind, KeyModifiers};
use std::io::{self, Write};
use std::process::{Child, Command, Stdio};

/// The longest line that is taken; a label is far shorter.
const LONGEST: usize = 64 * 1024;

/// The terminal while it is ours.
pub struct Screen {
    terminal: DefaultTerminal,
    keeper: Option<Keeper>,
    typed: String,
    look: Look,
    ring: bool,
}

impl Screen {
    /// Takes the terminal: another screen, keys as they come. A panic gives it back (ratatui's hook); so does
    /// [`Keeper`] when the process is killed.
    ///
    /// # Errors
    /// Those of the terminal.
    pub fn open(colour: bool, ring: bool) -> io::Result<Screen> {
        let keeper = Keeper::post();
        let terminal = ratatui::try_init()?;
        Ok(Screen {
            terminal,
            keeper,
            typed: String::new(),
            look: Look { colour },
            ring,
        })
    }

    fn key(&mut self, key: KeyEvent) -> Option<Typed> {
        if key.kind == KeyEventKind::Release {
            return None;
        }
        let control = key.modifiers.contains(KeyModifiers::CONTROL);
        match (key.code, control) {
            (KeyCode::Enter, _) | (KeyCode::Char('j' | 'm'), true) => {
                return Some(Typed::Line(std::mem::take(&mut self.typed)));
            }
            (KeyCode::Char('c'), true) => return Some(Typed::Leave),
            (KeyCode::Char(c), true) => {
                // The separators of a label arrive as the keys that send these characters.
                let separator = match c {
                    'd' => '\u{4}',
                    '4' | '\\' => '\u{1c}',
                    '5' | ']' => '\u{1d}',
                    '6' | '^' => '\u{1e}',
                    '7' | '_' => '\u{1f}',
                    _ => return None,
                };
                self.push(separator);
            }
            (KeyCode::Char(c), false) => self.push(c),
            (KeyCode::Backspace, _) => {
                self.typed.pop();
            }
            (KeyCode::Esc, _) => self.typed.clear(),
            _ => {}
        }
        None
    }

    fn push(&mut self, c: char) {
        if self.typed.len() < LONGEST {
            self.typed.push(c);
        }
    }
}

impl Front for Screen {
    fn turn(&mut self) {}

    fn draw(&mut self, scene: &Scene) -> io::Result<()> {
        let (typed, look) = (self.typed.as_str(), self.look);
        self.terminal
            .draw(|frame| screen::draw(frame, scene, typed, look))?;
        Ok(())
    }

    fn take(&mut self, event: Event) -> Option<Typed> {
        match event {
            Event::Key(key) => self.key(key),
            _ => None,
        }
    }

    fn bell(&mut self, good: bool) {
        if self.ring {
            let mut out = io::stdout();
            let _ = out.write_all(if good { b"\x07" } else { b"\x07\x07\x07" });
            let _ = out.flush();
        }
    }

    fn close(&mut self) {
        let _ = ratatui::try_restore();
        if let Some(keeper) = self.keeper.take() {
            keeper.dismiss();
        }
    }
}

impl Drop for Screen {
    fn drop(&mut self) {
        self.close();
    }
}

/// A small process that waits for the end of this one. When this one is killed, the pipe to it closes, and it puts
/// the terminal back as it was; nothing in a process that is killed could do so itself.
struct Keeper(Child);

/// `$1` is what the terminal was set to. It must outlive signals to the terminal's foreground, and may set the
/// terminal though it is in the background.
const WATCH: &str = r#"trap '' INT TERM HUP QUIT TTOU TSTP
while read -r word; do [ "$word" = done ] && exit 0; done
stty "$1" <&1
printf '\033[?1049l\033[?25h\033[0m'"#;

impl Keeper {
    /// `None` where there is no such process to be had; the terminal is then given back by this one alone.
    #[cfg(unix)]
    fn post() -> Option<Keeper> {
        use std::os::unix::process::CommandExt;
        let set = Command::new("stty")
            .arg("-g")
            .stdin(Stdio::inherit())
            .output()
            .ok()?;
        let set = String::from_utf8(set.stdout).ok()?;
        let child = Command::new("sh")
            .args(["-c", WATCH, "sh", set.trim()])
            .stdin(Stdio::piped())
            .stdout(Stdio::inherit())
            .stderr(Stdio::null())
            .process_group(0)
            .spawn()
            .ok()?;
        Some(Keeper(child))
    }

    #[cfg(not(unix))]
    fn post() -> Option<Keeper> {
        None
    }

    fn dismiss(mut self) {
        if let Some(mut pipe) = self.0.stdin.take() {
            let _ = pipe.write_all(b"done\n");
        }
        let _ = self.0.wait();
    }
}
