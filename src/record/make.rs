//! From the bytes of the input files to the record: the whole of the pipeline, without a file or
//! a clock. Judging and recomputing from an archive both come through here.

use super::{Approvals, Digests, Inputs, LotRecord, PartRecord, circuit, sha256};
use crate::diagnostic::{Faults, Note};
use crate::judgement::{JudgedTry, judge_part, judge_try, undecidable};
use crate::limits::{self, Limits};
use crate::lot::{self, Aside, History, Lot};
use crate::readings::{Budget, Characteristic};
use crate::site::{self, SiteFile};
use crate::station::{self, Station};
use crate::statistics::sampling::Severity;
use crate::sweep::{self, Attempt, RawFile, Standards, Sweep, validity};
use rayon::prelude::*;

/// The files that a verdict rests on, as they lie on the disk. Names of the first four are those
/// that messages show.
#[derive(Debug, Clone)]
#[allow(missing_docs)]
pub struct Sources {
    /// The site file, where the site has one.
    pub site: Option<RawFile>,
    pub lot: RawFile,
    pub limits: RawFile,
    pub station: RawFile,
    /// Sweeps of the compensation standards, named as the station file names them.
    pub compensation: Vec<RawFile>,
    /// Sweep files in name order, named relative to the lot folder.
    pub sweeps: Vec<RawFile>,
}

/// A record and what its drawing needs besides.
#[derive(Debug)]
#[allow(missing_docs)]
pub struct Made {
    pub record: LotRecord,
    /// The sweep that counts of every part that has one, in the order of the record's parts.
    pub curves: Vec<PartSweep>,
}

/// The sweep that counts of one part.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct PartSweep {
    pub part: String,
    pub verdict: super::PartVerdict,
    pub sweep: Sweep,
}

/// The occasion on which a lot is judged: what its record says besides what follows from its files.
#[derive(Debug, Clone, PartialEq)]
pub struct Occasion {
    /// The time of issue, RFC 3339 with offset.
    pub issued: String,
    /// Severity with which inspection began.
    pub severity: Severity,
    /// The lots before, of the same part and supplier: they give the severity now in force, and
    /// what lot rules compare with.
    pub history: History,
    /// The record of the same lot that was made before, from other inputs.
    pub supersedes: Option<String>,
    /// Further reasons to hold the lot, which other records give.
    pub further: Vec<Note>,
    /// What the ledger says of the files that the lot is judged by.
    pub approvals: Approvals,
}

/// Why there is no record.
#[derive(Debug)]
pub enum Refusal {
    /// Faults in site, lot, limit or station file.
    Faults(Vec<Faults>),
    /// The files are sound, and there is nothing to judge by: a code and a sentence.
    Impossible(Note),
}

/// Makes the record of a lot.
///
/// `read` is called after each sweep file, from any thread, for a progress display.
///
/// # Errors
/// Every fault of the four files at once; a plan that the lot size does not allow; sweeps of
/// compensation standards that cannot be used; no sweep file at all.
pub fn make(
    sources: &Sources,
    occasion: &Occasion,
    read: &(dyn Fn() + Sync),
) -> Result<Made, Refusal> {
    let (site, lot, limits, station) = parse(sources)?;
    let switching = lot::severity_state(
        &occasion.history,
        &limits.acceptance,
        occasion.severity,
        limits.reduced_inspection,
    );
    let plan = lot::plan_in_state(&limits.acceptance, lot.quantity, switching)
        .map_err(|text| Refusal::Impossible(Note::new("no_sampling_plan", text)))?;
    let standards = standards(sources, &station)?;
    let mut attempts = attempts(sources, &station, standards.as_ref(), read)?;
    validity::complete(&mut attempts);
    if let Some(nominal) = nominal_capacitance(&limits) {
        validity::expect_capacitance(&mut attempts, nominal);
    }
    let budget = Budget::of(&station);
    let age = lot.age_hours();
    let judged: Vec<JudgedTry> = attempts
        .par_iter()
        .map(|attempt| judge_try(attempt, &limits, &budget, age))
        .collect();
    let (parts, curves, mut holding) = parts(&attempts, judged, &limits, &lot);
    holding.extend(occasion.further.iter().cloned());
    holding.extend(occasion.approvals.missing.iter().cloned());
    let judgement = lot::judge(
        &lot,
        &limits,
        &station,
        &plan,
        &parts,
        holding,
        &occasion.history,
    );
    let digests = digests(sources, &occasion.approvals);
    let circuit = circuit::of_median_part(&limits, &parts, &curves);
    let record = LotRecord::assemble(Inputs {
        site: site.as_ref(),
        approvals: &occasion.approvals,
        lot: &lot,
        limits: &limits,
        station: &station,
        digests: &digests,
        judgement,
        parts,
        circuit,
        warnings: undecidable(&limits, &station),
        issued: occasion.issued.clone(),
        supersedes: occasion.supersedes.clone(),
    });
    Ok(Made { record, curves })
}

/// The nominal capacitance that the limit file states, in F.
fn nominal_capacitance(limits: &Limits) -> Option<f64> {
    let of_capacitance = limits
        .bounds
        .iter()
        .filter(|bound| bound.characteristic == Characteristic::Capacitance);
    of_capacitance.filter_map(|bound| bound.nominal).next()
}

fn parse(sources: &Sources) -> Result<(Option<SiteFile>, Lot, Limits, Station), Refusal> {
    let site = sources.site.as_ref();
    let site = site
        .map(|file| site::read(&file.name, &file.bytes))
        .transpose();
    let lot = lot::read(&sources.lot.name, &sources.lot.bytes);
    let limits = limits::read(&sources.limits.name, &sources.limits.bytes);
    let station = station::read(&sources.station.name, &sources.station.bytes);
    match (site, lot, limits, station) {
        (Ok(site), Ok(lot), Ok(limits), Ok(station)) => Ok((site, lot, limits, station)),
        (site, lot, limits, station) => {
            let all = [site.err(), lot.err(), limits.err(), station.err()];
            Err(Refusal::Faults(all.into_iter().flatten().collect()))
        }
    }
}

fn standards(sources: &Sources, station: &Station) -> Result<Option<Standards>, Refusal> {
    if sources.compensation.is_empty() {
        return Ok(None);
    }
    Standards::read(&sources.compensation, station)
        .map(Some)
        .map_err(|notes| {
            let text: Vec<String> = notes.iter().map(|note| note.text.clone()).collect();
            Refusal::Impossible(Note::new("compensation_unusable", text.join("; ")))
        })
}

fn attempts(
    sources: &Sources,
    station: &Station,
    standards: Option<&Standards>,
    read: &(dyn Fn() + Sync),
) -> Result<Vec<Attempt>, Refusal> {
    let mut attempts: Vec<Attempt> = sources
        .sweeps
        .par_iter()
        .map(|file| {
            let found = sweep::read_file(file, station, standards);
            read();
            found
        })
        .flatten()
        .collect();
    if attempts.is_empty() {
        return Err(Refusal::Impossible(Note::new(
            "no_sweeps",
            "the lot has no sweep file: measure the sample first",
        )));
    }
    sweep::order(&mut attempts);
    Ok(attempts)
}

fn parts(
    attempts: &[Attempt],
    judged: Vec<JudgedTry>,
    limits: &Limits,
    lot: &Lot,
) -> (Vec<PartRecord>, Vec<PartSweep>, Vec<Note>) {
    let mut judged = judged.into_iter();
    let (mut parts, mut curves, mut refused) = (Vec::new(), Vec::new(), Vec::new());
    for tries in attempts.chunk_by(|a, b| a.part == b.part) {
        let paired: Vec<(&Attempt, JudgedTry, Option<&str>)> = tries
            .iter()
            .zip(judged.by_ref())
            .map(|(attempt, judged)| {
                let aside = lot.run.aside(&attempt.part, attempt.attempt);
                (attempt, judged, aside.map(Aside::name))
            })
            .collect();
        let (part, reasons) = judge_part(&paired, &limits.retest);
        refused.extend(reasons);
        let counting = part.attempts.iter().position(|a| a.counts);
        if let Some(sweep) = counting
            .and_then(|i| tries.get(i))
            .and_then(|a| a.sweep.as_ref().ok())
        {
            curves.push(PartSweep {
                part: part.part.clone(),
                verdict: part.verdict,
                sweep: sweep.clone(),
            });
        }
        parts.push(part);
    }
    (parts, curves, refused)
}

fn digests(sources: &Sources, approvals: &Approvals) -> Digests {
    let each = |files: &[RawFile]| {
        files
            .par_iter()
            .map(|f| (f.name.clone(), sha256(&f.bytes)))
            .collect()
    };
    Digests {
        site: sources.site.as_ref().map(|file| sha256(&file.bytes)),
        approvals: approvals
            .notes
            .iter()
            .map(|note| (note.role.to_owned(), sha256(note.text.as_bytes())))
            .collect(),
        lot: sha256(&sources.lot.bytes),
        limits: sha256(&sources.limits.bytes),
        station: sha256(&sources.station.bytes),
        compensation: each(&sources.compensation),
        sweeps: each(&sources.sweeps),
    }
}
