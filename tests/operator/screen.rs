//! The full screen in a pseudo-terminal: what a person sees, at 80 × 24.

use super::site::{LABEL, PATIENCE, Site, WHO};
use portable_pty::{Child, CommandBuilder, MasterPty, PtySize, native_pty_system};
use std::io::{Read, Write};
use std::num::NonZero;
use std::sync::{Arc, Mutex};
use std::thread;
use std::time::{Duration, Instant};

fn cells(n: u16) -> NonZero<u16> {
    NonZero::new(n).expect("not 0")
}

struct Screen {
    child: Box<dyn Child + Send + Sync>,
    master: Box<dyn MasterPty + Send>,
    keys: Box<dyn Write + Send>,
    parser: Arc<Mutex<vt100::Parser>>,
    raw: Arc<Mutex<Vec<u8>>>,
}

impl Screen {
    fn start(site: &Site, size: (u16, u16), variables: &[(&str, &str)]) -> Screen {
        let size = PtySize {
            rows: size.1,
            cols: size.0,
            pixel_width: 0,
            pixel_height: 0,
        };
        let pair = native_pty_system().openpty(size).expect("a terminal");
        let mut command = CommandBuilder::new(env!("CARGO_BIN_EXE_reelgate"));
        command.args(["bench", "--seed", "7"]);
        command.args(WHO);
        command.cwd(site.file(""));
        command.env("REELGATE_NOW", super::site::NOW);
        command.env("TERM", "xterm-256color");
        command.env_remove("NO_COLOR");
        for (name, value) in variables {
            command.env(name, value);
        }
        let child = pair.slave.spawn_command(command).expect("reelgate starts");
        let parser = Arc::new(Mutex::new(vt100::Parser::new(
            cells(size.rows),
            cells(size.cols),
            0,
        )));
        let raw = Arc::new(Mutex::new(Vec::new()));
        let mut reader = pair.master.try_clone_reader().expect("a reader");
        let (to, also) = (parser.clone(), raw.clone());
        thread::spawn(move || {
            let mut buffer = [0; 4096];
            while let Ok(n) = reader.read(&mut buffer) {
                if n == 0 {
                    return;
                }
                to.lock().expect("a screen").process(&buffer[..n]);
                also.lock().expect("bytes").extend_from_slice(&buffer[..n]);
            }
        });
        Screen {
            child,
            keys: pair.master.take_writer().expect("keys"),
            master: pair.master,
            parser,
            raw,
        }
    }

    fn text(&self) -> String {
        self.parser.lock().expect("a screen").screen().contents()
    }

    fn until(&self, what: &str, seen: impl Fn(&str) -> bool) {
        let end = Instant::now() + PATIENCE;
        while !seen(&self.text()) {
            assert!(
                Instant::now() < end,
                "{what} did not come:\n{}",
                self.text()
            );
            thread::sleep(Duration::from_millis(10));
        }
    }

    fn see(&self, text: &str) {
        self.until(text, |screen| screen.contains(text));
    }

    /// The scanner types and ends with Enter.
    fn line(&mut self, text: &str) {
        self.keys
            .write_all(format!("{text}\r").as_bytes())
            .expect("keys");
        self.keys.flush().expect("keys");
    }

    fn go_to_first_part(&mut self) {
        self.see("Scan the label");
        self.line(LABEL);
        self.see("Enter to begin");
        self.line("");
        self.see("Temperature at the bench");
        self.line("22.8");
        self.see("Part 001 of 5");
    }

    fn alternate(&self) -> bool {
        self.parser
            .lock()
            .expect("a screen")
            .screen()
            .alternate_screen()
    }
}

#[test]
fn scan_parts_fault_retest_undo_and_resume_after_a_kill() {
    let site = Site::new();
    let mut screen = Screen::start(&site, (80, 24), &[]);
    screen.go_to_first_part();
    screen.see("████"); // a word of large letters
    site.save_open("a");
    screen.see("part 001: unmeasured");
    screen.see("Part 001, try 2: take it out");
    site.save("001");
    screen.see("part 001, try 2: conforming");
    screen.see("1/5");
    screen.see("4 parts left; the lot can still be accepted");
    screen.see("ESR minimum");
    site.save("002");
    screen.see("part 002: conforming");
    screen.line("u");
    screen.see("Part 002, try 1 is marked misplaced");
    site.save("003");
    screen.see("part 002, try 2: conforming");
    screen.see("Part 003 of 5");
    screen.child.kill().expect("killed");
    // The terminal is given back though nothing in the program could do it.
    screen.until("the usual screen", |_| !screen.alternate());

    let mut screen = Screen::start(&site, (80, 24), &[]);
    screen.see("Not finished: lot 26K-9001 (2 of 5 parts)");
    screen.line(LABEL);
    screen.see("goes on where it stopped: 2 of 5");
    for (part, sweep) in [("003", "004"), ("004", "005"), ("005", "006")] {
        screen.see(&format!("Part {part} of 5"));
        site.save(sweep);
        screen.see(&format!("part {part}: conforming"));
    }
    screen.see("All parts are measured");
    screen.line("");
    screen.see("The reel may go to the line");
    screen.see("✔ ACCEPT"); // on the label
    screen.line("p");
    assert_eq!(screen.child.wait().expect("an end").exit_code(), 0);
    screen.until("the usual screen", |_| !screen.alternate());
    let (_, record) = site.judge("26K-9001");
    assert_eq!(record["verdict"], "accept");
    assert_eq!(record["parts"][1]["attempts"][0]["set_aside"], "misplaced");
}

#[test]
fn no_colour_and_other_sizes() {
    let site = Site::new();
    let mut screen = Screen::start(&site, (120, 40), &[("NO_COLOR", "1")]);
    screen.go_to_first_part();
    site.save_scaled("001", "a", 2.0);
    screen.see("part 001: nonconforming");
    screen.see("✘ capacitance");
    let raw = String::from_utf8_lossy(&screen.raw.lock().expect("bytes")).into_owned();
    let colours: Vec<&str> = raw
        .split("\u{1b}[")
        .filter_map(|rest| rest.split_once('m'))
        .map(|(codes, _)| codes)
        .filter(|codes| codes.chars().all(|c| c.is_ascii_digit() || c == ';'))
        .filter(|codes| {
            codes.starts_with("38;") || codes.starts_with("48;") || codes.starts_with('3')
        })
        .filter(|codes| *codes != "39")
        .collect();
    assert!(colours.is_empty(), "{colours:?}");
    let small = PtySize {
        rows: 24,
        cols: 80,
        pixel_width: 0,
        pixel_height: 0,
    };
    screen
        .parser
        .lock()
        .expect("a screen")
        .screen_mut()
        .set_size(cells(24), cells(80));
    screen.master.resize(small).expect("resized");
    // Drawn for the new size, the words stand in its last line: a key that comes with the signal of the resize would
    // wait for the next one.
    screen.until("the smaller screen", |text| {
        text.lines().count() == 24 && text.trim_end().ends_with("help")
    });
    screen.keys.write_all(b"\x03").expect("keys");
    assert_eq!(screen.child.wait().expect("an end").exit_code(), 5);
    screen.see("Paused. 1 of 5 parts");
}

/// What docs/operator.md shows, in the order of the page.
const PAGE: &str = "docs/operator.md";

/// Where the block under `<!-- capture: name -->` stands in the page.
fn block(page: &str, name: &str) -> std::ops::Range<usize> {
    let mark = format!("<!-- capture: {name} -->\n```text\n");
    let start = page
        .find(&mark)
        .unwrap_or_else(|| panic!("{PAGE} has no {mark}"))
        + mark.len();
    start..start + page[start..].find("```").expect("the end of the block")
}

/// A screen as the page has it.
fn as_text(screen: &str) -> String {
    let lines: Vec<&str> = screen.lines().map(str::trim_end).collect();
    lines.join("\n").trim_end().to_owned() + "\n"
}

/// Waits until the screen is what the page shows; or, where the page is written anew, until it stands still.
fn capture(screen: &Screen, name: &str) {
    let page = std::fs::read_to_string(PAGE).expect("the page");
    let place = block(&page, name);
    if std::env::var_os("REELGATE_UPDATE").is_none() {
        let wanted = &page[place];
        screen.until(&format!("the {name} of {PAGE}"), |text| {
            as_text(text) == wanted
        });
        return;
    }
    let mut before = String::new();
    while before != screen.text() {
        before = screen.text();
        thread::sleep(Duration::from_millis(500));
    }
    let mut fresh = page.clone();
    fresh.replace_range(place, &as_text(&before));
    std::fs::write(PAGE, fresh).expect("the page is written");
}

/// The page shows the screen as it is: `REELGATE_UPDATE=1 cargo test --test operator` writes it anew.
#[test]
fn the_page_for_the_operator_shows_the_real_screen() {
    let site = Site::new();
    let mut screen = Screen::start(&site, (80, 24), &[]);
    screen.see("Scan the label");
    screen.line(LABEL);
    screen.see("Enter to begin");
    capture(&screen, "plan");
    screen.line("");
    screen.see("Temperature at the bench");
    screen.line("22.8");
    screen.see("Part 001 of 5");
    site.save("001");
    screen.see("part 001: conforming");
    screen.see("Part 002 of 5");
    capture(&screen, "part");
    site.save_open("b");
    screen.see("part 002: unmeasured");
    screen.see("Part 002, try 2");
    capture(&screen, "fault");
    for (part, sweep) in [
        ("002, try 2", "002"),
        ("003", "003"),
        ("004", "004"),
        ("005", "005"),
    ] {
        site.save(sweep);
        screen.see(&format!("part {part}: conforming"));
    }
    screen.see("All parts are measured");
    screen.line("");
    screen.see("The reel may go to the line");
    capture(&screen, "end");
    screen.line("p");
    assert_eq!(screen.child.wait().expect("an end").exit_code(), 0);
}
