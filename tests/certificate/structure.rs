//! The file as a PDF: sound, self-contained, described, navigable, reproducible, small.

use super::{PAPERS, cases, lots, rendered, sources, tools};
use reelgate::certificate::Paper;
use reelgate::record::LotRecord;

#[test]
fn qpdf_finds_nothing_wrong() {
    for (_, case) in cases() {
        for paper in PAPERS {
            let saved = tools::save(&rendered(&case, paper).pdf);
            tools::run("qpdf", &["--check", "FILE"], &saved.path);
        }
    }
}

#[test]
fn both_weights_are_embedded_subset_and_map_to_unicode() {
    let saved = tools::save(&rendered(&lots::rejected(), Paper::A4).pdf);
    let fonts = tools::run("pdffonts", &["FILE"], &saved.path);
    let rows: Vec<&str> = fonts.lines().skip(2).collect();
    assert_eq!(rows.len(), 2, "{fonts}");
    for row in rows {
        let words: Vec<&str> = row.split_whitespace().collect();
        assert!(words[0].contains("AlegreyaSans"), "{row}");
        assert_eq!(words[4..7], ["yes", "yes", "yes"], "{row}");
    }
}

#[test]
fn same_record_same_bytes() {
    let case = lots::rejected();
    let first = rendered(&case, Paper::A4).pdf;
    let _ = rendered(&lots::hostile(), Paper::Letter);
    assert!(first == rendered(&case, Paper::A4).pdf);
    let mut other = lots::rejected();
    other.record.lot.order = Some("PO-88121".into());
    assert!(first != rendered(&other, Paper::A4).pdf);
}

#[test]
fn metadata_come_from_the_record() {
    let saved = tools::save(&rendered(&lots::rejected(), Paper::A4).pdf);
    let info = tools::run("pdfinfo", &["-isodates", "FILE"], &saved.path);
    let field = |name: &str| {
        info.lines()
            .find_map(|l| l.strip_prefix(name))
            .map(|l| l.trim().to_owned())
            .unwrap_or_else(|| panic!("no {name} in\n{info}"))
    };
    assert_eq!(field("Title:"), "Lot record 26K-0457: reject");
    assert!(field("Subject:").contains("26K-0457-7c1f0be2a94d"));
    assert_eq!(field("Author:"), "OP-17");
    assert_eq!(field("Producer:"), "reelgate 0.1.0");
    for date in ["CreationDate:", "ModDate:"] {
        let shown = chrono::DateTime::parse_from_str(
            &field(date).replace("+02", "+0200"),
            "%Y-%m-%dT%H:%M:%S%z",
        )
        .expect("a date");
        let issued =
            chrono::DateTime::parse_from_rfc3339("2026-10-05T09:14:03+02:00").expect("a date");
        assert_eq!(shown, issued, "{date}");
    }
    let xmp = tools::run("pdfinfo", &["-meta", "FILE"], &saved.path);
    for part in [
        "<pdfaid:part>3</pdfaid:part>",
        "<pdfaid:conformance>B</pdfaid:conformance>",
        "Lot record 26K-0457: reject",
        "<xmp:CreateDate>2026-10-05T09:14:03+02:00</xmp:CreateDate>",
    ] {
        assert!(xmp.contains(part), "{part} not in\n{xmp}");
    }
}

#[test]
fn record_readings_and_source_files_are_attached() {
    let case = lots::rejected();
    let saved = tools::save(&rendered(&case, Paper::A4).pdf);
    let folder = saved.folder.path().to_str().expect("path").to_owned();
    tools::run(
        "pdfdetach",
        &["-saveall", "-o", &folder, "FILE"],
        &saved.path,
    );
    let file = |name: &str| {
        std::fs::read(saved.folder.path().join(name)).unwrap_or_else(|e| panic!("{name}: {e}"))
    };
    let record: LotRecord = serde_json::from_slice(&file("record.json")).expect("a record");
    assert_eq!(record, case.record);
    assert_eq!(file("limits.yaml"), case.limit_file.as_bytes());
    assert_eq!(file("station.yaml"), case.station_file.as_bytes());
    let bytes = file("results.csv");
    let mut reader = csv::Reader::from_reader(bytes.as_slice());
    let rows: Vec<csv::StringRecord> = reader.records().map(|r| r.expect("row")).collect();
    assert_eq!(rows.len(), 125 * 5);
    for row in rows {
        let part = case
            .record
            .parts
            .iter()
            .find(|p| p.part == row[0])
            .expect("part");
        let reading = &part.readings[&row[2]];
        assert_eq!(row[3].parse::<f64>().ok(), reading.value);
        assert_eq!(row[4].parse::<f64>().ok(), reading.standard_uncertainty);
    }
}

#[test]
fn attachments_and_intent_are_declared_as_part_3_of_the_archive_standard_demands() {
    let document =
        lopdf::Document::load_mem(&rendered(&lots::rejected(), Paper::A4).pdf).expect("a PDF");
    let catalog = document.catalog().expect("catalog");
    assert_eq!(
        catalog
            .get(b"Lang")
            .and_then(|l| l.as_str())
            .expect("language"),
        b"en"
    );
    let associated = catalog.get(b"AF").and_then(|a| a.as_array()).expect("AF");
    assert_eq!(associated.len(), 4);
    for file in associated {
        let id = file.as_reference().expect("reference");
        let specification = document.get_dictionary(id).expect("file specification");
        for key in ["F", "UF", "Desc", "EF", "AFRelationship"] {
            assert!(specification.has(key.as_bytes()), "{key}");
        }
    }
    let intents = catalog
        .get(b"OutputIntents")
        .and_then(|a| a.as_array())
        .expect("intents");
    let intent = intents[0].as_dict().expect("intent");
    assert_eq!(
        intent.get(b"S").and_then(|s| s.as_name()).expect("S"),
        b"GTS_PDFA1"
    );
    assert!(intent.has(b"DestOutputProfile"));
    assert_eq!(
        document
            .trailer
            .get(b"ID")
            .and_then(|i| i.as_array())
            .expect("ID")
            .len(),
        2
    );
    // Nothing that acts.
    for object in document.objects.values() {
        if let Ok(dictionary) = object.as_dict() {
            for key in ["JS", "JavaScript", "OpenAction", "AA", "URI", "Launch"] {
                assert!(!dictionary.has(key.as_bytes()), "{key}");
            }
        }
    }
}

#[test]
fn bookmarks_name_the_sections_and_reasons_lead_to_parts() {
    let case = lots::rejected();
    let pdf = rendered(&case, Paper::A4).pdf;
    let saved = tools::save(&pdf);
    let pages = tools::pages(&saved.path);
    let document = lopdf::Document::load_mem(&pdf).expect("a PDF");
    let numbers: std::collections::BTreeMap<lopdf::ObjectId, usize> = document
        .get_pages()
        .into_iter()
        .map(|(number, id)| (id, number as usize))
        .collect();
    let target = |dictionary: &lopdf::Dictionary| {
        let destination = dictionary
            .get(b"Dest")
            .and_then(|d| d.as_array())
            .expect("Dest");
        numbers[&destination[0].as_reference().expect("page")]
    };
    let outlines = document
        .catalog()
        .and_then(|c| c.get(b"Outlines"))
        .and_then(|o| o.as_reference())
        .and_then(|id| document.get_dictionary(id))
        .expect("outlines");
    let mut next = outlines.get(b"First").and_then(|f| f.as_reference()).ok();
    let mut titles = Vec::new();
    while let Some(id) = next {
        let entry = document.get_dictionary(id).expect("entry");
        let title =
            String::from_utf8_lossy(entry.get(b"Title").and_then(|t| t.as_str()).expect("title"))
                .into_owned();
        let page = &pages[target(entry) - 1];
        let heading = title
            .strip_prefix("Verdict: ")
            .map_or(title.clone(), str::to_uppercase);
        assert!(
            page.contains(&heading),
            "{title} leads to a page without it"
        );
        titles.push(title);
        next = entry.get(b"Next").and_then(|f| f.as_reference()).ok();
    }
    for wanted in [
        "Reasons",
        "Curves",
        "Distributions",
        "Operating characteristic of the plan",
        "Statistics",
        "Parts",
        "Limit file",
        "Integrity",
        "Signatures",
    ] {
        assert!(
            titles.iter().any(|t| t == wanted),
            "{wanted} not in {titles:?}"
        );
    }
    // Page two names six parts twice (sentence and table): every link leads to a page with its part.
    let second = *document.get_pages().get(&2).expect("page two");
    let links = document.get_page_annotations(second).expect("links");
    assert!(links.len() >= 11, "{}", links.len());
    for link in links {
        assert_eq!(link.get(b"F").and_then(|f| f.as_i64()).expect("flags"), 4);
        assert!(pages[target(link) - 1].contains("Parts") || target(link) > 2);
    }
}

/// Compressed length of the content of the page with that heading.
fn content_length(pdf: &[u8], heading: &str) -> usize {
    let saved = tools::save(pdf);
    let pages = tools::pages(&saved.path);
    let number = pages
        .iter()
        .position(|p| p.lines().any(|l| l.trim() == heading))
        .expect("heading")
        + 1;
    let document = lopdf::Document::load_mem(pdf).expect("a PDF");
    let page = document.get_pages()[&(number as u32)];
    document
        .get_page_contents(page)
        .into_iter()
        .map(|id| {
            let object = document.get_object(id).expect("content");
            object.as_stream().expect("stream").content.len()
        })
        .sum()
}

#[test]
fn the_curve_page_stays_small_whatever_the_number_of_parts() {
    for parts in [1, 125, 1250] {
        let case = lots::accepted(parts, 8);
        let pdf = rendered(&case, Paper::A4).pdf;
        let length = content_length(&pdf, "Curves");
        assert!(
            length > 1_000 && length < 300_000,
            "{parts} parts: {length} bytes"
        );
    }
}

#[test]
fn noise_does_not_make_the_curve_page_large() {
    let mut case = lots::accepted(1250, 3);
    let mut dice = lots::Dice::new(7);
    for curve in &mut case.curves {
        for z in &mut curve.impedance {
            *z *= 1.0 + 0.3 * dice.uniform();
        }
    }
    let pdf = rendered(&case, Paper::A4).pdf;
    let length = content_length(&pdf, "Curves");
    assert!(length < 300_000, "{length} bytes");
}

#[test]
fn broken_curves_and_readings_do_no_harm() {
    let mut case = lots::accepted(8, 3);
    let nan = num_complex::Complex64::new(f64::NAN, f64::INFINITY);
    case.curves[0].impedance.fill(nan);
    case.curves[1].frequency.fill(0.0);
    case.curves[2].impedance.truncate(3);
    case.curves[3].frequency.clear();
    case.curves[4]
        .impedance
        .fill(num_complex::Complex64::new(-1e300, 1e300));
    for (index, value) in [f64::NAN, f64::INFINITY, 0.0, -1e300, 1e-320]
        .into_iter()
        .enumerate()
    {
        case.record.parts[index]
            .readings
            .get_mut("capacitance@1kHz")
            .expect("reading")
            .value = Some(value);
    }
    case.record.limits.characteristics[1].upper = Some(f64::MAX);
    case.record.limits.characteristics[2].lower = Some(f64::MAX);
    let saved = tools::save(&rendered(&case, Paper::A4).pdf);
    tools::run("qpdf", &["--check", "FILE"], &saved.path);
    let pages = tools::pages(&saved.path).join("");
    assert!(!pages.contains("NaN") && !pages.contains("inf "));
    let _ = sources(&case);
}
