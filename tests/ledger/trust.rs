//! Which approvals count, on entries as somebody with the ledger's key could make them: the
//! program itself refuses to append most of these.

use super::support::{ORIGIN, scratch};
use reelgate::keys::Signer;
use reelgate::ledger::approval::{Approved, Statement};
use reelgate::ledger::trust::{Form, Standing, Trust};
use reelgate::ledger::{
    Act, Archive, ENTRY_SCHEMA, Entry, LedgerError, ObjectRef, Query, Reader, Row, disk::System,
};
use reelgate::site::{self, SiteFile};
use std::sync::Arc;

const FILE: &str = "limits/parts/RG-0475-X7R.yaml";
const OLD: &str = "aa00000000000000000000000000000000000000000000000000000000000000";
const NEW: &str = "bb00000000000000000000000000000000000000000000000000000000000000";

/// Entries in memory.
struct Entries(Vec<Entry>);

impl Reader for Entries {
    fn size(&self) -> Result<u64, LedgerError> {
        Ok(self.0.len() as u64)
    }

    fn row(&self, index: u64) -> Result<Option<Row>, LedgerError> {
        let entry = self.0.get(index as usize);
        entry
            .map(|entry| {
                Ok(Row {
                    index,
                    body: entry.bytes()?,
                    peaks: Vec::new(),
                    checkpoint: String::new(),
                    objects: entry.objects.clone(),
                })
            })
            .transpose()
    }

    fn find(&self, query: Query) -> Result<Vec<u64>, LedgerError> {
        let Query::Kind(kind) = query else {
            panic!("only kinds are asked for: {query:?}")
        };
        let of_kind = self.0.iter().filter(|entry| entry.act.kind() == kind);
        Ok(of_kind.map(|entry| entry.index).collect())
    }

    fn each(
        &self,
        _: u64,
        _: &mut dyn FnMut(Result<Row, LedgerError>) -> Result<(), LedgerError>,
    ) -> Result<(), LedgerError> {
        panic!("nothing walks over everything")
    }
}

fn key(name: &str, secret: u8) -> Signer {
    Signer::new(name, &[secret; 32]).expect("a key")
}

fn engineer() -> Signer {
    key("QE-02", 2)
}

/// QE-02 is trusted throughout, QE-03 from entry 2 to before entry 4, CAL-1 with station files.
fn keys() -> SiteFile {
    let text = format!(
        "site: S\ntrusted_keys:\n  - {{name: QE-02, role: quality_engineer, key: {}}}\n  - {{name: QE-03, role: quality_engineer, \
         key: {}, from_entry: 2, revoked_at_entry: 4}}\n  - {{name: CAL-1, role: metrologist, key: {}}}\n",
        engineer().verifier().text(),
        key("QE-03", 3).verifier().text(),
        key("CAL-1", 4).verifier().text(),
    );
    site::read("limits/site.yaml", text.as_bytes()).expect("a site file")
}

fn said(entries: u64, sha256: &str) -> Statement {
    Statement {
        withdraws: false,
        ledger: ORIGIN.to_owned(),
        entries,
        kind: Approved::Limits,
        file: FILE.to_owned(),
        revision: None,
        sha256: sha256.to_owned(),
        with: Vec::new(),
        meaning: "checked".to_owned(),
    }
}

/// An entry that carries the note, and says what the statement says.
fn entry(index: u64, statement: &Statement, note: String) -> Entry {
    let (file, sha256) = (statement.file.clone(), statement.sha256.clone());
    let act = if statement.withdraws {
        Act::Withdrawal {
            file,
            sha256,
            reason: statement.meaning.clone(),
            statement: note,
        }
    } else {
        Act::Approval {
            file,
            revision: None,
            sha256,
            statement: note,
        }
    };
    Entry {
        schema: ENTRY_SCHEMA,
        ledger: ORIGIN.to_owned(),
        index,
        time: "2026-11-02T08:00:00+01:00".to_owned(),
        by: None,
        program: "reelgate 0.0.1".to_owned(),
        act,
        objects: vec![ObjectRef {
            role: statement.kind.role().to_owned(),
            name: statement.file.clone(),
            sha256: statement.sha256.clone(),
            bytes: 1,
        }],
        notes: Vec::new(),
    }
}

fn signed(index: u64, statement: &Statement, by: &Signer) -> Entry {
    entry(index, statement, statement.sign(by).expect("a note"))
}

fn trust(entries: Vec<Entry>) -> Trust {
    let folder = scratch();
    let archive = Archive::new(folder.path(), Arc::new(System));
    let before = entries.len() as u64;
    Trust::read(&Entries(entries), &archive, before).expect("entries")
}

fn standing(trust: &Trust, sha256: &str) -> Standing {
    let form = Form {
        kind: Approved::Limits,
        file: FILE,
        sha256,
        with: &[],
    };
    trust.standing(&keys(), &form)
}

fn not_counted(trust: &Trust, sha256: &str, words: &str) {
    match standing(trust, sha256) {
        Standing::NotCounted(_, why) => assert!(why.contains(words), "{words:?} in {why:?}"),
        other => panic!("{words}: {other:?}"),
    }
}

#[test]
fn the_newest_statement_is_in_force_and_copies_of_older_ones_are_not() {
    let (old, new) = (said(0, OLD), said(1, NEW));
    let mut entries = vec![signed(0, &old, &engineer()), signed(1, &new, &engineer())];
    let two = trust(entries.clone());
    assert!(matches!(standing(&two, NEW), Standing::Approved(granted) if granted.entry == 1));
    assert!(matches!(
        standing(&two, OLD),
        Standing::Other { in_force, before: Some(before) } if (in_force.entry, before.entry) == (1, 0)
    ));
    entries.push(signed(2, &old, &engineer()));
    let three = trust(entries);
    not_counted(&three, OLD, "a copy of an earlier approval does not count");
    assert!(matches!(standing(&three, NEW), Standing::Approved(_)));
    let keys = keys();
    let listed: Vec<_> = keys.trusted_keys.iter().collect();
    let doubtful = three.doubtful(&listed);
    assert_eq!(doubtful.len(), 1);
    assert_eq!(doubtful[0].0, 2);
    // A second signature under the same form changes nothing.
    let again = said(2, NEW);
    let more = trust(vec![
        signed(0, &old, &engineer()),
        signed(1, &new, &engineer()),
        signed(2, &again, &key("QE-03", 3)),
    ]);
    assert!(matches!(standing(&more, NEW), Standing::Approved(granted) if granted.entry == 1));
}

#[test]
fn what_was_withdrawn_is_not_brought_back_by_its_copy() {
    let first = said(0, OLD);
    let withdrawal = Statement {
        withdraws: true,
        ..said(1, OLD)
    };
    let mut entries = vec![
        signed(0, &first, &engineer()),
        signed(1, &withdrawal, &engineer()),
    ];
    assert!(
        matches!(standing(&trust(entries.clone()), OLD), Standing::Withdrawn(granted) if granted.entry == 1)
    );
    entries.push(signed(2, &first, &engineer()));
    not_counted(&trust(entries.clone()), OLD, "a copy");
    entries.push(signed(3, &said(3, OLD), &engineer()));
    assert!(
        matches!(standing(&trust(entries), OLD), Standing::Approved(granted) if granted.entry == 3)
    );
}

#[test]
fn keys_count_by_entry_and_by_role() {
    let filler = |index| {
        let other = Statement {
            file: "limits/parts/other.yaml".to_owned(),
            ..said(index, NEW)
        };
        signed(index, &other, &engineer())
    };
    let third = key("QE-03", 3);
    let at = |index: u64| {
        let mut entries: Vec<Entry> = (0..index).map(filler).collect();
        entries.push(signed(index, &said(index, OLD), &third));
        trust(entries)
    };
    not_counted(&at(1), OLD, "counts from entry 2 on");
    assert!(matches!(standing(&at(2), OLD), Standing::Approved(_)));
    assert!(matches!(standing(&at(3), OLD), Standing::Approved(_)));
    not_counted(&at(4), OLD, "was revoked at entry 4");
    not_counted(
        &trust(vec![signed(0, &said(0, OLD), &key("CAL-1", 4))]),
        OLD,
        "a metrologist does not approve",
    );
    // The name of a trusted key is not the key.
    for other in [key("QE-02", 9), key("OP-17", 2)] {
        not_counted(
            &trust(vec![signed(0, &said(0, OLD), &other)]),
            OLD,
            "not signed by a key",
        );
    }
}

#[test]
fn an_entry_says_what_its_statement_says() {
    let good = said(0, OLD);
    let note = good.sign(&engineer()).expect("a note");
    let changed = |change: &dyn Fn(&mut Statement)| {
        let mut other = good.clone();
        change(&mut other);
        entry(0, &other, note.clone())
    };
    let unsigned = note
        .split("\u{2014} ")
        .next()
        .unwrap_or_default()
        .to_owned();
    let elsewhere = Statement {
        ledger: "ledger-0123456789abcdef".to_owned(),
        ..good.clone()
    };
    let later = Statement {
        entries: 5,
        ..good.clone()
    };
    for wrong in [
        changed(&|s| s.sha256 = NEW.to_owned()),
        changed(&|s| s.file = "limits/parts/other.yaml".to_owned()),
        changed(&|s| s.kind = Approved::Station),
        changed(&|s| s.withdraws = true),
        entry(0, &good, unsigned),
        entry(0, &good, String::new()),
        signed(0, &elsewhere, &engineer()),
        signed(0, &later, &engineer()),
    ] {
        let act = format!("{:?}", wrong.act);
        let trust = trust(vec![wrong]);
        for digest in [OLD, NEW] {
            assert!(
                !matches!(standing(&trust, digest), Standing::Approved(_)),
                "{act}"
            );
        }
    }
    assert!(matches!(
        standing(&trust(vec![changed(&|_| ())]), OLD),
        Standing::Approved(_)
    ));
}
