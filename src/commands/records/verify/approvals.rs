//! Every approval in the ledger: whether it is what its key has signed.
//!
//! Whether a record was made by approved files is seen by judging it again: its approvals follow
//! from the entries before it.

use super::Outcome;
use crate::commands::site::{Site, meaning};
use crate::ledger::trust::Trust;
use crate::ledger::{Entry, Ledger};
use crate::site::{self, Approval, SiteFile, TrustedKey};
use std::collections::BTreeSet;

pub fn check(ledger: &Ledger, entries: &[Entry], site: &Site, outcome: &mut Outcome) {
    let size = entries.last().map_or(0, |entry| entry.index + 1);
    let trust = match Trust::read(ledger.store(), ledger.archive(), size) {
        Ok(trust) => trust,
        // The damage itself is a finding of the ledger's own verification.
        Err(error) => {
            return outcome
                .remarks
                .push(format!("approvals were not looked at: {error}"));
        }
    };
    let mut files = judged_by(ledger, entries);
    remark(&files, &trust, outcome);
    let now = site.rules().ok().flatten();
    files.extend(now.as_ref().and_then(meaning).map(|file| (size, file)));
    let all = trust.site_files().iter().map(|site| &site.file);
    let keys: Vec<&TrustedKey> = all
        .chain(files.iter().map(|(_, file)| file))
        .flat_map(|file| &file.trusted_keys)
        .collect();
    let mut wrong = trust.problems().to_vec();
    wrong.extend(trust.doubtful(&keys));
    wrong.sort_unstable();
    for (entry, why) in wrong {
        let text = format!("the approval {why}: it counts for nothing");
        outcome.wrong(
            "approval_invalid",
            &format!("entry {entry}"),
            Some(entry),
            text,
        );
    }
}

/// The site files that lots were judged by, each once, with the first such entry.
fn judged_by(ledger: &Ledger, entries: &[Entry]) -> Vec<(u64, SiteFile)> {
    let mut seen = BTreeSet::new();
    let mut found = Vec::new();
    for entry in entries.iter().filter(|entry| entry.act.kind() == "judged") {
        let Some(object) = entry.objects_of("site").next() else {
            continue;
        };
        if seen.insert(&object.sha256)
            && let Ok(bytes) = ledger.archive().get(&object.sha256)
            && let Ok(file) = site::read(&object.name, &bytes)
        {
            found.push((entry.index, file));
        }
    }
    found
}

/// Approvals were demanded, and no site file was ever approved: whoever can write the file can drop
/// the demand.
fn remark(files: &[(u64, SiteFile)], trust: &Trust, outcome: &mut Outcome) {
    let demanding = files
        .iter()
        .find(|(_, file)| file.approval == Approval::Required);
    if let (Some((entry, _)), None) = (demanding, trust.site_file()) {
        outcome.remarks.push(format!(
            "from entry {entry} on a site file demanded approvals, and no site file was ever approved: until one is, whoever can write \
             it can drop the demand"
        ));
    }
}
