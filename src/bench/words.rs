//! Every text of the operator's run, in one place. Short enough to be translated.

use super::event::{CheckKind, Question};
use super::run::{Chance, CheckReason};
use crate::judgement::PartVerdict;
use crate::lot::LotVerdict;

#[allow(missing_docs)]
pub const LOT: &str = "lot";
#[allow(missing_docs)]
pub const PART: &str = "part";
#[allow(missing_docs)]
pub const QUANTITY: &str = "quantity";
#[allow(missing_docs)]
pub const DATE_CODE: &str = "date code";
#[allow(missing_docs)]
pub const SUPPLIER: &str = "supplier";
#[allow(missing_docs)]
pub const ORDER: &str = "order";
#[allow(missing_docs)]
pub const OPERATOR: &str = "operator";
#[allow(missing_docs)]
pub const STATION: &str = "station";

// --- asking -----------------------------------------------------------------------------------

/// The prompt of each thing that is asked for.
pub fn prompt(want: super::intake::Want) -> &'static str {
    use super::intake::Want::*;
    match want {
        Operator => "Who measures? Scan or type your code",
        Station => "Which station is this?",
        Label => "Scan the label of the reel",
        Part => "Part number? Scan or type it",
        Lot => "Lot number? Scan or type it",
        Quantity => "How many parts are on the reel?",
        DateCode => "Date code? Enter leaves it out",
        Supplier => "Supplier? Enter leaves it out",
        Order => "Order number? Enter leaves it out",
        Word(_) => "Enter for another reel, or type yes to measure this one",
    }
}

pub(super) const NEEDED: &str = "This is needed: scan the code on the label, or type it.";
pub(super) const SCAN_OR_TYPE: &str =
    "Scan the code of the label; type a value only if no code can be scanned.";
pub(super) const WHICH_FIELD: &str =
    "That does not say which field it is. You will be asked for each: scan or type it there.";
pub(super) const ANOTHER_REEL: &str = "Nothing of it was kept. Scan the next label.";
pub(super) const QUANTITY_UNCLEAR: &str =
    "The quantity is not clear: read it from the label and type it, digits only.";

pub(super) fn bad_name(what: &str, why: &str) -> String {
    format!("Found {why}. The {what} may have letters A-Z, digits and - _ . + : type it again.")
}

pub(super) fn refused(why: &str) -> String {
    format!("The scan cannot be used: {why}.")
}

pub(super) fn to_confirm(all: &str) -> String {
    format!(
        "Compare with the print on the reel: {all}. If you go on, the lot will be held for a person to confirm it."
    )
}

pub(super) fn contradiction(field: &str, on_label: &str, expected: &str) -> String {
    format!(
        "{} is {on_label}, expected {expected}",
        field.replace('_', " ")
    )
}

pub(super) fn contradicts(all: &str) -> String {
    format!("Wrong reel? {all}. Put this reel aside and ask goods-in.")
}

pub(super) fn several(what: &str, values: &str) -> String {
    format!(
        "The label names more than one {what}: {values}. Block the reel and call the quality engineer."
    )
}

fn list_or_none(names: &[String]) -> String {
    if names.is_empty() {
        "there are none at all; is --site right?".to_owned()
    } else {
        format!("nearest: {}", names.join(", "))
    }
}

pub(super) fn unknown_part(number: &str, nearest: &[String]) -> String {
    format!(
        "There is no limit file for part {number} ({}). Check the label; a new part needs a limit file from the quality engineer.",
        list_or_none(nearest)
    )
}

pub(super) fn unknown_station(name: &str, nearest: &[String]) -> String {
    format!("There is no station {name} ({}).", list_or_none(nearest))
}

pub(super) fn judged_before(lot: &str, before: &[String]) -> String {
    format!(
        "Lot {lot} was judged already: {}. Measuring it again makes a further record that names this one.",
        before.join("; ")
    )
}

pub(super) fn date_code_old(code: &str, weeks: i64, most: f64) -> String {
    format!(
        "The date code {code} is {weeks} weeks old; the limit file allows {most:.0}. Call the quality engineer. If you go on, the lot will be held."
    )
}

pub(super) fn date_code_ahead(code: &str) -> String {
    format!("The date code {code} lies in the future: read the printed label, and ask goods-in.")
}

pub(super) fn date_code_unclear(code: &str) -> String {
    format!(
        "{code} is no date code such as 2638 (year and week): type it again, or Enter to leave it out."
    )
}

// --- plan -------------------------------------------------------------------------------------

/// Of every part.
pub const CHARGE: &str = "Capacitors can hold charge. Discharge parts as your local rules say before you touch them or put them into the jig.";
/// Of kinds that have a polarity.
pub const POLARISED: &str =
    "Polarised: a part the wrong way round can vent. Mind the mark; never apply a reverse voltage.";
/// Where a bias voltage is spoken of.
pub const BIAS: &str = "Bias: set the supply to zero and let the part discharge before you reach into the jig. Work on energised parts is for qualified staff.";

pub(super) fn charge_of(volts: &str, joules: &str) -> String {
    format!("{CHARGE} At {volts} one part holds {joules}.")
}

/// Prompt of the plan.
pub const BEGIN: &str = "Enter to begin, or scan another label";

/// How the sample is drawn, in words.
pub fn sample(parts: u64, quantity: u64, seed: u64) -> String {
    if parts >= quantity {
        format!("all {quantity} parts")
    } else {
        format!("{parts} of {quantity} parts, from random places along the reel (seed {seed})")
    }
}

/// Where a part lies on the reel.
pub fn place(position: u64, quantity: u64) -> String {
    let share = if quantity <= 1 {
        0.0
    } else {
        100.0 * (position - 1) as f64 / (quantity - 1) as f64
    };
    format!(
        "the {} part of {quantity}, {share:.0} % along the reel",
        ordinal(position)
    )
}

fn ordinal(n: u64) -> String {
    let end = match (n % 10, n % 100) {
        (_, 11..=13) => "th",
        (1, _) => "st",
        (2, _) => "nd",
        (3, _) => "rd",
        _ => "th",
    };
    format!("{n}{end}")
}

/// What a question asks, with what is demanded.
pub fn question(question: Question, demanded: &str) -> String {
    match question {
        Question::Temperature => format!("Temperature at the bench in °C? ({demanded} demanded)"),
        Question::Drive => {
            format!("Drive as set at the instrument in V rms? ({demanded} demanded)")
        }
        Question::LastHeat => {
            "When were the parts last heated (soldered, baked)? YYYY-MM-DD; Enter if not known"
                .to_owned()
        }
    }
}

/// An answer that is outside.
pub fn outside(answer: &str, demanded: &str) -> String {
    format!(
        "{answer} is outside {demanded}: the lot would be held. Put it right and answer again, or type the same again to go on."
    )
}

/// An answer that is none.
pub fn no_answer(example: &str) -> String {
    format!("That is no such value: type it like {example}.")
}

/// Last heat is not known.
pub const HEAT_UNKNOWN: &str = "Without it capacitance cannot be referred to its age, and the lot will be held. Ask the supplier, or press Enter again to go on.";

// --- measuring --------------------------------------------------------------------------------

/// What to do for a part.
pub fn place_part(part: &str, parts: u64, place: &str) -> String {
    format!("Part {part} of {parts}: {place}. Put it into the jig and measure.")
}

/// What to do for a part that is measured again.
pub fn reseat(part: &str, attempt: u32) -> String {
    format!("Part {part}, try {attempt}: take it out, put it in again, measure again.")
}

/// The same where Enter starts the instrument.
pub const ENTER_MEASURES: &str = "Enter measures";
/// Where the sweep comes by itself.
pub const WAITING: &str = "waiting for the sweep";

/// What a check asks for.
pub fn place_check(kind: CheckKind, reason: CheckReason, asset: &str) -> String {
    let why = match reason {
        CheckReason::Before => "Jig check before the lot",
        CheckReason::Every => "Jig check, due now",
        CheckReason::After => "Jig check after the last part",
        CheckReason::Asked => "Jig check, as you asked",
        CheckReason::Failed => "Jig check, once more",
    };
    let what = match kind {
        CheckKind::Open => "leave the jig empty and measure".to_owned(),
        CheckKind::Short => "put the short into the jig and measure".to_owned(),
        CheckKind::Reference => format!("put the reference part {asset} into the jig and measure"),
    };
    format!("{why}: {what}.")
}

/// A check that was good.
pub fn check_good(kind: CheckKind, found: &str) -> String {
    format!("Jig check ({}): good. {found}", kind.name())
}

/// A check that was not.
pub fn check_bad(kind: CheckKind, found: &str, set_aside: usize) -> String {
    let parts = match set_aside {
        0 => "No part was measured since the last good check.".to_owned(),
        1 => "The part measured since the last good check is set aside and will be measured again."
            .to_owned(),
        n => format!(
            "The {n} sweeps since the last good check are set aside; those parts will be measured again."
        ),
    };
    format!(
        "STOP. Jig check ({}) failed: {found} {parts} Clean the contacts, put the jig right, then check again; if it fails twice, call the quality engineer.",
        kind.name()
    )
}

/// The verdict on a part, in a word.
pub fn verdict(verdict: PartVerdict) -> &'static str {
    match verdict {
        PartVerdict::Conforming => "CONFORMING",
        PartVerdict::Nonconforming => "NONCONFORMING",
        PartVerdict::Undecided => "UNDECIDED",
        PartVerdict::Unmeasured => "UNMEASURED",
    }
}

/// The verdict on a part, as a mark.
pub fn mark(verdict: PartVerdict) -> &'static str {
    match verdict {
        PartVerdict::Conforming => "✔",
        PartVerdict::Nonconforming => "✘",
        PartVerdict::Undecided => "?",
        PartVerdict::Unmeasured => "○",
    }
}

/// What to do after a part.
pub fn after(verdict: PartVerdict, part: &str, may_follow: bool) -> String {
    match (verdict, may_follow) {
        (PartVerdict::Conforming, _) => String::new(),
        (PartVerdict::Nonconforming, true) => {
            format!(
                "Keep part {part} apart. The limit file allows another try: type again, or go on with the next part."
            )
        }
        (PartVerdict::Nonconforming, false) => {
            format!("Keep part {part} apart and mark it; go on with the next part.")
        }
        (PartVerdict::Undecided, _) => {
            format!(
                "Too near to a limit to decide. Keep part {part} apart; go on with the next part."
            )
        }
        (PartVerdict::Unmeasured, true) => {
            format!("Reseat part {part} and measure it again; or type skip.")
        }
        (PartVerdict::Unmeasured, false) => {
            format!(
                "Part {part} may not be tried again: keep it apart. The lot will be held; go on with the next part."
            )
        }
    }
}

/// How the lot stands.
pub fn standing(chances: &[Chance], left: u64) -> String {
    let lost: Vec<&Chance> = chances.iter().filter(|c| !c.open()).collect();
    let left = match left {
        0 => "none left".to_owned(),
        1 => "1 part left".to_owned(),
        n => format!("{n} parts left"),
    };
    if lost.is_empty() {
        let each: Vec<String> = chances.iter().map(chance).collect();
        return format!(
            "{left}; the lot can still be accepted ({})",
            each.join("; ")
        );
    }
    let each: Vec<String> = lost
        .iter()
        .map(|c| {
            format!(
                "class {}: {} nonconforming, Re {}",
                c.class, c.nonconforming, c.re
            )
        })
        .collect();
    format!(
        "{left}; the lot CANNOT be accepted any more ({}): go on, or type end",
        each.join("; ")
    )
}

/// One class so far.
pub fn chance(c: &Chance) -> String {
    let undecided = match c.undecided {
        0 => String::new(),
        n => format!(" and {n} undecided"),
    };
    if c.by_variables {
        return format!("class {}: by variables, decided at the end", c.class);
    }
    format!(
        "class {}: {} nonconforming{undecided}, Ac {}",
        c.class, c.nonconforming, c.ac
    )
}

/// The same sweep twice.
pub fn same_sweep(file: &str) -> String {
    format!(
        "This is the very sweep that is already kept as {file}: nothing was added. Measure this part anew."
    )
}

/// A sweep that nothing waits for.
pub fn unexpected(name: &str) -> String {
    format!(
        "{name} arrived while nothing was to be measured: it is kept under `not-used` and counts for nothing."
    )
}

/// A sweep taken before was unfinished.
pub fn unfinished(part: &str) -> String {
    format!(
        "The file of part {part} was still being written when it was read: that try is set aside, the whole file takes its place."
    )
}

/// The last placement was wrong.
pub fn misplaced(part: &str, attempt: u32) -> String {
    format!(
        "Part {part}, try {attempt} is marked misplaced. It stays in the record and does not count."
    )
}

/// A doubtful sweep is set aside.
pub const MISPLACED_HELD: &str =
    "It had not come out conforming, so a quality engineer will be asked: the lot will be held.";
/// Nothing to undo.
pub const NOTHING_TO_UNDO: &str = "Nothing is measured yet that could be undone.";
/// No retest.
pub const NO_RETEST: &str = "The limit file allows no further try at the last part.";
/// Nothing to skip.
pub const NOTHING_TO_SKIP: &str =
    "skip is for a part that could not be measured and waits for its next try.";

/// A part left unmeasured.
pub fn given_up(part: &str) -> String {
    format!("Part {part} stays unmeasured: keep it apart. The lot will be held for it.")
}

/// Another person.
pub fn operator_now(operator: &str) -> String {
    format!("{operator} goes on from here.")
}

/// No checks.
pub const NO_CHECKS: &str =
    "The station file demands no jig check; check the jig as your local rules say.";

/// Confirmation of an early end.
pub fn early_end(missing: u64) -> String {
    let parts = if missing == 1 {
        "1 part is".to_owned()
    } else {
        format!("{missing} parts are")
    };
    format!(
        "{parts} not measured. Without them the lot cannot be accepted. Type end once more to stop here."
    )
}

/// The label of the reel that is being measured.
pub fn same_reel(lot: &str) -> String {
    format!("Yes, this is lot {lot}.")
}

/// The label of another reel.
pub fn other_reel(found: &str, lot: &str) -> String {
    format!(
        "That is the label of lot {found}; the parts in the jig must come from lot {lot}. To measure another reel, type pause first."
    )
}

/// A line that means nothing here.
pub fn not_understood(text: &str) -> String {
    format!("`{text}` means nothing here; type help for the words.")
}

/// The words.
pub const HELP: &str = "undo: the last part lay wrong; again: another try, where allowed; skip: leave an unmeasured part; \
check: check the jig now; operator CODE: somebody else goes on; end: stop early; pause: go on later. The first letter is enough.";

/// The words, in a line.
pub const KEYS: &str = "undo  again  skip  check  operator  end  pause  help";

// --- pausing and resuming ---------------------------------------------------------------------

/// The run is paused.
pub fn paused(lot: &str, done: u64, parts: u64) -> String {
    format!(
        "Paused. {done} of {parts} parts of lot {lot} are measured and kept. To go on, run the same command and scan the label of the lot."
    )
}

/// The run goes on.
pub fn resumed(lot: &str, done: u64, parts: u64) -> String {
    format!("Lot {lot} goes on where it stopped: {done} of {parts} parts are measured.")
}

/// Sweeps that were stored when the machine stopped.
pub fn adopted(count: usize) -> String {
    let sweeps = if count == 1 {
        "1 sweep was".to_owned()
    } else {
        format!("{count} sweeps were")
    };
    format!("{sweeps} already on the disk when the run stopped, and taken in.")
}

/// The limit file changed.
pub fn limits_changed(from: &str, to: &str, parts: u64) -> String {
    format!(
        "The limit file changed since the run began (revision {from}, now {to}): everything is judged by the one in force, which demands {parts} parts."
    )
}

/// Runs that wait.
pub fn waiting_runs(all: &[String]) -> String {
    format!(
        "Not finished: {}. Scan the label to go on with one.",
        all.join("; ")
    )
}

/// One run that waits, in words.
pub fn waiting_run(lot: &str, done: u64, parts: u64) -> String {
    format!("lot {lot} ({done} of {parts} parts)")
}

/// More parts are demanded.
pub fn more_parts(parts: u64) -> String {
    format!("The plan demands {parts} parts now: go on with the next ones.")
}

/// The journal is none.
pub const NO_RUN: &str = "The journal of this lot does not begin a run: call the quality engineer; the sweeps beside it are whole.";

/// A journal of a later program.
pub fn newer_run(version: u32) -> String {
    format!(
        "The journal of this lot has version {version}, which this program does not know: use the program that began it."
    )
}

/// A label that contradicts the run that was begun.
pub fn begun_otherwise(lot: &str, name: &str, value: &str) -> String {
    format!(
        "Lot {lot} was begun with another {name} than {value}: find out which reel this is, or go on at the station where it was begun."
    )
}

/// A kept file is not what it was.
pub fn changed_file(name: &str) -> String {
    format!(
        "{name} was changed since it was kept: keep it as evidence and call the quality engineer."
    )
}

/// The lot cannot be judged.
pub fn not_judged(why: &str) -> String {
    format!("The lot could not be judged; everything measured is kept. {why}")
}

/// A calibration that is over.
pub fn calibration_due(asset: &str) -> String {
    format!("the calibration of {asset} is over: use a calibrated instrument")
}

/// A jig check that is over.
pub fn jig_check_old(asset: &str) -> String {
    format!(
        "the check of jig {asset} is too old: check it and have its time put into the station file"
    )
}

/// Reference values that are over.
pub fn reference_due(asset: &str) -> String {
    format!("the values of reference part {asset} are past their due date: have it measured anew")
}

/// While an instrument measures.
pub const MEASURING: &str = "measuring";

/// A file that grows.
pub fn arriving(name: &str, bytes: u64) -> String {
    format!(
        "{name} is being written, {} kB so far",
        bytes.div_ceil(1000)
    )
}

/// A file that is left alone.
pub fn ignored(name: &str, why: &str) -> String {
    format!("{name} is left alone: {why}")
}

/// A sweep that is already there.
pub fn known_sweep(file: &str) -> String {
    format!("The folder still holds the sweep kept as {file}.")
}

// --- end --------------------------------------------------------------------------------------

/// Everything is measured.
pub const COMPLETE: &str = "All parts are measured";
/// Prompt at the end.
pub const ENTER_JUDGES: &str =
    "Enter judges the lot and makes its record; undo takes the last part back";

/// The verdict on a lot, in a word.
pub fn lot_verdict(verdict: LotVerdict) -> &'static str {
    match verdict {
        LotVerdict::Accept => "ACCEPT",
        LotVerdict::Reject => "REJECT",
        LotVerdict::Hold => "HOLD",
    }
}

/// The verdict on a lot, as a mark.
pub fn lot_mark(verdict: LotVerdict) -> &'static str {
    match verdict {
        LotVerdict::Accept => "✔",
        LotVerdict::Reject => "✘",
        LotVerdict::Hold => "‖",
    }
}

/// What to do with the reel.
pub fn reel(verdict: LotVerdict) -> &'static str {
    match verdict {
        LotVerdict::Accept => "The reel may go to the line.",
        LotVerdict::Reject => "Block the reel. The quality engineer disposes of it.",
        LotVerdict::Hold => {
            "Keep the reel back and call the quality engineer; the reasons say what is to be decided or measured again."
        }
    }
}

/// The record is made.
pub fn record(path: &str) -> String {
    format!("Record: {path}")
}

/// The label for the reel.
pub fn label_written(path: &str) -> String {
    format!("Label for the reel: {path}")
}

/// While the record is made.
pub const JUDGING: &str = "Judging the lot; its record is being made";
/// Before a caution.
pub const CAUTION: &str = "Care";
/// Before what would hold the lot.
pub const FORESEEN: &str = "As things stand the lot would be held";
/// Prompt after the end.
pub const NEXT_LOT: &str = "Enter for the next reel, or type pause to leave";

/// Acceptance is no safety certificate.
pub const NOT_SAFETY: &str = "Acceptance is not a safety certification of safety-class parts.";
