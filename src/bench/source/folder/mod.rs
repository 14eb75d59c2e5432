//! Sweeps that an analyser's own software saves in a folder.
//!
//! Notifications of the file system say when to look; where none come (network shares) the folder is
//! listed again and again. Nothing is believed because it was told: a file is given when it was read
//! and found whole (`decide`), and only once (`known`).

mod decide;
mod file;
mod known;
mod listing;
mod look;
mod notice;
mod pattern;
mod whole;

use super::{Event, Seen, Source, Taken, Trouble};
use crate::diagnostic::excerpt;
use crate::ledger::{disk, hex, sha256};
use crate::station::{Station, Watch};
use crate::sweep::{self, RawFile};
use decide::{Decision, PATIENCE, decide};
use file::{File, Given, Read};
use known::Known;
use look::Look;
use notice::{Notice, Notices, TELLS_CLOSING};
use std::collections::{BTreeMap, BTreeSet, VecDeque};
use std::ffi::{OsStr, OsString};
use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};
use whole::{Expected, Shape};

/// How often the folder is listed where notifications cannot be relied upon.
const OFTEN: Duration = Duration::from_millis(200);

/// How often it is listed beside notifications that have missed nothing so far.
const SELDOM: Duration = Duration::from_secs(1);

/// A listing takes at most this share of the time: one part in twenty.
const SHARE: u32 = 20;

/// How many sweeps wait to be fetched before no more are read.
const AT_HAND: usize = 16;

/// Two sweeps of so many points are never the same to the last byte by chance: noise is in each.
const NEVER_TWICE: usize = 20;

/// A folder that is watched for sweeps.
pub struct Folder {
    path: PathBuf,
    watch: Watch,
    station: Station,
    settle: Duration,
    expected: Expected,
    /// Whether the file system can be asked for locks.
    locks: bool,
    notices: Notices,
    /// Whether a listing has found what no notification had told.
    missed: bool,
    files: BTreeMap<OsString, File>,
    /// Files that may become sweeps.
    active: BTreeSet<OsString>,
    /// Other names, since when they are there, and whether that was said.
    others: BTreeMap<OsString, (Instant, bool)>,
    known: Known,
    baseline: Vec<Seen>,
    /// Shapes that were refused as too short, with the digest of the file.
    refused: Vec<(Shape, crate::ledger::Hash)>,
    lost: bool,
    identity: Option<(u64, u64)>,
    listings: u64,
    next_listing: Instant,
    ready: VecDeque<Event>,
}

impl Folder {
    /// Begins to watch.
    ///
    /// `known` is `None` for a new run: what is in the folder now is old, and [`Folder::baseline`]
    /// says what that was. For a run that goes on it is that list and [`Taken::seen`] of every sweep
    /// the run has had: what came meanwhile is given.
    ///
    /// # Errors
    /// There is no such folder, or it cannot be listed.
    pub fn open(
        path: &Path,
        watch: &Watch,
        station: &Station,
        known: Option<&[Seen]>,
    ) -> Result<Folder, Trouble> {
        Folder::with(path, watch, station, known, Notices::of(path))
    }

    /// The same without notifications: as on a network share that tells of none.
    ///
    /// # Errors
    /// As with [`Folder::open`].
    pub fn open_by_listing(
        path: &Path,
        watch: &Watch,
        station: &Station,
        known: Option<&[Seen]>,
    ) -> Result<Folder, Trouble> {
        Folder::with(path, watch, station, known, Notices::none())
    }

    fn with(
        path: &Path,
        watch: &Watch,
        station: &Station,
        known: Option<&[Seen]>,
        notices: Notices,
    ) -> Result<Folder, Trouble> {
        let now = Instant::now();
        let remote = disk::unfit_for_locks(path).ok().flatten().is_some();
        let mut folder = Folder {
            path: path.to_owned(),
            settle: Duration::from_secs_f64(watch.settle.clamp(0.0, 3600.0)),
            expected: Expected {
                points: watch.points.map(|n| n as usize),
                learned: None,
            },
            watch: watch.clone(),
            station: station.clone(),
            locks: !remote,
            missed: remote || !notices.are_there() || !TELLS_CLOSING,
            notices,
            files: BTreeMap::new(),
            active: BTreeSet::new(),
            others: BTreeMap::new(),
            known: Known::of(known.unwrap_or_default()),
            baseline: Vec::new(),
            refused: Vec::new(),
            lost: false,
            identity: listing::identity(path),
            listings: 0,
            next_listing: now,
            ready: VecDeque::new(),
        };
        let entries = listing::list(path).map_err(|error| folder.missing(&error))?;
        for entry in entries {
            let Some(stamp) = entry.stamp.filter(|_| folder.is_candidate(&entry.name)) else {
                // Was there before: nothing to say about it.
                folder.others.insert(entry.name, (now, true));
                continue;
            };
            let mut file = File::new(stamp, now);
            let name = entry.name.to_string_lossy().into_owned();
            match known {
                None => {
                    file.old = true;
                    folder.baseline.push(Seen {
                        name,
                        bytes: stamp.bytes,
                        modified: stamp.modified,
                        sha256: None,
                    });
                }
                Some(_) => match folder.known.by_stamp(&name, &stamp) {
                    Some(given) => {
                        file.old = given.is_none();
                        file.given = given;
                    }
                    None => {
                        file.old = folder.known.has_name(&name);
                        folder.active.insert(entry.name.clone());
                    }
                },
            }
            folder.files.insert(entry.name, file);
        }
        folder.learn_from_the_last();
        Ok(folder)
    }

    /// What was in the folder when a new run began: to be kept with the run.
    pub fn baseline(&self) -> &[Seen] {
        &self.baseline
    }

    fn missing(&self, error: &std::io::Error) -> Trouble {
        use std::io::ErrorKind::{NotADirectory, NotFound, PermissionDenied};
        let place = excerpt_of(&self.path);
        let (code, text, remedy) = match error.kind() {
            NotFound => (
                "folder_missing",
                format!("the folder {place} is not there"),
                "connect the network drive, or correct `watch` in the station file",
            ),
            NotADirectory => (
                "folder_missing",
                format!("{place} is a file, not a folder"),
                "correct `watch` in the station file",
            ),
            PermissionDenied => (
                "folder_not_allowed",
                format!("the folder {place} may not be read"),
                "ask for the right to read it",
            ),
            _ => (
                "folder_unreadable",
                format!("the folder {place} cannot be read ({error})"),
                "check the network and the analyser's computer",
            ),
        };
        Trouble::new(code, text, remedy)
    }

    /// Whether a name is one of a sweep.
    fn is_candidate(&self, name: &OsStr) -> bool {
        let name = name.to_string_lossy();
        if self.watch.patterns.is_empty() {
            return sweep::is_sweep_file(&name);
        }
        let hidden = name.starts_with(['.', '~', '#']) || name.ends_with('~');
        let fits = |pattern: &String| pattern::fits(pattern, &name);
        !hidden && self.watch.patterns.iter().any(fits)
    }

    /// After an interruption: the last sweep given says how long the next ones are.
    fn learn_from_the_last(&mut self) {
        let given = |(name, file): (&OsString, &File)| {
            file.given.map(|g| (g.modified, name.clone(), g.sha256))
        };
        let Some((_, name, digest)) = self.files.iter().filter_map(given).max() else {
            return;
        };
        if let Look::Bytes(bytes, _) = look::read(&self.path.join(&name), self.locks)
            && sha256(&bytes) == digest
        {
            self.expected.learned = self.shape(&name, bytes).1;
        }
    }

    fn shape(&self, name: &OsStr, bytes: Vec<u8>) -> (Vec<u8>, Option<Shape>) {
        let file = RawFile {
            name: name.to_string_lossy().into_owned(),
            bytes,
        };
        let shape = Shape::of(&file, &self.station);
        (file.bytes, shape)
    }

    fn notice(&mut self, notice: Notice, now: Instant) {
        let name = match &notice {
            Notice::Everything => {
                self.next_listing = now;
                return;
            }
            Notice::Made(name)
            | Notice::Written(name)
            | Notice::Finished(name)
            | Notice::Look(name) => name.clone(),
        };
        let stamp = match listing::stamp(&self.path.join(&name)) {
            Some(stamp) => stamp,
            None => {
                self.gone(&name);
                return;
            }
        };
        if !self.is_candidate(&name) {
            self.others.entry(name).or_insert((now, false));
            return;
        }
        let file = self
            .files
            .entry(name.clone())
            .or_insert_with(|| File::new(stamp, now));
        let changed = file.stamp != stamp;
        file.stamp = stamp;
        match notice {
            Notice::Written(_) => {
                file.closed = false;
                file.writing = TELLS_CLOSING;
            }
            Notice::Finished(_) => {
                file.closed = true;
                file.writing = false;
            }
            Notice::Made(_) => file.closed = false,
            // A look alone (times, rights) is a change only where the stamp says so.
            Notice::Look(_) if !changed => return,
            Notice::Look(_) | Notice::Everything => {}
        }
        file.change(now);
        self.active.insert(name);
    }

    fn gone(&mut self, name: &OsStr) {
        self.others.remove(name);
        let Some(file) = self.files.remove(name) else {
            return;
        };
        if self.active.remove(name) && file.arriving > 0 && !self.is_elsewhere(&file) {
            self.ready.push_back(Event::Ignored {
                name: shown(name),
                why: "it was deleted before it was complete: measure again".to_owned(),
            });
        }
    }

    /// Whether a file that is gone has got another name.
    fn is_elsewhere(&self, file: &File) -> bool {
        let inode = file.stamp.inode;
        inode != 0 && self.files.values().any(|other| other.stamp.inode == inode)
    }

    /// Lists the folder and takes in what has changed.
    fn list(&mut self) {
        let began = Instant::now();
        match listing::list(&self.path) {
            Ok(entries) => {
                if self.lost || self.identity != listing::identity(&self.path) {
                    self.watch_anew();
                }
                self.take_in(entries, began);
            }
            Err(error) => {
                if !self.lost {
                    self.lost = true;
                    let trouble = self.missing(&error);
                    self.ready.push_back(Event::Lost(trouble));
                }
            }
        }
        let usual = if self.missed || self.lost {
            OFTEN
        } else {
            SELDOM
        };
        let now = Instant::now();
        self.next_listing = now + usual.max((now - began) * SHARE);
    }

    /// The folder is another one than was watched so far, or there again.
    fn watch_anew(&mut self) {
        if self.notices.are_there() || !self.missed {
            self.notices = Notices::of(&self.path);
        }
        self.identity = listing::identity(&self.path);
        if std::mem::take(&mut self.lost) {
            let place = excerpt_of(&self.path);
            let text = format!("the folder {place} is there again");
            self.ready.push_back(Event::Recovered(text));
        }
    }

    fn take_in(&mut self, entries: Vec<listing::Entry>, now: Instant) {
        self.listings += 1;
        let listing = self.listings;
        let before = self.files.len();
        let mut others = BTreeMap::new();
        let mut found = 0;
        for entry in entries {
            let Some(stamp) = entry.stamp.filter(|_| self.is_candidate(&entry.name)) else {
                let since = self.others.get(&entry.name).copied();
                others.insert(entry.name, since.unwrap_or((now, false)));
                continue;
            };
            found += 1;
            match self.files.get_mut(&entry.name) {
                Some(file) => {
                    file.listing = listing;
                    if file.stamp == stamp {
                        continue;
                    }
                    file.stamp = stamp;
                    file.closed = false;
                    file.change(now);
                }
                None => {
                    let mut file = File::new(stamp, now);
                    file.listing = listing;
                    self.files.insert(entry.name.clone(), file);
                }
            }
            self.active.insert(entry.name);
        }
        self.others = others;
        if found < self.files.len() || before > found {
            let left =
                |(name, file): (&OsString, &File)| (file.listing != listing).then(|| name.clone());
            let gone: Vec<OsString> = self.files.iter().filter_map(left).collect();
            for name in gone {
                // Made after the listing, perhaps.
                if listing::stamp(&self.path.join(&name)).is_none() {
                    self.gone(&name);
                }
            }
        }
    }

    /// Words on files that are no sweeps, once they have stayed for a while.
    fn tell_others(&mut self, now: Instant) {
        let path = &self.path;
        for (name, (since, told)) in &mut self.others {
            if *told || now.duration_since(*since) < decide::UNREADABLE {
                continue;
            }
            *told = true;
            let why = if path.join(name).is_dir() {
                "a folder; sweeps are looked for beside it, not inside"
            } else if sweep::is_sweep_file(&name.to_string_lossy()) {
                "its name does not fit `pattern` in the station file"
            } else {
                "not a sweep file by its name"
            };
            self.ready.push_back(Event::Ignored {
                name: shown(name),
                why: why.to_owned(),
            });
        }
    }

    /// Looks at the files that may be whole by now; says when to look again.
    fn examine(&mut self, now: Instant) -> Option<Instant> {
        let mut order: Vec<(i64, OsString)> = Vec::with_capacity(self.active.len());
        for name in &self.active {
            if let Some(file) = self.files.get(name) {
                order.push((file.stamp.modified, name.clone()));
            }
        }
        order.sort_by(|a, b| {
            let (x, y) = (a.1.to_string_lossy(), b.1.to_string_lossy());
            a.0.cmp(&b.0).then_with(|| sweep::natural_order(&x, &y))
        });
        let mut next: Option<Instant> = None;
        for (_, name) in order {
            if self.ready.len() >= AT_HAND {
                return Some(now);
            }
            match self.examine_one(&name, now) {
                None => {
                    self.active.remove(&name);
                }
                Some(due) => next = Some(next.map_or(due, |n| n.min(due))),
            }
        }
        next
    }

    /// `None` where there is nothing more to do for this state of the file.
    fn examine_one(&mut self, name: &OsStr, now: Instant) -> Option<Instant> {
        let mut file = self.files.remove(name)?;
        let due = self.examine_file(name, &mut file, now);
        self.files.insert(name.to_owned(), file);
        due
    }

    fn examine_file(&mut self, name: &OsStr, file: &mut File, now: Instant) -> Option<Instant> {
        let read = match file.read.take() {
            Some(read) if read.version == file.version => read,
            _ => match self.read(name, file, now) {
                Ok(read) => read,
                Err(due) => return due,
            },
        };
        if let Some(due) = self.is_known(name, file, &read) {
            return due;
        }
        let again = read
            .shape
            .is_some_and(|shape| self.was_refused(&shape, &read));
        let state = file.state(&read, &self.expected, again, self.settle);
        match decide(&state) {
            Decision::Take(proof) => {
                if proof != super::Proof::ClosedAndWhole && !self.is_still(name, &read) {
                    file.change(now);
                    return Some(now);
                }
                self.give(name, file, read, proof);
                None
            }
            Decision::Refuse => {
                self.refuse(name, file, &read);
                None
            }
            Decision::Wait(needed) => {
                let due = file.changed + needed;
                self.arriving(name, file, read.bytes.len() as u64, now);
                file.read = Some(read);
                Some(due)
            }
        }
    }

    fn read(
        &mut self,
        name: &OsStr,
        file: &mut File,
        now: Instant,
    ) -> Result<Read, Option<Instant>> {
        let soon = Some(now + OFTEN.min(decide::QUICK));
        match look::read(&self.path.join(name), self.locks) {
            Look::Bytes(bytes, stamp) => {
                file.barred = None;
                if stamp != file.stamp {
                    file.stamp = stamp;
                    file.change(now);
                }
                let digest = sha256(&bytes);
                let (bytes, shape) = self.shape(name, bytes);
                Ok(Read {
                    version: file.version,
                    stamp,
                    bytes,
                    sha256: digest,
                    shape,
                })
            }
            Look::Changing => {
                file.change(now);
                let bytes = file.stamp.bytes;
                self.arriving(name, file, bytes, now);
                Err(soon)
            }
            // The next notice or listing says so.
            Look::Gone => Err(None),
            Look::TooLong(bytes) => {
                let text = format!("{} has {bytes} bytes", shown(name));
                let remedy = "a sweep is smaller: check what the analyser saves";
                self.told(name, file, Trouble::new("file_too_long", text, remedy));
                Err(None)
            }
            Look::Locked => {
                let text = format!("{} is kept locked by another program", shown(name));
                let remedy = "close the file in the analyser's software";
                self.barred(name, file, Trouble::new("file_locked", text, remedy), now)
            }
            Look::Failed(error) => {
                let text = format!("{} cannot be read ({error})", shown(name));
                let remedy = "check the rights to the file and the network, or save it again";
                let trouble = Trouble::new("file_unreadable", text, remedy);
                self.barred(name, file, trouble, now)
            }
        }
    }

    /// A file that cannot be read now: tried again, and said when it lasts.
    fn barred(
        &mut self,
        name: &OsStr,
        file: &mut File,
        trouble: Trouble,
        now: Instant,
    ) -> Result<Read, Option<Instant>> {
        let since = *file.barred.get_or_insert(now);
        if now.duration_since(since) >= decide::UNREADABLE {
            self.told(name, file, trouble);
        }
        Err(Some(now + OFTEN))
    }

    /// Says that a file is refused, once for each of its states.
    fn told(&mut self, name: &OsStr, file: &mut File, why: Trouble) {
        if file.told != Some(file.version) {
            file.told = Some(file.version);
            let name = shown(name);
            self.ready.push_back(Event::Refused { name, why });
        }
    }

    fn arriving(&mut self, name: &OsStr, file: &mut File, bytes: u64, now: Instant) {
        let long = now.duration_since(file.since) >= decide::QUICK * 2;
        if long && bytes != file.arriving && bytes > 0 {
            file.arriving = bytes;
            let name = shown(name);
            self.ready.push_back(Event::Arriving { name, bytes });
        }
    }

    /// Whether the file holds a sweep that was given already: then there is nothing to do, or a
    /// word to say. The inner value is as that of `examine_one`.
    fn is_known(&mut self, name: &OsStr, file: &mut File, read: &Read) -> Option<Option<Instant>> {
        if let Some(given) = file.given.filter(|given| given.sha256 == read.sha256) {
            let points = read.shape.map_or(0, |shape| shape.points);
            if given.modified == read.stamp.modified {
                return Some(None);
            }
            if points < NEVER_TWICE {
                // A few rounded numbers can come out the same twice.
                return None;
            }
            file.given = Some(Given {
                modified: read.stamp.modified,
                ..given
            });
            self.ready.push_back(Event::Ignored {
                name: shown(name),
                why: "saved again with the same bytes: that is no new measurement".to_owned(),
            });
            return Some(None);
        }
        let (other, stamp) = self.known.by_digest(&read.sha256)?;
        let other = OsString::from(other);
        let same_time = stamp.modified == read.stamp.modified;
        let same_inode = stamp.inode != 0 && stamp.inode == read.stamp.inode;
        let gone = other == name || !self.files.contains_key(&other);
        if same_time && (same_inode || gone) {
            // The same file under another name, or back again.
            file.given = Some(Given {
                sha256: read.sha256,
                bytes: read.stamp.bytes,
                modified: read.stamp.modified,
            });
            return Some(None);
        }
        if read.shape.is_none_or(|shape| shape.points < NEVER_TWICE) {
            return None;
        }
        file.given = Some(Given {
            sha256: read.sha256,
            bytes: read.stamp.bytes,
            modified: read.stamp.modified,
        });
        self.ready.push_back(Event::Ignored {
            name: shown(name),
            why: format!(
                "the same to the last byte as {}, which was measured already: the analyser saved \
                 its last sweep again, or the file was copied; measure again",
                shown(&other)
            ),
        });
        Some(None)
    }

    /// Whether the file still holds what was read, byte for byte: some file systems show changes in
    /// the stamp late or not at all.
    fn is_still(&self, name: &OsStr, read: &Read) -> bool {
        matches!(look::read(&self.path.join(name), self.locks),
            Look::Bytes(bytes, _) if bytes == read.bytes)
    }

    fn was_refused(&self, shape: &Shape, read: &Read) -> bool {
        let same = |(other, digest): &(Shape, crate::ledger::Hash)| {
            other.is_as_long_as(shape) && *digest != read.sha256
        };
        self.refused.iter().any(same)
    }

    fn give(&mut self, name: &OsStr, file: &mut File, read: Read, proof: super::Proof) {
        if let Some(shape) = read.shape {
            self.expected.learned = Some(shape);
        }
        let text = name.to_string_lossy().into_owned();
        let bytes = read.bytes.len() as u64;
        let begins_with = |given: &Given| {
            let old = usize::try_from(given.bytes).ok();
            let start = old.and_then(|old| read.bytes.get(..old));
            given.bytes < bytes && start.is_some_and(|start| sha256(start) == given.sha256)
        };
        let replaces = file.given.filter(begins_with).map(|g| hex(&g.sha256));
        file.given = Some(Given {
            sha256: read.sha256,
            bytes,
            modified: read.stamp.modified,
        });
        file.since = Instant::now();
        file.arriving = 0;
        self.known.add(&text, read.sha256, read.stamp);
        let extension = match text.rsplit_once('.') {
            Some((_, extension)) if sweep::is_sweep_file(&text) => extension.to_ascii_lowercase(),
            _ => "csv".to_owned(),
        };
        self.ready.push_back(Event::Sweep(Taken {
            extension,
            proof,
            seen: Seen {
                name: text.clone(),
                bytes,
                modified: read.stamp.modified,
                sha256: Some(hex(&read.sha256)),
            },
            name: text,
            bytes: read.bytes,
            replaces,
        }));
    }

    fn refuse(&mut self, name: &OsStr, file: &mut File, read: &Read) {
        let shown = shown(name);
        let quiet = PATIENCE.max(self.settle).as_secs();
        let trouble = match read.shape {
            None => Trouble::new(
                "sweep_empty",
                format!("{shown} is empty, and nothing was written to it for {quiet} s"),
                "save the sweep again",
            ),
            Some(shape) => {
                self.refused.push((shape, read.sha256));
                Trouble::new(
                    "sweep_unfinished",
                    format!(
                        "{shown} has {} points ({}), and nothing was added for {quiet} s",
                        shape.points,
                        self.expected.words()
                    ),
                    "the sweep was stopped or the file cut off; measure and save it again. Where \
                     the analyser's settings were changed on purpose, the next sweep of this \
                     length is taken",
                )
            }
        };
        self.told(name, file, trouble);
    }
}

impl Source for Folder {
    fn place(&self) -> String {
        format!("the folder {}", excerpt_of(&self.path))
    }

    fn begin(&mut self, _stem: &str) -> Result<(), Trouble> {
        Ok(())
    }

    fn cancel(&mut self) {}

    fn next(&mut self, wait: Duration) -> Result<Event, Trouble> {
        let deadline = Instant::now() + wait;
        loop {
            let mut now = Instant::now();
            while let Some(notice) = self.notices.at_hand() {
                self.notice(notice, now);
            }
            if self.ready.is_empty() && now >= self.next_listing {
                let before = self.active.len();
                self.list();
                // Notices of what the listing shows may just be on their way.
                self.missed |= self.active.len() > before
                    && self.notices.at_hand().is_none_or(|n| {
                        self.notice(n, now);
                        false
                    });
                self.tell_others(now);
                now = Instant::now();
            }
            let mut due = None;
            if self.ready.is_empty() {
                due = self.examine(now);
            }
            if let Some(event) = self.ready.pop_front() {
                return Ok(event);
            }
            now = Instant::now();
            if now >= deadline {
                return Ok(Event::Nothing);
            }
            let until = due.map_or(deadline, |due| due.min(deadline));
            let until = until.min(self.next_listing);
            if let Some(notice) = self.notices.next(until.saturating_duration_since(now)) {
                self.notice(notice, Instant::now());
            }
        }
    }
}

/// A name fit to be shown.
fn shown(name: &OsStr) -> String {
    crate::diagnostic::printable(&name.to_string_lossy())
}

fn excerpt_of(path: &Path) -> String {
    let text = path.display().to_string();
    if text.chars().count() <= 80 {
        return crate::diagnostic::printable(&text);
    }
    excerpt(&text)
}
