//! Nothing overlaps, nothing leaves the page, nothing is lost.

use super::{PAPERS, cases, lots, rendered, sources, tools};
use reelgate::certificate::{Paper, PlacedText, placed_text};

fn overlap(a: &PlacedText, b: &PlacedText) -> bool {
    // A fifth of a point is below what anyone sees.
    const SLACK: f64 = 0.2;
    a.page == b.page
        && a.left + SLACK < b.right
        && b.left + SLACK < a.right
        && a.top + SLACK < b.bottom
        && b.top + SLACK < a.bottom
}

#[test]
fn no_two_texts_overlap_and_none_leaves_the_page() {
    for (name, case) in cases() {
        for paper in PAPERS {
            let (texts, width, height) =
                placed_text(&case.record, &case.curves, &sources(&case), paper);
            assert!(texts.len() > 60, "{name}: {} texts", texts.len());
            for t in &texts {
                assert!(
                    t.left >= 40.0
                        && t.right <= width - 40.0
                        && t.top >= 20.0
                        && t.bottom <= height - 20.0,
                    "{name} {paper:?}: off the page: {t:?}"
                );
            }
            for (i, a) in texts.iter().enumerate() {
                for b in texts[i + 1..].iter().take_while(|b| b.page == a.page) {
                    assert!(!overlap(a, b), "{name} {paper:?}: {a:?} over {b:?}");
                }
            }
        }
    }
}

#[test]
fn every_page_says_whose_it_is_and_which_of_how_many() {
    for (name, case) in cases() {
        let saved = tools::save(&rendered(&case, Paper::A4).pdf);
        let pages = tools::pages(&saved.path);
        assert!(pages.len() > 2, "{name}");
        for (index, page) in pages.iter().enumerate() {
            let number = format!("page {} of {}", index + 1, pages.len());
            assert!(page.contains(&number), "{name}: no {number}");
            // A very long identity gives way in its middle; its digest end stays.
            let end = &case.record.record[case.record.record.len() - 12..];
            let foot = page
                .lines()
                .rfind(|l| l.contains(&number))
                .unwrap_or_default();
            assert!(
                foot.contains("record ") && foot.contains(end),
                "{name}: {foot}"
            );
        }
    }
}

#[test]
fn strange_text_is_all_there_and_what_has_no_glyph_shows_its_code_point() {
    let case = lots::hostile();
    let certificate = rendered(&case, Paper::A4);
    let warning = certificate
        .warnings
        .iter()
        .find(|w| w.code == "glyph_missing")
        .expect("a warning");
    assert!(warning.text.contains("U+0000"), "{}", warning.text);
    let saved = tools::save(&certificate.pdf);
    let text = tools::run(
        "pdftotext",
        &["-raw", "-enc", "UTF-8", "FILE", "-"],
        &saved.path,
    );
    let bare: String = text.split_whitespace().collect();
    for c in "株式会社未来電子部品شركةהקבלים😀🔋\u{0}\t\n\u{202e}\u{301}\u{200b}\u{1b}\u{7}".chars()
    {
        let code = format!("U+{:04X}", u32::from(c));
        assert!(bare.contains(&code), "{code} is not shown");
    }
    for kept in [
        "SehrlangeLieferantenbezeichnungfürelektrotechnischeBauelementeundZubehörzweiterZweigbetrieb",
        "ÜnïcödéΑΒΓЖ",
        "OP=17(night\\shift)%PDF-1.7endstream<b>&amp;",
        &"W".repeat(300),
        &"x".repeat(200),
        &"unbroken".repeat(60),
        "=HYPERLINK(1)",
    ] {
        assert!(bare.contains(kept), "lost: {kept}");
    }
    // The whole identity stands on the integrity page though the feet shorten it.
    assert!(
        bare.contains(&case.record.record),
        "identity shortened everywhere"
    );
    for reason in &case.record.reasons {
        let reason: String = reason.text.split_whitespace().collect();
        assert!(bare.contains(&reason), "lost: {reason}");
    }
}

#[test]
fn an_ordinary_record_has_no_warnings() {
    for case in [lots::accepted(32, 8), lots::rejected(), lots::held_single()] {
        assert_eq!(rendered(&case, Paper::A4).warnings, vec![]);
    }
}
