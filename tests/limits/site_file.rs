//! Site files.

use super::{SITE, listed, with};
use reelgate::diagnostic::Faults;
use reelgate::site::{self, Approval, Role, SiteFile};

fn read(text: &str) -> Result<SiteFile, Faults> {
    site::read("limits/site.yaml", text.as_bytes())
}

fn only(piece: &str, by: &str, fault: &str) {
    assert_eq!(listed(read(&with(SITE, piece, by))), [fault], "{by}");
}

#[test]
fn a_valid_file_means_what_it_says() {
    let site = read(SITE).expect("a valid file");
    assert_eq!(site.name, "Goods-in, hall 2");
    assert_eq!(site.approval, Approval::Required);
    let [engineer, metrologist] = site.trusted_keys.as_slice() else {
        panic!("two keys: {site:?}");
    };
    assert_eq!(engineer.role, Role::QualityEngineer);
    // The public key of RFC 8032 section 7.1, test 1.
    let rfc = "d75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a";
    assert_eq!(reelgate::ledger::hex(&engineer.key.public()), rfc);
    assert!(engineer.counts_at(0) && engineer.counts_at(1 << 50));
    assert_eq!(metrologist.role, Role::Metrologist);
    let counts: Vec<bool> = [11, 12, 411, 412]
        .map(|n| metrologist.counts_at(n))
        .to_vec();
    assert_eq!(counts, [false, true, true, false]);
    assert_eq!(site.trusted("CAL-1"), Some(metrologist));
    assert_eq!(site.trusted("cal-1"), None);
    assert_eq!(
        site.witness.as_deref(),
        Some("/mnt/quality/reelgate-witness.txt")
    );
    let signing = site.signing.expect("a key");
    assert_eq!(signing.certificate, "keys/goods-in.crt.pem");
    assert_eq!(signing.key, "../keys/goods-in.key.pem");
}

#[test]
fn a_name_is_all_that_it_needs() {
    let site = read("site: Hall 2\n").expect("a valid file");
    assert_eq!(site.approval, Approval::Optional);
    assert!(site.trusted_keys.is_empty() && site.witness.is_none() && site.signing.is_none());
    assert_eq!(listed(read("approval: optional\n")), ["missing_key"]);
}

#[test]
fn misspelt_keys_are_named() {
    for (piece, by, near) in [
        ("trusted_keys:", "trusted_key:", "trusted_keys"),
        ("approval:", "aproval:", "approval"),
        ("approval: required", "approval: require", "required"),
        ("witness:", "witnes:", "witness"),
        (
            "role: quality_engineer",
            "role: quality_enginer",
            "quality_engineer",
        ),
        ("{name: QE-02", "{nam: QE-02", "name"),
        ("revoked_at_entry", "revoked_at", "revoked_at_entry"),
    ] {
        let faults = read(&with(SITE, piece, by))
            .expect_err("a fault")
            .to_string();
        assert!(
            faults.contains(&format!("did you mean `{near}`?")),
            "{by}: {faults}"
        );
    }
}

#[test]
fn a_demand_that_nobody_can_meet_is_a_fault() {
    only(
        "role: quality_engineer",
        "role: metrologist",
        "nobody_approves required",
    );
    let nobody = "site: S\napproval: required\n";
    assert_eq!(listed(read(nobody)), ["nobody_approves required"]);
}

#[test]
fn keys_are_whole_and_of_the_person_named() {
    only(
        "{name: QE-02",
        "{name: QE-03",
        "key_of_another QE-02+913c4863+AddamAGCsQq31Uv+08lkBzoO4XLz2qYjJa8CGmj3B1Ea",
    );
    let key = "QE-02+913c4863+AddamAGCsQq31Uv+08lkBzoO4XLz2qYjJa8CGmj3B1Ea";
    // Cut off, one digit of the key ID, one letter of the key, another kind of key, a weak key.
    for wrong in [
        &key[..key.len() - 1],
        "QE-02+913c4864+AddamAGCsQq31Uv+08lkBzoO4XLz2qYjJa8CGmj3B1Ea",
        "QE-02+913c4863+AddamAGCsQq31Uv+08lkBzoO4XLz2qYjJa8CGmj3B1Eb",
        "QE-02+913c4863+BNdamAGCsQq31Uv+08lkBzoO4XLz2qYjJa8CGmj3B1Ea",
        "QE-02",
    ] {
        let faults = listed(read(&with(SITE, key, wrong)));
        assert_eq!(faults, [format!("not_a_key {wrong}")]);
    }
    // Names that look alike cannot come in: Cyrillic Е for E.
    let faults = listed(read(&with(SITE, "{name: QE-02", "{name: QЕ-02")));
    assert_eq!(faults, ["name_not_safe QЕ-02"]);
    only("{name: CAL-1", "{name: CAL 1", "name_not_safe CAL 1");
}

#[test]
fn nobody_is_trusted_twice() {
    let line = SITE.lines().find(|l| l.contains("QE-02")).expect("a line");
    let twice = with(SITE, "witness:", &format!("{line}\nwitness:"));
    assert_eq!(
        listed(read(&twice)),
        ["duplicate_key QE-02+913c4863+AddamAGCsQq31Uv+08lkBzoO4XLz2qYjJa8CGmj3B1Ea"]
    );
}

#[test]
fn all_faults_are_listed_at_once() {
    let text = "sitte: S\napproval: yes\ntrusted_keys: {name: QE-02}\nwitness: shares/\nsigning: {certificate: a.pem}\n";
    assert_eq!(
        listed(read(text)),
        [
            "unknown_key sitte",
            "unknown_value yes",
            "not_a_list trusted_keys",
            "not_a_file shares/",
            "missing_key signing"
        ]
    );
}
