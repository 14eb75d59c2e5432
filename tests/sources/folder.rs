//! The watched folder: every way in which programs save files.
//!
//! That a file is not taken too early is tested with files that can never be taken for whole however
//! slow the machine is: shorter than the station file says, or kept open by their writer.

use crate::made::{POINTS, station, sweep, sweep_of, watch};
use reelgate::bench::source::{Event, Folder, Proof, Seen, Source, Taken, Trouble};
use std::fs::{self, File, OpenOptions};
use std::io::{Seek, Write};
use std::path::{Path, PathBuf};
use std::time::{Duration, Instant, UNIX_EPOCH};
use tempfile::TempDir;

/// Longer than any wait of the program.
const LONG: Duration = Duration::from_secs(60);
const SHORT: Duration = Duration::from_millis(300);
const KNOWN: &str = ", points: 60";

struct Bench {
    folder: TempDir,
    source: Folder,
}

type Open = fn(
    &Path,
    &reelgate::station::Watch,
    &reelgate::station::Station,
    Option<&[Seen]>,
) -> Result<Folder, Trouble>;

/// With notifications of the file system, and without any.
const BOTH: [Open; 2] = [Folder::open, Folder::open_by_listing];

impl Bench {
    fn new(open: Open, more: &str) -> Bench {
        let folder = TempDir::new().expect("a folder");
        let source = open(folder.path(), &watch(more), &station(""), None).expect("a source");
        Bench { folder, source }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn save(&self, name: &str, text: &str) {
        fs::write(self.path(name), text).expect("saved");
    }

    /// The next event that is no growth of a file.
    fn event(&mut self, wait: Duration) -> Event {
        event(&mut self.source, wait)
    }

    fn taken(&mut self) -> Taken {
        match self.event(LONG) {
            Event::Sweep(taken) => taken,
            other => panic!("{other:?}"),
        }
    }

    fn nothing(&mut self) {
        assert_eq!(self.event(SHORT), Event::Nothing);
    }
}

fn event(source: &mut dyn Source, wait: Duration) -> Event {
    let end = Instant::now() + wait;
    loop {
        match source.next(end.saturating_duration_since(Instant::now())) {
            Ok(Event::Arriving { .. }) => {}
            Ok(event) => return event,
            Err(trouble) => panic!("{trouble}"),
        }
    }
}

fn halves(text: &str) -> (&str, &str) {
    let lines: Vec<usize> = text.match_indices('\n').map(|(at, _)| at + 1).collect();
    text.split_at(lines[lines.len() / 2])
}

#[test]
fn a_saved_sweep_comes_whole_with_its_name() {
    for open in BOTH {
        for more in ["", KNOWN] {
            let mut bench = Bench::new(open, more);
            let text = sweep(1);
            bench.save("Messung 017.CSV", &text);
            let taken = bench.taken();
            assert_eq!(taken.name, "Messung 017.CSV");
            assert_eq!(taken.extension, "csv");
            assert_eq!(taken.bytes, text.as_bytes());
            assert_eq!(taken.replaces, None);
            assert_eq!(taken.seen.bytes, text.len() as u64);
            bench.nothing();
        }
    }
}

#[cfg(target_os = "linux")]
#[test]
fn a_closed_sweep_of_the_length_of_the_one_before_is_proven_whole() {
    let mut bench = Bench::new(Folder::open, "");
    bench.save("1.csv", &sweep(1));
    assert_eq!(bench.taken().proof, Proof::Settled);
    bench.save("2.csv", &sweep(2));
    assert_eq!(bench.taken().proof, Proof::ClosedAndWhole);
}

#[test]
fn a_sweep_that_grows_in_bursts_is_waited_for() {
    for open in BOTH {
        let mut bench = Bench::new(open, KNOWN);
        let text = sweep(1);
        let (first, second) = halves(&text);
        bench.save("1.csv", first);
        bench.nothing();
        let path = bench.path("1.csv");
        let append = |piece: &str| {
            let mut file = OpenOptions::new().append(true).open(&path)?;
            file.write_all(piece.as_bytes())
        };
        // A second burst that ends within a number.
        let cut = second.len() - 5;
        append(&second[..cut]).expect("appended");
        assert_eq!(event(&mut bench.source, SHORT), Event::Nothing);
        append(&second[cut..]).expect("appended");
        assert_eq!(bench.taken().bytes, text.as_bytes());
        bench.nothing();
    }
}

#[cfg(target_os = "linux")]
#[test]
fn a_file_that_its_writer_keeps_open_is_waited_for() {
    let mut bench = Bench::new(Folder::open, ", settle: 10 ms");
    let text = sweep(1);
    let (first, second) = halves(&text);
    let mut file = File::create(bench.path("1.csv")).expect("made");
    file.write_all(first.as_bytes()).expect("written");
    bench.nothing();
    file.write_all(second.as_bytes()).expect("written");
    drop(file);
    assert_eq!(bench.taken().bytes, text.as_bytes());
    bench.nothing();
}

#[test]
fn a_temporary_name_is_left_alone_and_the_final_one_taken() {
    for open in BOTH {
        for temporary in ["1.csv.tmp", ".1.csv", "~1.csv", "1.part"] {
            let mut bench = Bench::new(open, ", pattern: \"*.csv\", settle: 10 ms");
            bench.save(temporary, &sweep(1));
            bench.nothing();
            fs::rename(bench.path(temporary), bench.path("1.csv")).expect("renamed");
            assert_eq!(bench.taken().name, "1.csv");
            bench.nothing();
        }
    }
}

#[test]
fn a_sweep_renamed_after_it_was_taken_is_not_a_second_one() {
    for open in BOTH {
        for points in [POINTS, 3] {
            let mut bench = Bench::new(open, ", settle: 10 ms");
            bench.save("scan.csv", &sweep_of(points, 1));
            assert_eq!(bench.taken().name, "scan.csv");
            fs::rename(bench.path("scan.csv"), bench.path("017.csv")).expect("renamed");
            bench.nothing();
        }
    }
}

#[test]
fn a_file_made_empty_is_waited_for() {
    for open in BOTH {
        let mut bench = Bench::new(open, ", settle: 0 s");
        bench.save("1.csv", "");
        bench.nothing();
        bench.save("1.csv", &sweep(1));
        assert_eq!(bench.taken().bytes, sweep(1).as_bytes());
    }
}

#[test]
fn a_name_that_is_used_again_gives_a_second_sweep() {
    for open in BOTH {
        let mut bench = Bench::new(open, ", settle: 20 ms");
        for seed in 1..4 {
            bench.save("sweep.csv", &sweep(seed));
            let taken = bench.taken();
            assert_eq!(taken.bytes, sweep(seed).as_bytes());
            assert_eq!(taken.replaces, None);
        }
        bench.nothing();
    }
}

#[cfg(target_os = "linux")]
#[test]
fn a_file_overwritten_in_place_is_never_half_the_old_and_half_the_new() {
    let mut bench = Bench::new(Folder::open, "");
    let (old, new) = (sweep(1), sweep(2));
    assert_eq!(old.len(), new.len());
    bench.save("sweep.csv", &old);
    bench.taken();
    let mut file = OpenOptions::new()
        .write(true)
        .open(bench.path("sweep.csv"))
        .expect("opened");
    file.rewind().expect("at the start");
    let (first, second) = halves(&new);
    file.write_all(first.as_bytes()).expect("written");
    file.flush().expect("flushed");
    bench.nothing();
    file.write_all(second.as_bytes()).expect("written");
    drop(file);
    assert_eq!(bench.taken().bytes, new.as_bytes());
}

#[test]
fn a_sweep_taken_too_early_is_replaced_when_it_goes_on() {
    // Nothing is known of the length, no notice of closing: a pause longer than `settle` deceives.
    let mut bench = Bench::new(Folder::open_by_listing, ", settle: 0 s");
    let text = sweep(1);
    let (first, _) = halves(&text);
    bench.save("1.csv", first);
    let early = bench.taken();
    assert_eq!(early.bytes, first.as_bytes());
    bench.save("1.csv", &text);
    let whole = bench.taken();
    assert_eq!(whole.bytes, text.as_bytes());
    assert_eq!(whole.replaces, early.seen.sha256);
}

#[test]
fn times_kept_from_another_day_do_not_hide_a_file() {
    for open in BOTH {
        let mut bench = Bench::new(open, "");
        let path = bench.path("1.csv");
        let mut file = File::create(&path).expect("made");
        file.write_all(sweep(1).as_bytes()).expect("written");
        file.set_modified(UNIX_EPOCH + Duration::from_secs(1_000_000_000))
            .expect("set");
        drop(file);
        assert_eq!(bench.taken().name, "1.csv");
        bench.nothing();
    }
}

#[test]
fn what_was_there_before_is_old_and_said_to_be() {
    for open in BOTH {
        let folder = TempDir::new().expect("a folder");
        for i in 0..3 {
            fs::write(folder.path().join(format!("{i}.csv")), sweep(i)).expect("saved");
        }
        fs::write(folder.path().join("readme.txt"), "words").expect("saved");
        let mut source = open(folder.path(), &watch(""), &station(""), None).expect("a source");
        let names: Vec<&str> = source.baseline().iter().map(|s| s.name.as_str()).collect();
        assert_eq!(names.len(), 3, "{names:?}");
        assert_eq!(event(&mut source, SHORT), Event::Nothing);
        // An old file that is written again is a new sweep.
        fs::write(folder.path().join("1.csv"), sweep(9)).expect("saved");
        match event(&mut source, LONG) {
            Event::Sweep(taken) => assert_eq!(taken.bytes, sweep(9).as_bytes()),
            other => panic!("{other:?}"),
        }
    }
}

#[test]
fn after_an_interruption_only_what_came_meanwhile_is_given() {
    for open in BOTH {
        let folder = TempDir::new().expect("a folder");
        let save =
            |name: &str, seed| fs::write(folder.path().join(name), sweep(seed)).expect("saved");
        save("old.csv", 1);
        let (watch, station) = (watch(", settle: 20 ms"), station(""));
        let mut source = open(folder.path(), &watch, &station, None).expect("a source");
        let mut kept = source.baseline().to_vec();
        save("1.csv", 2);
        match event(&mut source, LONG) {
            Event::Sweep(taken) => kept.push(taken.seen),
            other => panic!("{other:?}"),
        }
        drop(source);
        save("2.csv", 3);
        save("old.csv", 4);
        // What is kept survives its way through a journal.
        let text = serde_json::to_string(&kept).expect("JSON");
        let kept: Vec<Seen> = serde_json::from_str(&text).expect("the same");
        let mut source = open(folder.path(), &watch, &station, Some(&kept)).expect("a source");
        let mut names: Vec<String> = (0..2)
            .map(|_| match event(&mut source, LONG) {
                Event::Sweep(taken) => taken.name,
                other => panic!("{other:?}"),
            })
            .collect();
        names.sort();
        assert_eq!(names, ["2.csv", "old.csv"]);
        assert_eq!(event(&mut source, SHORT), Event::Nothing);
    }
}

#[test]
fn the_same_sweep_saved_under_another_name_is_no_measurement() {
    for open in BOTH {
        let mut bench = Bench::new(open, "");
        bench.save("017.csv", &sweep(1));
        bench.taken();
        bench.save("018.csv", &sweep(1));
        match bench.event(LONG) {
            Event::Ignored { name, why } => {
                assert_eq!(name, "018.csv");
                assert!(why.contains("017.csv"), "{why}");
            }
            other => panic!("{other:?}"),
        }
        bench.nothing();
    }
}

#[test]
fn a_few_rounded_numbers_may_come_out_the_same_for_two_parts() {
    for open in BOTH {
        let mut bench = Bench::new(open, ", settle: 20 ms");
        for name in ["017.csv", "018.csv"] {
            bench.save(name, &sweep_of(3, 1));
            assert_eq!(bench.taken().name, name);
        }
        bench.nothing();
    }
}

#[test]
fn a_file_touched_or_read_by_others_is_not_given_again() {
    for open in BOTH {
        let mut bench = Bench::new(open, "");
        bench.save("1.csv", &sweep(1));
        bench.taken();
        fs::read(bench.path("1.csv")).expect("read");
        let rights = fs::metadata(bench.path("1.csv"))
            .expect("there")
            .permissions();
        fs::set_permissions(bench.path("1.csv"), rights).expect("set");
        bench.nothing();
        let file = OpenOptions::new()
            .append(true)
            .open(bench.path("1.csv"))
            .expect("opened");
        file.set_modified(UNIX_EPOCH + Duration::from_secs(1_700_000_000))
            .expect("set");
        drop(file);
        match bench.event(LONG) {
            Event::Ignored { why, .. } => assert!(why.contains("same bytes"), "{why}"),
            other => panic!("{other:?}"),
        }
        bench.nothing();
    }
}

#[test]
fn a_short_sweep_is_refused_with_its_number_of_points_and_the_next_such_taken() {
    let mut bench = Bench::new(Folder::open, "");
    bench.save("1.csv", &sweep(1));
    bench.taken();
    bench.save("2.csv", &sweep_of(40, 2));
    match bench.event(LONG) {
        Event::Refused { name, why } => {
            assert_eq!((name.as_str(), why.code), ("2.csv", "sweep_unfinished"));
            assert!(
                why.text.contains("40 points") && why.text.contains("60"),
                "{why}"
            );
        }
        other => panic!("{other:?}"),
    }
    // Set so on purpose: the next one comes with the same length.
    bench.save("3.csv", &sweep_of(40, 3));
    assert_eq!(bench.taken().name, "3.csv");
}

#[test]
fn what_is_no_sweep_is_ignored_with_a_word() {
    for open in BOTH {
        let mut bench = Bench::new(open, ", pattern: \"*.csv\"");
        bench.save("photo.png", "PNG");
        bench.save("other.txt", &sweep(1));
        fs::create_dir(bench.path("inner")).expect("made");
        let mut words = Vec::new();
        for _ in 0..3 {
            match bench.event(LONG) {
                Event::Ignored { name, why } => words.push((name, why)),
                other => panic!("{other:?}"),
            }
        }
        words.sort();
        assert_eq!(words[0].0, "inner");
        assert!(
            words[1].0 == "other.txt" && words[1].1.contains("pattern"),
            "{words:?}"
        );
        assert!(
            words[2].0 == "photo.png" && words[2].1.contains("not a sweep"),
            "{words:?}"
        );
        bench.nothing();
    }
}

#[test]
fn what_does_not_read_as_a_sweep_is_given_for_its_faults_to_be_said() {
    for open in BOTH {
        let mut bench = Bench::new(open, "");
        bench.save("1.csv", "Frequency (Hz);Cs (F)\n1000;1e-9\n");
        let taken = bench.taken();
        assert_eq!(taken.proof, Proof::Unreadable);
        bench.nothing();
    }
}

#[test]
fn a_deleted_file_is_not_missed() {
    for open in BOTH {
        let mut bench = Bench::new(open, KNOWN);
        bench.save("1.csv", halves(&sweep(1)).0);
        bench.nothing();
        fs::remove_file(bench.path("1.csv")).expect("removed");
        match bench.event(SHORT * 10) {
            Event::Ignored { name, why } => {
                assert!(name == "1.csv" && why.contains("deleted"), "{why}");
            }
            other => panic!("{other:?}"),
        }
        bench.save("2.csv", &sweep(2));
        assert_eq!(bench.taken().name, "2.csv");
    }
}

#[cfg(target_os = "linux")]
#[test]
fn a_file_that_cannot_be_read_is_said_and_taken_when_it_can() {
    for open in BOTH {
        let mut bench = Bench::new(open, "");
        // Rights do not keep the superuser out; reading address 0 of a process fails for everybody.
        std::os::unix::fs::symlink("/proc/self/mem", bench.path("1.csv")).expect("made");
        match bench.event(LONG) {
            Event::Refused { name, why } => {
                assert_eq!((name.as_str(), why.code), ("1.csv", "file_unreadable"));
            }
            other => panic!("{other:?}"),
        }
        fs::remove_file(bench.path("1.csv")).expect("removed");
        bench.save("1.csv", &sweep(1));
        assert_eq!(bench.taken().bytes, sweep(1).as_bytes());
        bench.nothing();
    }
}

#[test]
fn a_locked_file_is_waited_for() {
    for open in BOTH {
        let mut bench = Bench::new(open, ", settle: 10 ms");
        let mut file = File::create(bench.path("1.csv")).expect("made");
        file.lock().expect("locked");
        file.write_all(sweep(1).as_bytes()).expect("written");
        match bench.event(LONG) {
            Event::Refused { why, .. } => assert_eq!(why.code, "file_locked"),
            other => panic!("{other:?}"),
        }
        drop(file);
        assert_eq!(bench.taken().name, "1.csv");
        bench.nothing();
    }
}

#[test]
fn a_folder_that_vanishes_is_told_and_found_again() {
    for open in BOTH {
        let outer = TempDir::new().expect("a folder");
        let (inner, away) = (outer.path().join("sweeps"), outer.path().join("away"));
        fs::create_dir(&inner).expect("made");
        let mut source =
            open(&inner, &watch(", settle: 10 ms"), &station(""), None).expect("a source");
        fs::write(inner.join("1.csv"), sweep(1)).expect("saved");
        assert!(matches!(event(&mut source, LONG), Event::Sweep(_)));
        for again in 0..2 {
            fs::rename(&inner, &away).expect("away");
            match event(&mut source, LONG) {
                Event::Lost(trouble) => assert_eq!(trouble.code, "folder_missing"),
                other => panic!("{other:?}"),
            }
            // The same folder comes back, then another one with copies of the files.
            if again == 0 {
                fs::rename(&away, &inner).expect("back");
            } else {
                fs::create_dir(&inner).expect("made");
                for i in 1..=2 {
                    let name = format!("{i}.csv");
                    fs::copy(away.join(&name), inner.join(&name)).expect("copied");
                    let old = fs::metadata(away.join(&name))
                        .and_then(|m| m.modified())
                        .expect("a time");
                    let file = OpenOptions::new()
                        .append(true)
                        .open(inner.join(&name))
                        .expect("opened");
                    file.set_modified(old).expect("set");
                }
            }
            assert!(matches!(event(&mut source, LONG), Event::Recovered(_)));
            let name = format!("{}.csv", again + 2);
            fs::write(inner.join(&name), sweep(again + 2)).expect("saved");
            match event(&mut source, LONG) {
                Event::Sweep(taken) => assert_eq!(taken.name, name),
                other => panic!("{other:?}"),
            }
            assert_eq!(event(&mut source, SHORT), Event::Nothing);
        }
    }
}

#[test]
fn a_folder_that_is_not_there_says_what_to_do() {
    let folder = TempDir::new().expect("a folder");
    let open = |path: &Path| Folder::open(path, &watch(""), &station(""), None).err();
    let trouble = open(&folder.path().join("nowhere")).expect("a trouble");
    assert_eq!(trouble.code, "folder_missing");
    assert!(trouble.remedy.contains("station file"), "{trouble}");
    fs::write(folder.path().join("file"), "").expect("saved");
    assert_eq!(
        open(&folder.path().join("file")).map(|t| t.code),
        Some("folder_missing")
    );
}

#[test]
fn touchstone_files_are_taken_with_their_extension() {
    let mut bench = Bench::new(Folder::open, ", settle: 20 ms");
    let text = "# Hz S RI R 50\n1000 0.9 -0.1\n2000 0.8 -0.2\n3000 0.7 -0.3\n";
    bench.save("017.S1P", text);
    assert_eq!(bench.taken().extension, "s1p");
}
