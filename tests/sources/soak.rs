//! Many files, saved in every way at once: none missed, none twice.

use crate::made::{station, sweep, watch};
use reelgate::bench::source::{Event, Folder, Source};
use std::collections::BTreeMap;
use std::fs::{self, File, OpenOptions};
use std::io::Write;
use std::path::Path;
use std::time::{Duration, Instant};
use tempfile::TempDir;

/// How many files; `tests/tools/soak_sources` asks for more.
fn count() -> u64 {
    let asked = std::env::var("REELGATE_SOAK").ok();
    asked.and_then(|text| text.parse().ok()).unwrap_or(300)
}

/// Saves sweep `i` in one of the ways that programs have.
fn save(folder: &Path, i: u64) -> std::io::Result<()> {
    let text = sweep(i);
    let path = folder.join(format!("{i:06}.csv"));
    let pause = || std::thread::sleep(Duration::from_micros(300));
    match i % 6 {
        0 => fs::write(&path, text),
        1 => {
            let temporary = folder.join(format!("{i}.tmp"));
            fs::write(&temporary, text)?;
            fs::rename(temporary, path)
        }
        2 => {
            let mut file = File::create(&path)?;
            for piece in text.as_bytes().chunks(997) {
                file.write_all(piece)?;
                pause();
            }
            Ok(())
        }
        3 => {
            for piece in text.as_bytes().chunks(1499) {
                let mut file = OpenOptions::new().create(true).append(true).open(&path)?;
                file.write_all(piece)?;
                drop(file);
                pause();
            }
            Ok(())
        }
        4 => {
            File::create(&path)?;
            pause();
            fs::write(&path, text)
        }
        _ => {
            // A copying program: contents, then the times of the original.
            let mut file = File::create(&path)?;
            file.write_all(text.as_bytes())?;
            file.set_modified(std::time::UNIX_EPOCH + Duration::from_secs(1_600_000_000 + i))
        }
    }
}

#[test]
fn none_is_missed_and_none_taken_twice() {
    let count = count();
    for by_listing in [false, true] {
        let folder = TempDir::new().expect("a folder");
        let open = if by_listing {
            Folder::open_by_listing
        } else {
            Folder::open
        };
        let watch = watch(", points: 60");
        let mut source = open(folder.path(), &watch, &station(""), None).expect("a source");
        let path = folder.path().to_owned();
        let writer = std::thread::spawn(move || {
            for i in 0..count {
                save(&path, i).expect("saved");
            }
        });
        let began = Instant::now();
        let mut times: BTreeMap<String, u32> = BTreeMap::new();
        let mut bytes = 0;
        loop {
            // After the last one some more time for one that comes twice.
            let all = times.len() as u64 == count;
            let wait = Duration::from_secs(if all { 1 } else { 60 });
            match source.next(wait).expect("no trouble") {
                Event::Sweep(taken) => {
                    let number: u64 = taken
                        .name
                        .trim_end_matches(".csv")
                        .parse()
                        .expect("a number");
                    assert_eq!(taken.bytes, sweep(number).as_bytes(), "{}", taken.name);
                    bytes += taken.bytes.len();
                    *times.entry(taken.name).or_default() += 1;
                }
                Event::Arriving { .. } => {}
                Event::Nothing => break,
                other => panic!("{other:?}"),
            }
        }
        writer.join().expect("the writer");
        assert_eq!(times.len() as u64, count, "files taken");
        let twice: Vec<_> = times.iter().filter(|(_, n)| **n != 1).collect();
        assert!(twice.is_empty(), "{twice:?}");
        if std::env::var_os("REELGATE_SOAK").is_some() {
            let way = if by_listing {
                "listing"
            } else {
                "notifications"
            };
            let seconds = began.elapsed().as_secs_f64();
            let mut out = std::io::stderr();
            writeln!(
                out,
                "{way}: {count} files, {bytes} bytes, none missed, none twice, {seconds:.1} s"
            )
            .expect("said");
        }
    }
}

/// Sweeps as they come at a bench: one saved, taken, judged, the next one. With `REELGATE_SOAK` it
/// says how long it takes from the closed file to the sweep in hand, beside reading the same file.
#[test]
fn one_after_the_other_each_is_taken_before_the_next_is_saved() {
    let count = count().min(1000);
    let folder = TempDir::new().expect("a folder");
    let watch = watch(", points: 60");
    let mut source = Folder::open(folder.path(), &watch, &station(""), None).expect("a source");
    let mut taken_after = Vec::new();
    let mut read_in = Vec::new();
    for i in 0..count {
        let path = folder.path().join(format!("{i:06}.csv"));
        fs::write(&path, sweep(i)).expect("saved");
        let saved = Instant::now();
        loop {
            match source.next(Duration::from_secs(60)).expect("no trouble") {
                Event::Sweep(taken) => {
                    assert_eq!(taken.bytes, sweep(i).as_bytes());
                    break;
                }
                Event::Arriving { .. } => {}
                other => panic!("{other:?}"),
            }
        }
        taken_after.push(saved.elapsed());
        let began = Instant::now();
        fs::read(&path).expect("read");
        read_in.push(began.elapsed());
    }
    if std::env::var_os("REELGATE_SOAK").is_some() {
        taken_after.sort();
        read_in.sort();
        let at = |times: &[Duration], share: f64| {
            times[(times.len() as f64 * share) as usize].as_secs_f64() * 1e3
        };
        let (median, late) = (at(&taken_after, 0.5), at(&taken_after, 0.99));
        let floor = at(&read_in, 0.5);
        writeln!(
            std::io::stderr(),
            "{count} files, one after the other: {median:.2} ms in the median, {late:.2} ms for 99 of 100; \
             reading the file {floor:.3} ms: ratios {:.0} and {:.0}",
            median / floor,
            late / floor
        )
        .expect("said");
    }
}
