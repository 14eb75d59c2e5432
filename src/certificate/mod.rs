//! The PDF lot record.
//!
//! Everything on it is drawn from the [`LotRecord`], the curves and the two source files; nothing is
//! computed here but geometry: bins of histograms, the places of so many values on a probability
//! plot. Same arguments, same bytes.
//!
//! The way of a page: `section` places text and drawings in a `flow`, the flow fills `canvas`es with
//! placed items, `pdf` writes them.

mod canvas;
mod figures;
mod flow;
mod furniture;
mod grid;
mod ink;
mod paper;
mod pdf;
mod plot;
mod results_csv;
mod section;
mod sign;
mod structure;
mod table;
mod text;
mod twin;
mod typeface;

pub use paper::Paper;
pub use sign::{SignError, Signatory, Signed, Signer, SignerError, as_issued, examine, sign};
pub use twin::plain_text;

use crate::diagnostic::Note;
use crate::record::{self, LotRecord, PartVerdict};
use flow::Flow;
use num_complex::Complex64;
use paper::Sheet;
use pdf::{Attachment, Conformance, Description, Finish};
use section::{characteristics, lot_word};
use std::collections::BTreeSet;

/// The sweep of one part, as drawn.
#[derive(Debug, Clone, PartialEq)]
pub struct Curve {
    /// The part's number.
    pub part: String,
    /// Decides the stroke.
    pub verdict: PartVerdict,
    /// Hz; as long as `impedance`.
    pub frequency: Vec<f64>,
    /// Ω
    pub impedance: Vec<Complex64>,
}

/// The files that the verdict rests on, as their authors wrote them.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct Sources<'a> {
    /// Text of the limit file.
    pub limit_file: Option<&'a str>,
    /// Text of the station file.
    pub station_file: Option<&'a str>,
    /// The record's place in the ledger.
    pub ledger: Option<InLedger<'a>>,
    /// The certificate that the document is to be signed with, or was.
    pub signature: Option<&'a Signatory>,
}

/// Where the ledger has the record, and what proves it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct InLedger<'a> {
    /// Index of the entry.
    pub index: u64,
    /// Inclusion proof and signed checkpoint, in the text form of C2SP `tlog-proof`.
    pub proof: &'a str,
    /// What a copy is marked with; `None` for the original.
    pub copy: Option<&'a str>,
}

/// Name under which the document carries [`InLedger::proof`].
pub const PROOF_NAME: &str = "ledger.tlog-proof";
/// Name under which the document carries the JSON record.
pub const RECORD_NAME: &str = "record.json";

/// A rendered lot record.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Certificate {
    /// The file: PDF/A-3, level B (ISO 19005-3).
    pub pdf: Vec<u8>,
    /// `glyph_missing`, `code_omitted`, `date_omitted`: what the document could not show as it is.
    pub warnings: Vec<Note>,
}

/// Why there is no document.
#[derive(Debug)]
pub enum CertificateError {
    /// The typeface within the program is unreadable.
    Typeface,
    /// The record has no JSON form.
    Record(serde_json::Error),
    /// The PDF could not be put together.
    Document(lopdf::Error),
}

impl std::fmt::Display for CertificateError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            CertificateError::Typeface => {
                write!(
                    f,
                    "the typeface within the program is unreadable: reinstall the program"
                )
            }
            CertificateError::Record(e) => write!(f, "the record has no JSON form: {e}"),
            CertificateError::Document(e) => write!(f, "the PDF could not be put together: {e}"),
        }
    }
}

impl std::error::Error for CertificateError {
    fn source(&self) -> Option<&(dyn std::error::Error + 'static)> {
        match self {
            CertificateError::Typeface => None,
            CertificateError::Record(e) => Some(e),
            CertificateError::Document(e) => Some(e),
        }
    }
}

/// Renders the lot record as a PDF/A-3b document with the JSON record, the readings as CSV and the
/// source files attached.
///
/// # Errors
/// Only for faults of the program itself; no record, however strange its texts, is an error.
pub fn render(
    record: &LotRecord,
    curves: &[Curve],
    sources: &Sources,
    paper: Paper,
) -> Result<Certificate, CertificateError> {
    render_as(record, curves, sources, paper, Conformance::A3b, false)
}

/// The same pages as PDF/A-1b (ISO 19005-1), without attachments: for validators that know only
/// part 1 of the standard.
///
/// # Errors
/// As [`render`].
pub fn render_archive_twin(
    record: &LotRecord,
    curves: &[Curve],
    sources: &Sources,
    paper: Paper,
) -> Result<Certificate, CertificateError> {
    render_as(record, curves, sources, paper, Conformance::A1b, false)
}

/// The same document with the grid of page one drawn over it, each line with its name and its place in
/// points: for whoever changes the layout.
///
/// # Errors
/// As [`render`].
pub fn render_with_grid(
    record: &LotRecord,
    curves: &[Curve],
    sources: &Sources,
    paper: Paper,
) -> Result<Certificate, CertificateError> {
    render_as(record, curves, sources, paper, Conformance::A3b, true)
}

fn render_as(
    record: &LotRecord,
    curves: &[Curve],
    sources: &Sources,
    paper: Paper,
    conformance: Conformance,
    with_grid: bool,
) -> Result<Certificate, CertificateError> {
    let json = record::to_bytes(record).map_err(CertificateError::Record)?;
    let digest = record::sha256(&json);
    let (mut flow, mut warnings) = layout(record, curves, sources, paper, &digest);
    if with_grid {
        grid::draw(&mut flow);
    }
    let written = pdf::write(&flow).ok_or(CertificateError::Typeface)?;
    let description = describe(record, &mut warnings);
    let attachments = attachments(record, sources, json);
    let with = Finish {
        flow: &flow,
        description: &description,
        attachments: &attachments,
        conformance,
    };
    let pdf = pdf::finish(written, &with).map_err(CertificateError::Document)?;
    Ok(Certificate { pdf, warnings })
}

/// Pours all sections and puts the furniture on every page.
fn layout(
    record: &LotRecord,
    curves: &[Curve],
    sources: &Sources,
    paper: Paper,
    digest: &str,
) -> (Flow, Vec<Note>) {
    let mut flow = Flow::new(Sheet::new(paper));
    let all = characteristics(record);
    section::answer::answer(&mut flow, record, &all);
    flow.new_page();
    section::reasons::reasons(&mut flow, record);
    section::curves::curves(&mut flow, record, curves);
    section::distributions::distributions(&mut flow, &all);
    section::populations::populations(&mut flow, &all);
    section::scatter::scatter(&mut flow, record, &all);
    section::order::order(&mut flow, &all, record.parts.len());
    section::plan::plan(&mut flow, record);
    section::lots::lots(&mut flow, record, &all);
    section::statistics::statistics(&mut flow, &all);
    section::parts::parts(&mut flow, record, &all);
    section::files::files(&mut flow, record);
    section::sources::sources(&mut flow, record, sources);
    section::station::station(&mut flow, record);
    let coded = section::integrity::integrity(&mut flow, record, digest, sources);
    section::signatures::signatures(&mut flow, record, sources.signature);
    furniture::furniture(&mut flow, record, sources.ledger.and_then(|l| l.copy));
    let mut warnings = missing_glyphs(&flow);
    if !coded {
        warnings.push(Note::new(
            "code_omitted",
            "The record's identity is too long for a two-dimensional code; the integrity page has it as text only.",
        ));
    }
    (flow, warnings)
}

/// One warning that names the characters which stand as boxes.
fn missing_glyphs(flow: &Flow) -> Vec<Note> {
    let missing: BTreeSet<char> = flow
        .pages
        .iter()
        .flat_map(|p| p.missing.iter().copied())
        .collect();
    if missing.is_empty() {
        return Vec::new();
    }
    const NAMED: usize = 20;
    let mut names: Vec<String> = missing.iter().take(NAMED).map(|c| text::tag(*c)).collect();
    if missing.len() > NAMED {
        names.push(format!("and {} more", missing.len() - NAMED));
    }
    vec![Note::new(
        "glyph_missing",
        format!(
            "The typeface of the PDF lacks {}; each stands in a box with its code point. The JSON record has the text as it is.",
            names.join(", ")
        ),
    )]
}

fn describe(record: &LotRecord, warnings: &mut Vec<Note>) -> Description {
    let date = chrono::DateTime::parse_from_rfc3339(&record.issued).ok();
    if date.is_none() {
        warnings.push(Note::new(
            "date_omitted",
            "The record's date of issue is not an RFC 3339 date; the PDF carries no date in its metadata.",
        ));
    }
    let producer = format!("{} {}", record.program.name, record.program.version);
    Description {
        title: format!(
            "Lot record {}: {}",
            record.lot.lot,
            lot_word(record.verdict)
        ),
        subject: format!(
            "Incoming inspection of lot {} of {}, record {}",
            record.lot.lot, record.lot.part, record.record
        ),
        author: record
            .lot
            .operator
            .clone()
            .unwrap_or_else(|| producer.clone()),
        producer,
        date,
    }
}

fn attachments(record: &LotRecord, sources: &Sources, json: Vec<u8>) -> Vec<Attachment> {
    let mut out = vec![
        Attachment {
            name: RECORD_NAME.to_owned(),
            mime: "application/json",
            relationship: "Data",
            description: "The lot record that this document shows".to_owned(),
            bytes: json,
        },
        Attachment {
            name: "results.csv".to_owned(),
            mime: "text/csv",
            relationship: "Data",
            description: "Readings of every part in SI units".to_owned(),
            bytes: results_csv::results(record),
        },
    ];
    out.extend(sources.ledger.map(|ledger| Attachment {
        name: PROOF_NAME.to_owned(),
        mime: "text/plain",
        relationship: "Data",
        description: "Proof that the record is in the ledger".to_owned(),
        bytes: ledger.proof.as_bytes().to_vec(),
    }));
    for (name, text) in [
        ("limits.yaml", sources.limit_file),
        ("station.yaml", sources.station_file),
    ] {
        out.extend(text.map(|text| Attachment {
            name: name.to_owned(),
            mime: "application/yaml",
            relationship: "Source",
            description: "As in force when the lot was judged".to_owned(),
            bytes: text.as_bytes().to_vec(),
        }));
    }
    out
}

/// A text placed on a page with its box, in points from the top left corner: what layout checks
/// work on.
#[derive(Debug, Clone, PartialEq)]
pub struct PlacedText {
    /// From 1.
    pub page: usize,
    #[allow(missing_docs)]
    pub text: String,
    #[allow(missing_docs)]
    pub left: f64,
    #[allow(missing_docs)]
    pub top: f64,
    #[allow(missing_docs)]
    pub right: f64,
    #[allow(missing_docs)]
    pub bottom: f64,
}

/// Every text of the document as placed, and the page's width and height in points.
pub fn placed_text(
    record: &LotRecord,
    curves: &[Curve],
    sources: &Sources,
    paper: Paper,
) -> (Vec<PlacedText>, f64, f64) {
    let (flow, _) = layout(record, curves, sources, paper, &"0".repeat(64));
    let mut out = Vec::new();
    for (index, page) in flow.pages.iter().enumerate() {
        for item in &page.items {
            let (canvas::Item::Text { text, .. }, Some(area)) = (item, canvas::text_area(item))
            else {
                continue;
            };
            out.push(PlacedText {
                page: index + 1,
                text: text.clone(),
                left: area.left,
                top: area.top,
                right: area.right,
                bottom: area.bottom,
            });
        }
    }
    (out, flow.sheet.width, flow.sheet.height)
}
