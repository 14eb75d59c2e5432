//! Clocks that stand wrong, zones that change, the hour that comes twice: the order is that of the
//! entries, times carry their offset, and what is odd is noted.

use crate::site::{Site, run};
use std::process::Command;

/// Judges a lot at a time of the clock; exit status 3, the lot is held.
fn judge_at(site: &Site, lot: &str, now: &str) {
    let lot = format!("lots/{lot}");
    let (status, _, err) = run(site, &["judge", "--now", now, &lot]);
    assert_eq!(status, Some(3), "{err}");
}

#[test]
fn the_order_is_that_of_the_entries_and_a_clock_set_back_is_noted() {
    let site = Site::new();
    let times = [
        "2026-10-25T02:50:00+02:00",
        // The hour that daylight saving repeats: twenty minutes later.
        "2026-10-25T02:10:00+01:00",
        // Another zone, ten minutes later; half an hour of daylight saving.
        "2026-10-25T12:20:00+11:00",
        // The clock was set back by an hour, then by a century.
        "2026-10-25T00:20:00Z",
        "1926-10-25T00:20:00Z",
        "2100-02-28T23:59:59+00:00",
    ];
    for (n, time) in times.iter().enumerate() {
        let lot = format!("26K-010{n}");
        site.lot(&lot);
        judge_at(&site, &lot, time);
    }
    let verified = site.json(&["records", "verify"]);
    assert_eq!(verified["proven"], true, "{verified:#}");
    assert_eq!(verified["records"], times.len());
    let list = site.json(&["records", "list"]);
    let listed = list.as_array().expect("a list");
    for (n, line) in listed.iter().enumerate() {
        assert!(
            line["record"]
                .as_str()
                .is_some_and(|r| r.starts_with(&format!("26K-010{n}")))
        );
    }
    let noted: Vec<bool> = (0..times.len())
        .map(|n| {
            site.ok(&["records", "show", &format!("26K-010{n}")])
                .contains("check the clock")
        })
        .collect();
    assert_eq!(noted, [false, false, false, true, true, false]);
    let shown = site.ok(&["records", "show", "26K-0103"]);
    assert!(
        shown.contains("stood 3600 s behind the entry before"),
        "{shown}"
    );
    assert!(
        shown.contains("Entry 6: 2026-10-25T00:20:00+00:00"),
        "{shown}"
    );
}

/// The zone of the machine, known or not, decides the offset that is written and nothing else.
#[test]
fn a_zone_that_nobody_knows_is_no_obstacle() {
    for zone in [
        "Europe/Berlin",
        "Australia/Lord_Howe",
        "",
        "no/such zone",
        ":/dev/null",
    ] {
        let site = Site::new();
        let done = Command::new(env!("CARGO_BIN_EXE_reelgate"))
            .args(["judge", "lots/26K-0001"])
            .current_dir(site.file(""))
            .env("TZ", zone)
            .env_remove("REELGATE_NOW")
            .env_remove("REELGATE_SITE")
            .output()
            .expect("reelgate runs");
        assert_eq!(done.status.code(), Some(3), "{zone:?}: {done:?}");
        assert_eq!(
            site.json(&["records", "verify"])["proven"],
            true,
            "{zone:?}"
        );
    }
}
