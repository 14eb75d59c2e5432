//! The numbers beside the drawings, and what a drawing must and must not show.

use super::numbers::{same, text_of, unit};
use super::{lots, sources, tools};
use reelgate::certificate::{Paper, plain_text, render};

/// Words of the first line that begins so, behind it.
fn behind<'t>(text: &'t str, begin: &str) -> Vec<&'t str> {
    text.lines()
        .map(str::trim)
        .find_map(|l| l.strip_prefix(begin))
        .unwrap_or_else(|| panic!("no line begins with {begin}"))
        .split_whitespace()
        .collect()
}

/// Text with every space one blank.
fn flat(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}

/// The first word behind some words that begins as a number.
fn next<'t>(text: &'t str, words: &str) -> &'t str {
    text.match_indices(words)
        .filter_map(|(at, _)| text[at + words.len()..].split_whitespace().next())
        .find(|word| word.starts_with(|c: char| c.is_ascii_digit() || c == '−'))
        .unwrap_or_else(|| panic!("no number follows {words}"))
        .trim_end_matches([';', ',', ':'])
}

#[test]
fn what_the_statistics_have_beside_moments_and_indices_is_printed_as_in_the_record() {
    let case = lots::found();
    let text = text_of(&case);
    let section = text
        .split_once("\nStatistics\n")
        .or_else(|| text.split_once("Statistics\n"));
    let section = section.expect("a heading").1;
    for (key, s) in &case.record.statistics {
        let bound = case
            .record
            .limits
            .characteristics
            .iter()
            .find(|b| b.key == *key);
        let bound = bound.expect("a bound");
        // Moments stand in the first table that names the unit, these in the second.
        let begin = format!("{}, ", bound.name);
        let line = section
            .lines()
            .filter_map(|l| l.trim().strip_prefix(&begin))
            .nth(1)
            .unwrap_or_else(|| panic!("no second line of {key}"));
        let words: Vec<&str> = line.split_whitespace().collect();
        let u = unit(key);
        let [low, high] = s.tolerance_95_95.expect("an interval");
        // The unit comes first.
        match s.normality_p_value.expect("p") {
            p if p < 1e-4 => assert_eq!(words[1..3], ["<", "0.0001"], "{key}"),
            p => same(words[1], p, key),
        }
        let rest = &words[words.len() - 6..];
        for (printed, value) in [(rest[0], s.pp_percentile), (rest[1], s.ppk_percentile)] {
            match value {
                Some(value) => same(printed, value, key),
                None => assert_eq!(printed, "–", "{key}"),
            }
        }
        same(rest[2], low / u, key);
        same(rest[3], high / u, key);
        same(rest[4], s.consumers_risk.expect("risk") * 100.0, key);
        same(rest[5], s.producers_risk.expect("risk") * 100.0, key);
    }
}

#[test]
fn shares_severity_populations_ellipse_and_lots_are_printed_as_in_the_record() {
    let case = lots::found();
    let record = &case.record;
    let pages = text_of(&case);
    let twin = plain_text(record, &sources(&case));
    for (class, of) in &record.sampling.classes {
        let share = of.share_nonconforming_upper_95.expect("a share") * 100.0;
        let table = pages.split_once("Share nonconforming").expect("heading").1;
        let words = behind(table, &format!("{class} "));
        assert_eq!(words[..3], [of.n.to_string(), "0".into(), "0".into()]);
        same(words[3], 1.667, class);
        same(words[4], 0.0912, class);
        same(words[5], share, class);
        let state = &record.sampling.switching.as_ref().expect("state").classes[class];
        for text in [&pages, &twin] {
            assert!(flat(text).contains(&state.severity), "{class}");
            assert!(flat(text).contains(&state.why), "{class}");
        }
    }
    let table = pages
        .split_once("Severity of inspection")
        .expect("heading")
        .1;
    assert_eq!(behind(table, "A ")[..3], ["normal", "18", "9"]);
    assert_eq!(
        behind(table, "B ")[..4],
        ["tightened,", "discontinued", "0", "9"]
    );

    let mixed = &record.findings.mixed[0];
    let joint = &record.findings.joint[0];
    let chart = &record.findings.lots[0];
    let trend = &record.findings.trend[0];
    let last = chart.lots.last().expect("this lot");
    let [low, high] = chart.limits.expect("limits");
    let [value, from, to] = last.ewma.expect("average");
    for text in [flat(&pages), flat(&twin)] {
        for (words, expected) in [
            ("values, dip ", mixed.dip.expect("dip")),
            ("with p ", mixed.dip_p_value.expect("p")),
            ("BIC of one ", mixed.bic_one.expect("BIC")),
            (", of two ", mixed.bic_two.expect("BIC")),
            ("separation ", mixed.separation.expect("separation")),
            (
                "robust squared distance ",
                joint.critical.expect("critical"),
            ),
            ("from the core of ", joint.n as f64),
            ("(µF)", f64::NAN),
            ("this lot ", last.mean / 1e-6),
            (
                "mean of the lots before ",
                chart.centre.expect("centre") / 1e-6,
            ),
            ("control limits ", low / 1e-6),
            ("moving average ", value / 1e-6),
            ("p of a shift ", trend.shift_p_value.expect("p")),
        ] {
            if expected.is_nan() {
                continue;
            }
            same(next(&text, words).trim_end_matches('.'), expected, words);
        }
        let after = text.split_once("control limits ").expect("limits").1;
        same(next(after, "to "), high / 1e-6, "upper control limit");
        let after = text.split_once("moving average ").expect("average").1;
        same(
            next(after, "within "),
            from / 1e-6,
            "lower limit of the average",
        );
        same(next(after, "to "), to / 1e-6, "upper limit of the average");
        assert!(text.contains("p of another spread < 0.0001"));
        assert!(text.contains(&trend.signals[0]));
        for outlier in &joint.outliers {
            let words = format!("{} (", outlier.part);
            let after = text
                .split_once("beyond it (squared distance):")
                .expect("outliers")
                .1;
            let printed = next(after, &words);
            same(
                printed.trim_end_matches([')', '.', ';']),
                outlier.squared_distance,
                &words,
            );
        }
        for group in &mixed.groups {
            assert!(
                text.contains(&group.parts[..3].join(", ")),
                "parts of a group"
            );
            let shown = text
                .split_whitespace()
                .filter_map(|w| w.trim_end_matches(',').parse::<f64>().ok())
                .any(|v| (v - group.mean / 1e-6).abs() < 5.1e-5);
            assert!(shown, "mean of a group");
        }
    }
    for lot in &chart.lots {
        let line = format!("Lot {}: n {}, mean ", lot.lot, lot.n);
        same(next(&twin, &line), lot.mean / 1e-6, &line);
    }
}

/// Length of the content of the page that has that heading, without compression.
fn drawn(case: &lots::Case, heading: &str) -> usize {
    let pdf = render(&case.record, &case.curves, &sources(case), Paper::A4)
        .expect("a document")
        .pdf;
    let saved = tools::save(&pdf);
    let pages = tools::pages(&saved.path);
    let page = pages
        .iter()
        .position(|p| p.lines().any(|l| l.trim() == heading))
        .expect("heading");
    let document = lopdf::Document::load_mem(&pdf).expect("a PDF");
    let id = document.get_pages()[&(page as u32 + 1)];
    document.get_page_content(id).len()
}

#[test]
fn the_normal_curve_is_drawn_only_where_the_record_does_not_speak_against_it() {
    let mut case = lots::accepted(60, 1);
    let s = case
        .record
        .statistics
        .get_mut("capacitance@1kHz")
        .expect("statistics");
    s.normality_p_value = Some(0.4);
    let with = drawn(&case, "Distributions");
    let s = case
        .record
        .statistics
        .get_mut("capacitance@1kHz")
        .expect("statistics");
    s.warnings.push(reelgate::diagnostic::Note::new(
        "not_normal",
        "not normally distributed",
    ));
    let against = drawn(&case, "Distributions");
    let s = case
        .record
        .statistics
        .get_mut("capacitance@1kHz")
        .expect("statistics");
    s.normality_p_value = None;
    s.warnings.clear();
    let untested = drawn(&case, "Distributions");
    // Eighty stretches of a curve take more than a kilobyte; a longer sentence a hundred bytes.
    assert!(with > against + 1000, "{with} {against}");
    assert!(with > untested + 1000, "{with} {untested}");
    let text = |case: &lots::Case| flat(&text_of(case));
    assert!(!text(&case).contains("Anderson-Darling p"));
}

#[test]
fn without_findings_there_are_no_empty_headings() {
    let text = text_of(&lots::accepted(8, 2));
    for heading in [
        "Two populations",
        "Lot to lot",
        "Capacitance against",
        "Severity of inspection",
    ] {
        assert!(!text.contains(heading), "{heading}");
    }
}
