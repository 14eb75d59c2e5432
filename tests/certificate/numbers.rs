//! The numbers on the pages against the record: every printed number is the record's, rounded to
//! the digits it is printed with.

use super::{lots, rendered, tools};
use reelgate::certificate::Paper;
use reelgate::record::LotRecord;

/// What one printed unit is in SI, stated here apart from the program's own table.
pub fn unit(key: &str) -> f64 {
    match key.split('@').next().unwrap_or_default() {
        "capacitance" => 1e-6,
        "esr_minimum" | "impedance" | "esr" => 1e-3,
        "srf" => 1e6,
        "dissipation_factor" => 1e-2,
        "esl" => 1e-9,
        other => panic!("unknown {other}"),
    }
}

/// Checks that a printed number is the value to within half of its last digit.
pub fn same(printed: &str, value: f64, what: &str) {
    let plain = printed.replace('−', "-");
    let decimals = match plain.split_once('e') {
        Some((mantissa, exponent)) => {
            let places = mantissa.split_once('.').map_or(0, |(_, d)| d.len());
            places as i32 - exponent.parse::<i32>().expect("exponent")
        }
        None => plain.split_once('.').map_or(0, |(_, d)| d.len()) as i32,
    };
    let number: f64 = plain
        .parse()
        .unwrap_or_else(|_| panic!("{what}: {printed} is no number"));
    let half = 0.5 * 10f64.powi(-decimals);
    assert!(
        (number - value).abs() <= half * (1.0 + 1e-6),
        "{what}: printed {printed}, in the record {value}"
    );
}

/// The words of the line of the parts table for a part and try.
fn row<'t>(text: &'t str, part: &str, attempt: &str, verdict: &str) -> Vec<&'t str> {
    text.lines()
        .map(|l| l.split_whitespace().collect::<Vec<_>>())
        .find(|w| w.starts_with(&[part, attempt, verdict]))
        .unwrap_or_else(|| panic!("no row for part {part} try {attempt} {verdict}"))
}

/// Counts the readings found equal.
fn check_readings(record: &LotRecord, text: &str, keys: &[&str]) -> usize {
    let mut checked = 0;
    for part in &record.parts {
        let counts = part
            .attempts
            .iter()
            .find(|a| a.counts)
            .expect("a try counts");
        let words = row(
            text,
            &part.part,
            &counts.attempt.to_string(),
            part.verdict_name(),
        );
        let mut words = words.iter().skip(3);
        for key in keys {
            let reading = &part.readings[*key];
            let first = words.next().expect("a value");
            let Some(value) = reading.value else {
                assert_eq!(*first, "–", "{key} of {}", part.part);
                continue;
            };
            let what = format!("{key} of {}", part.part);
            same(first, value / unit(key), &what);
            assert_eq!(words.next(), Some(&"±"), "{what}");
            let u = reading.standard_uncertainty.expect("uncertainty");
            same(words.next().expect("uncertainty"), u / unit(key), &what);
            checked += 1;
        }
    }
    checked
}

trait Name {
    fn verdict_name(&self) -> &'static str;
}

impl Name for reelgate::record::PartRecord {
    fn verdict_name(&self) -> &'static str {
        match serde_json::to_value(self.verdict) {
            Ok(v) if v == "conforming" => "conforming",
            Ok(v) if v == "nonconforming" => "nonconforming",
            Ok(v) if v == "undecided" => "undecided",
            _ => "unmeasured",
        }
    }
}

pub fn text_of(case: &lots::Case) -> String {
    let saved = tools::save(&rendered(case, Paper::A4).pdf);
    tools::pages(&saved.path).join("\n")
}

#[test]
fn every_reading_and_uncertainty_is_printed_as_in_the_record() {
    let case = lots::rejected();
    let keys: Vec<&str> = case
        .record
        .limits
        .characteristics
        .iter()
        .map(|c| c.key.as_str())
        .collect();
    let checked = check_readings(&case.record, &text_of(&case), &keys);
    assert_eq!(checked, 124 * 5);
    // The first try at part 053 stands there too.
    row(&text_of(&case), "053", "1", "unmeasured");
}

#[test]
fn statistics_are_printed_as_in_the_record() {
    let case = lots::rejected();
    let text = text_of(&case);
    let lines: Vec<&str> = text.lines().collect();
    for bound in &case.record.limits.characteristics {
        let s = &case.record.statistics[&bound.key];
        let u = unit(&bound.key);
        let line = lines
            .iter()
            .map(|l| l.trim())
            .filter(|l| l.starts_with(&format!("{}, ", bound.name)))
            .find(|l| l.contains(&format!(" {} ", s.n)))
            .unwrap_or_else(|| panic!("no statistics of {}", bound.name));
        let words: Vec<&str> = line[bound.name.len()..].split_whitespace().collect();
        // A comma and the unit come first.
        let numbers = &words[2..];
        let expected = [
            Some(s.n as f64),
            s.mean.map(|v| v / u),
            s.standard_deviation.map(|v| v / u),
            s.sigma_within.map(|v| v / u),
            s.minimum.map(|v| v / u),
            s.median.map(|v| v / u),
            s.maximum.map(|v| v / u),
        ];
        assert_eq!(numbers.len(), expected.len(), "{line}");
        for (printed, value) in numbers.iter().zip(expected) {
            same(printed, value.expect("a value"), &bound.name);
        }
        let line = lines
            .iter()
            .map(|l| l.trim())
            .filter(|l| l.starts_with(&bound.name))
            .map(|l| l[bound.name.len()..].trim())
            .find(|l| !l.starts_with(',') && l.split_whitespace().count() == 8)
            .unwrap_or_else(|| panic!("no capability of {}", bound.name));
        let words: Vec<&str> = line.split_whitespace().collect();
        let expected = [s.cp, s.cpk, s.cpk_lower_95, s.pp, s.ppk, s.ppk_lower_95];
        for (printed, value) in words.iter().zip(expected) {
            match value {
                Some(value) => same(printed, value, &bound.name),
                None => assert_eq!(*printed, "–"),
            }
        }
        assert_eq!(words[6], s.nonconforming.to_string());
        assert_eq!(words[7], s.undecided.to_string());
    }
}

#[test]
fn page_one_answers() {
    for (case, word) in [
        (lots::accepted(32, 8), "ACCEPT"),
        (lots::rejected(), "REJECT"),
        (lots::held_single(), "HOLD"),
    ] {
        let saved = tools::save(&rendered(&case, Paper::A4).pdf);
        let raw = tools::run(
            "pdftotext",
            &["-f", "1", "-l", "1", "-enc", "UTF-8", "FILE", "-"],
            &saved.path,
        );
        let page: String = raw.split_whitespace().collect::<Vec<_>>().join(" ");
        let lot = &case.record.lot;
        assert!(page.contains(word), "{word}");
        for text in [
            &lot.lot,
            &lot.part,
            lot.supplier.as_ref().expect("supplier"),
        ] {
            assert!(page.contains(text.as_str()), "{word}: {text}");
        }
        assert!(
            page.contains(&case.record.reasons[0].text),
            "{word}: reason"
        );
        for (name, class) in &case.record.sampling.classes {
            let row = format!(" {} {} {} ", class.n, class.ac, class.re);
            let layout = tools::pages(&saved.path)[0].clone();
            let line = layout
                .lines()
                .find(|l| l.trim_start().starts_with(&format!("{name} ")))
                .expect("class");
            let line = line.split_whitespace().collect::<Vec<_>>().join(" ");
            assert!(line.contains(&row), "{word}: {line}");
        }
        for c in &case.record.limits.characteristics {
            for limit in [c.lower, c.upper, c.nominal].into_iter().flatten() {
                let layout = &tools::pages(&saved.path)[0];
                let shown = layout.split_whitespace().any(|w| {
                    w.parse::<f64>()
                        .is_ok_and(|v| (v * unit(&c.key) / limit - 1.0).abs() < 1e-8)
                });
                assert!(shown, "{word}: limit {limit} of {}", c.key);
            }
        }
    }
}

#[test]
fn the_plain_text_says_the_same() {
    let case = lots::rejected();
    let text = reelgate::certificate::plain_text(&case.record, &super::sources(&case));
    assert!(text.contains("\nVerdict: REJECT\n"));
    for reason in &case.record.reasons {
        assert!(text.contains(&format!("Because: {} ({})", reason.text, reason.code)));
    }
    let mut checked = 0;
    for part in &case.record.parts {
        let start = text
            .find(&format!("\nPart {}: {}", part.part, part.verdict_name()))
            .unwrap_or_else(|| panic!("part {}", part.part));
        let rest = &text[start + 1..];
        let block = &rest[..rest.find("\nPart ").unwrap_or(rest.len())];
        for c in &case.record.limits.characteristics {
            let line = block
                .lines()
                .find_map(|l| l.trim().strip_prefix(&format!("{} ", c.name)))
                .unwrap_or_else(|| panic!("{} of {}", c.name, part.part));
            let Some(value) = part.readings[&c.key].value else {
                assert_eq!(line, "no value: unmeasured");
                continue;
            };
            let words: Vec<&str> = line.split_whitespace().collect();
            same(words[0], value / unit(&c.key), &c.key);
            checked += 1;
        }
        for attempt in &part.attempts {
            assert!(block.contains(&attempt.sha256) && block.contains(&attempt.file));
        }
    }
    assert_eq!(checked, 124 * 5);
    for line in case.limit_file.lines() {
        assert!(text.contains(line), "{line}");
    }
}

#[test]
fn plain_text_cannot_act_on_a_terminal() {
    let case = lots::hostile();
    let text = reelgate::certificate::plain_text(&case.record, &super::sources(&case));
    for c in text.chars().filter(|c| *c != '\n') {
        assert!(!c.is_control(), "U+{:04X}", u32::from(c));
        assert!(
            !('\u{202a}'..='\u{202e}').contains(&c),
            "U+{:04X}",
            u32::from(c)
        );
    }
    assert!(text.contains("<U+001B>[31mred") && text.contains("株式会社"));
}

#[test]
fn the_chain_the_plan_and_what_variables_found_are_printed() {
    let case = lots::rejected();
    let text = text_of(&case);
    let flat = |t: &str| t.split_whitespace().collect::<String>();
    let bare = flat(&text);
    for step in &case.record.explanation {
        assert!(bare.contains(&flat(&step.about)), "{}", step.about);
    }
    assert!(text.contains("Operating characteristic of the plan"));
    for (name, class) in &case.record.sampling.classes {
        let title = format!("Class {name}: n {}, Ac {}", class.n, class.ac);
        assert!(text.contains(&title), "{title}");
        let oc = class.operating_characteristic.as_ref().expect("a curve");
        for share in [oc.producers_risk_quality, oc.consumers_risk_quality] {
            let shown = text
                .split_whitespace()
                .filter_map(|w| w.parse::<f64>().ok())
                .any(|v| (v / (share * 100.0) - 1.0).abs() < 0.005);
            assert!(shown, "class {name}: {share}");
        }
    }
    let case = lots::hostile();
    let bare = flat(&text_of(&case));
    assert!(bare.contains("accept,byvariables") && bare.contains("24.3"));
}
