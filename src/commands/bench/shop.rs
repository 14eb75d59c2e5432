//! What the site knows: limit files, stations, records, runs that wait.

use super::folder::peek;
use crate::bench::desk::Desk;
use crate::bench::event::Event;
use crate::bench::intake::Known;
use crate::bench::run::Demands;
use crate::bench::words;
use crate::commands::approvals;
use crate::commands::evidence;
use crate::commands::keep::{self, Place};
use crate::commands::signing::SigningArgs;
use crate::commands::site::{Site, text_file};
use crate::diagnostic::{self, printable};
use crate::ledger::trust::Trust;
use crate::ledger::{Act, Query};
use crate::limits::{self, Limits};
use crate::lot::{self, Switching};
use crate::record::{self, Sources};
use crate::station::{self, Station};
use crate::sweep::{RawFile, Standards};
use chrono::{DateTime, FixedOffset, NaiveDate};
use std::fs;
use std::path::{Path, PathBuf};

/// The site as the bench sees it.
pub struct Shop {
    #[allow(missing_docs)]
    pub root: PathBuf,
    #[allow(missing_docs)]
    pub site: Site,
    /// Where lot folders are made.
    pub lots: PathBuf,
    /// A time that stands still, where one was given.
    pub fixed: Option<DateTime<FixedOffset>>,
    /// Key that a new ledger begins with.
    pub key: Option<PathBuf>,
    #[allow(missing_docs)]
    pub witness: Option<PathBuf>,
    /// Who signs the PDF, where the site file does not say.
    pub signing: SigningArgs,
}

/// A run that was begun and not ended.
pub struct Waiting {
    #[allow(missing_docs)]
    pub lot: String,
    #[allow(missing_docs)]
    pub words: String,
}

/// Limit and station file in force, and what follows from them for a lot.
pub struct InForce {
    #[allow(missing_docs)]
    pub desk: Desk,
    #[allow(missing_docs)]
    pub demands: Demands,
    #[allow(missing_docs)]
    pub switching: Option<Switching>,
    #[allow(missing_docs)]
    pub limits_sha256: String,
    #[allow(missing_docs)]
    pub limits_path: PathBuf,
    /// Sentences about files that a person has to approve before a lot can be anything but held.
    pub unapproved: Vec<String>,
}

/// A station with the bytes that say what it is.
struct ReadStation {
    station: Station,
    standards: Option<Standards>,
    file: RawFile,
    /// Sweeps of the standards.
    compensation: Vec<RawFile>,
}

impl Shop {
    #[allow(missing_docs)]
    pub fn now(&self) -> DateTime<FixedOffset> {
        keep::now(self.fixed)
    }

    /// Where records are, for looking.
    pub fn place(&self) -> Place {
        Place {
            records: self.site.records(),
            certificates: self.site.certificates(),
            key: self.key.clone(),
            witness: self.witness.clone(),
            now: self.now(),
            signer: None,
        }
    }

    /// Where a record is kept, who is told of it and who signs its PDF, as the site file has it.
    ///
    /// # Errors
    /// Certificate or key that cannot sign now, in words.
    pub fn keeping(&self, rules: Option<&RawFile>) -> Result<Place, String> {
        let place = self.place();
        Ok(Place {
            witness: self.site.witness(self.witness.as_deref(), rules),
            signer: self.signing.signer(&self.site, rules, place.now)?,
            ..place
        })
    }

    /// The folder of the run of a lot that waits, or else one that is free: a lot that is measured once more
    /// gets a folder of its own.
    pub fn folder(&self, lot: &str) -> PathBuf {
        let named = |n: u32| match n {
            1 => self.lots.join(lot),
            n => self.lots.join(format!("{lot}~{n}")),
        };
        let waits = |path: &PathBuf| waiting(path).is_some_and(|w| w.lot == lot);
        // A journal that nothing was written to is that of a run that never began.
        let begun = |path: &PathBuf| {
            let empty = peek(path).is_some_and(|lines| lines.is_empty());
            path.exists() && (!empty || path.join("lot.yaml").exists())
        };
        let there = (1..).map(named).take_while(begun);
        let mut all: Vec<PathBuf> = there.collect();
        let free = named(all.len() as u32 + 1);
        all.retain(waits);
        all.pop().unwrap_or(free)
    }

    /// Runs that were begun and not ended, by lot number.
    pub fn waiting(&self) -> Vec<Waiting> {
        let entries = fs::read_dir(&self.lots).into_iter().flatten().flatten();
        let mut folders: Vec<PathBuf> = entries.map(|e| e.path()).collect();
        folders.sort();
        folders.iter().filter_map(|path| waiting(path)).collect()
    }

    /// What is in force for a part on a station.
    ///
    /// # Errors
    /// In words: files that are missing or not valid, no plan for the quantity.
    pub fn in_force(
        &self,
        part: &str,
        station: &str,
        supplier: Option<&str>,
        quantity: u64,
    ) -> Result<InForce, String> {
        let limits_path = self.site.limit_file(part);
        let (limits, limits_file) = self.limit_file(part)?;
        let read = self.station(station)?;
        let unapproved = self.unapproved((part, &limits_file), &read)?;
        let ReadStation {
            station, standards, ..
        } = read;
        let switching = self.switching(&limits, supplier)?;
        let plan = lot::plan_in_state(&limits.acceptance, quantity, switching.clone())?;
        let desk = Desk::new(limits, station, standards);
        let demands = Demands {
            plan,
            retest: desk.limits.retest,
            questions: desk.questions(),
            checks: desk.checks(),
            check_every: desk
                .station
                .jig_check
                .as_ref()
                .and_then(|c| c.every)
                .map(u64::from),
        };
        Ok(InForce {
            desk,
            demands,
            switching,
            limits_sha256: record::sha256(&limits_file.bytes),
            limits_path,
            unapproved,
        })
    }

    /// What a person has to approve before a lot can be anything but held; nothing where the site
    /// demands no approvals.
    fn unapproved(
        &self,
        (part, limits): (&str, &RawFile),
        read: &ReadStation,
    ) -> Result<Vec<String>, String> {
        let site = self.site.rules().map_err(|stop| stop.to_string())?;
        let trust = match self.place().look().map_err(|e| e.to_string())? {
            None => Trust::default(),
            Some(ledger) => ledger
                .size()
                .and_then(|size| Trust::read(ledger.store(), ledger.archive(), size))
                .map_err(|e| e.to_string())?,
        };
        let nothing = RawFile {
            name: String::new(),
            bytes: Vec::new(),
        };
        let sources = Sources {
            site,
            lot: nothing,
            limits: limits.clone(),
            station: read.file.clone(),
            compensation: read.compensation.clone(),
            sweeps: Vec::new(),
        };
        let (limits, station) = (
            format!("limits/parts/{part}.yaml"),
            format!("limits/stations/{}.yaml", read.station.name),
        );
        let found = approvals::look(&trust, &sources, &limits, &station);
        Ok(found.missing.into_iter().map(|note| note.text).collect())
    }

    fn limit_file(&self, part: &str) -> Result<(Limits, RawFile), String> {
        let path = self.site.limit_file(part);
        let file = text_file(&path).map_err(|e| format!("{}: {}", path.display(), e.note.text))?;
        let limits = limits::read(&file.name, &file.bytes).map_err(|faults| {
            format!(
                "The limit file is not valid; the quality engineer must mend it:\n{}",
                diagnostic::render(&faults, false)
            )
        })?;
        Ok((limits, file))
    }

    fn station(&self, name: &str) -> Result<ReadStation, String> {
        let path = self.site.station_file(name);
        let file = text_file(&path).map_err(|e| format!("{}: {}", path.display(), e.note.text))?;
        let station = station::read(&file.name, &file.bytes).map_err(|faults| {
            format!(
                "The station file is not valid; the quality engineer must mend it:\n{}",
                diagnostic::render(&faults, false)
            )
        })?;
        let named = &station.compensation;
        let all = [&named.open, &named.short, &named.load];
        let mut files = Vec::new();
        for standard in all.into_iter().flatten() {
            let at = path
                .parent()
                .unwrap_or(Path::new("."))
                .join(&standard.sweep);
            let bytes = fs::read(&at).map_err(|e| format!("{}: {e}", at.display()))?;
            files.push(RawFile {
                name: standard.sweep.clone(),
                bytes,
            });
        }
        let standards = match files.as_slice() {
            [] => None,
            _ => Some(Standards::read(&files, &station).map_err(|notes| {
                let all: Vec<&str> = notes.iter().map(|n| n.text.as_str()).collect();
                all.join("; ")
            })?),
        };
        Ok(ReadStation {
            station,
            standards,
            file,
            compensation: files,
        })
    }

    fn switching(
        &self,
        limits: &Limits,
        supplier: Option<&str>,
    ) -> Result<Option<Switching>, String> {
        let ledger = self.place().look().map_err(|e| e.to_string())?;
        evidence::severity_at(ledger.as_ref(), limits, supplier).map_err(|e| e.to_string())
    }
}

fn waiting(path: &Path) -> Option<Waiting> {
    let lines = peek(path)?;
    let (first, rest) = lines.split_first()?;
    let Event::Began(began) = &first.event else {
        return None;
    };
    if rest.iter().any(|l| matches!(l.event, Event::Ended { .. })) {
        return None;
    }
    let parts: std::collections::BTreeSet<&str> = rest
        .iter()
        .filter_map(|l| match &l.event {
            Event::Swept { part, .. } => Some(part.as_str()),
            _ => None,
        })
        .collect();
    Some(Waiting {
        lot: began.lot.clone(),
        words: words::waiting_run(&printable(&began.lot), parts.len() as u64, began.parts),
    })
}

fn names(folder: &Path) -> Vec<String> {
    let entries = fs::read_dir(folder).into_iter().flatten().flatten();
    let mut found: Vec<String> = entries
        .map(|e| e.path())
        .filter(|p| p.extension().is_some_and(|e| e == "yaml"))
        .filter_map(|p| Some(p.file_stem()?.to_string_lossy().into_owned()))
        .collect();
    found.sort();
    found
}

impl Known for Shop {
    fn parts(&self) -> Vec<String> {
        names(&self.root.join("limits").join("parts"))
    }

    fn limits(&self, part: &str) -> Result<Limits, String> {
        self.limit_file(part).map(|(limits, _)| limits)
    }

    fn stations(&self) -> Vec<String> {
        names(&self.root.join("limits").join("stations"))
    }

    fn judged(&self, lot: &str) -> Vec<String> {
        let Ok(Some(ledger)) = self.place().look() else {
            return Vec::new();
        };
        let entries = ledger.find(Query::Lot(lot)).unwrap_or_default();
        entries
            .into_iter()
            .filter_map(|entry| match entry.act {
                Act::Judged {
                    record, verdict, ..
                } => {
                    let day = entry.time.get(..10).unwrap_or_default().to_owned();
                    Some(format!("{verdict} on {day}, record {record}"))
                }
                _ => None,
            })
            .collect()
    }

    fn unfinished(&self, lot: &str) -> bool {
        waiting(&self.folder(lot)).is_some()
    }

    fn today(&self) -> NaiveDate {
        self.now().date_naive()
    }
}
