//! The jig check: before the lot, every so many parts, after the last; what a failed one does.

use super::site::{Bench, Site, WHO, go_to_first_part};

/// Part 120 of the sample lot stands for the reference part: its capacitance is near 4.6 µF.
const CHECK: &str = "jig_check:
  every: 2 parts
  reference_part:
    asset: REF-03
    characteristics:
      capacitance: {at: 1 kHz, value: 4.6 µF, tolerance: ±8 %}
";

#[test]
fn a_failed_check_sets_the_parts_before_it_aside() {
    let site = Site::with(CHECK);
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    bench.see("Jig check before the lot: put the reference part REF-03");
    site.save_as("120", "ref1");
    bench.see("Jig check (reference): good");
    for part in ["001", "002"] {
        bench.see(&format!("Part {part} of 5"));
        site.save(part);
        bench.see("CONFORMING");
    }
    bench.see("Jig check, due now");
    site.save_scaled("120", "ref2", 1.2);
    bench.see("STOP: Jig check (reference) failed");
    bench.see("OUTSIDE");
    bench.see("The 2 sweeps since the last good check are set aside");
    bench.see("Jig check, once more");
    site.save_as("119", "ref3");
    bench.see("good");
    for (part, sweep) in [("001", "011"), ("002", "012")] {
        bench.see(&format!("Part {part} of 5"));
        site.save(sweep);
        bench.see(&format!("Part {part}, try 2: CONFORMING"));
    }
    bench.see("Jig check, due now");
    site.save_as("118", "ref4");
    for part in ["003", "004"] {
        bench.see(&format!("Part {part} of 5"));
        site.save(part);
        bench.see("CONFORMING");
    }
    bench.see("Jig check, due now");
    site.save_as("117", "ref5");
    bench.see("Part 005 of 5");
    site.save("005");
    bench.see("Jig check after the last part");
    site.save_as("116", "ref6");
    bench.see("All parts are measured");
    bench.line("");
    bench.see("Lot 26K-9001: ACCEPT");
    assert_eq!(bench.close().code(), Some(0));
    assert_eq!(site.list("lots/26K-9001/checks").len(), 6);
    let (_, record) = site.judge("26K-9001");
    let tries = &record["parts"][0]["attempts"];
    assert_eq!(tries[0]["set_aside"], "jig_check");
    assert_eq!(tries[1]["counts"], true);
}

#[test]
fn an_empty_jig_is_checked_open() {
    let site = Site::with("jig_check:\n  open: {at: 1 kHz, min: 10 MΩ}\n");
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    bench.see("leave the jig empty");
    // 2 pF at 1 kHz is 79.6 MΩ.
    site.save_open("empty");
    bench.see("Jig check (open): good. |Z| at 1 kHz is 79.6 MΩ, at least 10 MΩ");
    bench.line("check");
    bench.see("as you asked");
    site.save("001");
    bench.see("STOP: Jig check (open) failed");
    bench.kill();
}
