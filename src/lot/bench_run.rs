//! What the operator's run adds to a lot file: the seed of the sample, the scans, who worked, the
//! last good check of the jig, and sweeps that were set aside.

use crate::diagnostic::yaml::{Fields, Node, Reader, Shape};
use chrono::{DateTime, FixedOffset};
use serde::{Deserialize, Serialize};

/// Largest seed that the positions of a sample are drawn with.
pub const SEED_MAX: u64 = u32::MAX as u64;

/// Why a sweep does not count, though it is kept.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Aside {
    /// The operator says that the wrong part, or none, or a part the wrong way lay in the jig.
    Misplaced,
    /// The next check of the jig failed, so nothing since the one before it can be relied on.
    JigCheck,
    /// The file turned out to have been unfinished when it was taken.
    Unfinished,
}

const ASIDE: [Aside; 3] = [Aside::Misplaced, Aside::JigCheck, Aside::Unfinished];

impl Aside {
    /// As lot files spell it.
    pub fn name(self) -> &'static str {
        match self {
            Aside::Misplaced => "misplaced",
            Aside::JigCheck => "jig_check",
            Aside::Unfinished => "unfinished",
        }
    }
}

/// A sweep that was set aside.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct SetAside {
    /// Part and try as the sweep file is named: `017`, `017~2`.
    pub sweep: String,
    #[allow(missing_docs)]
    pub why: Aside,
    /// Who set it aside.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub by: Option<String>,
}

/// What the operator's run says of the lot.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct BenchRun {
    /// The seed that the positions along the reel were drawn with.
    pub seed: Option<u64>,
    /// Every scan as it was typed, where the label came in more than one.
    pub scans: Vec<String>,
    /// Everybody who measured, in order.
    pub operators: Vec<String>,
    /// The last check of the jig that was good, before the last sweep.
    pub jig_checked: Option<DateTime<FixedOffset>>,
    #[allow(missing_docs)]
    pub set_aside: Vec<SetAside>,
}

impl BenchRun {
    /// Why the sweep of a try does not count; `None` where it does.
    pub fn aside(&self, part: &str, attempt: u32) -> Option<Aside> {
        let named = |sweep: &str| match sweep.rsplit_once('~') {
            Some((name, digits)) => name == part && digits.parse() == Ok(attempt),
            None => sweep == part && attempt == 1,
        };
        let found = self.set_aside.iter().find(|one| named(&one.sweep));
        found.map(|one| one.why)
    }
}

/// Reads `run`; without the key nothing is said.
pub(super) fn read(reader: &mut Reader<'_>, node: Option<&Node>) -> Option<BenchRun> {
    let Some(node) = node else {
        return Some(BenchRun::default());
    };
    let known = ["seed", "scans", "operators", "jig_checked", "set_aside"];
    let fields = reader.fields(node, "`run`", &known)?;
    let seed = match fields.get("seed") {
        None => Some(None),
        Some(node) => reader.integer(node, "`seed`", (0, SEED_MAX)).map(Some),
    };
    let scans = texts(reader, &fields, "scans");
    let operators = texts(reader, &fields, "operators");
    let jig_checked = match fields.get("jig_checked") {
        None => Some(None),
        Some(node) => reader.moment(node, "`jig_checked`").map(Some),
    };
    let set_aside = match fields.get("set_aside") {
        None => Some(Vec::new()),
        Some(node) => list(reader, node, "`set_aside`")?
            .iter()
            .map(|node| one_aside(reader, node))
            .collect(),
    };
    Some(BenchRun {
        seed: seed?,
        scans: scans?,
        operators: operators?,
        jig_checked: jig_checked?,
        set_aside: set_aside?,
    })
}

fn texts(reader: &mut Reader<'_>, fields: &Fields<'_>, key: &str) -> Option<Vec<String>> {
    let Some(node) = fields.get(key) else {
        return Some(Vec::new());
    };
    let what = format!("`{key}`");
    list(reader, node, &what)?
        .iter()
        .map(|node| reader.text(node, &what))
        .collect()
}

fn list<'n>(reader: &mut Reader<'_>, node: &'n Node, what: &str) -> Option<&'n [Node]> {
    match &node.shape {
        Shape::List(list) => Some(list),
        other => {
            let found = format!("{} for {what}", other.words());
            reader.fault(node.span, "not_a_list", found, "a list", None);
            None
        }
    }
}

fn one_aside(reader: &mut Reader<'_>, node: &Node) -> Option<SetAside> {
    let what = "an entry of `set_aside`";
    let fields = reader.fields(node, what, &["sweep", "why", "by"])?;
    let sweep = reader
        .required(&fields, "sweep", what, "017~2")
        .and_then(|node| reader.line(node, "`sweep`"));
    let why = reader
        .required(&fields, "why", what, "misplaced")
        .and_then(|node| reader.one_of(node, "a reason", &ASIDE.map(Aside::name)))
        .and_then(|index| ASIDE.get(index).copied());
    let by = match fields.get("by") {
        None => Some(None),
        Some(node) => reader.line(node, "`by`").map(Some),
    };
    Some(SetAside {
        sweep: sweep?,
        why: why?,
        by: by?,
    })
}
