//! A station file from its bytes.

use super::{
    Column, Method, Reference, Station, equipment, jig_check, layout, link, standards, uncertainty,
    watch,
};
use crate::diagnostic::yaml::{Fields, Node, Reader};
use crate::diagnostic::{Faults, Source, yaml};
use crate::quantity::Dimension;

/// JSON Schema (draft 2020-12) of a station file, for editors.
pub const SCHEMA: &str = include_str!("station.schema.json");

const KEYS: [&str; 11] = [
    "station",
    "instrument",
    "jig",
    "method",
    "reference",
    "layout",
    "compensation",
    "uncertainty",
    "watch",
    "instrument_link",
    "jig_check",
];

/// Methods by their names in files.
pub(super) const METHODS: [(&str, Method); 5] = [
    ("direct", Method::Direct),
    ("series_reference", Method::SeriesReference),
    ("shunt_through", Method::ShuntThrough),
    ("series_through", Method::SeriesThrough),
    ("reflection", Method::Reflection),
];

/// Reads a station file.
///
/// `path` is only named in faults; where its folder is called `stations`, the file's stem must be
/// the station. Errors: every fault of the file, with its place.
pub fn read(path: &str, bytes: &[u8]) -> Result<Station, Faults> {
    let source = Source::new(path, bytes)?;
    let root = yaml::parse(&source)?;
    let mut reader = Reader::new(&source);
    let station = station(&mut reader, &root, path);
    reader.finish(station)
}

fn station(reader: &mut Reader<'_>, root: &Node, path: &str) -> Option<Station> {
    let what = "a station file";
    let fields = reader.fields(root, what, &KEYS)?;
    let name = reader
        .required(&fields, "station", what, "BENCH-2")
        .and_then(|node| {
            let name = reader.name(node, "`station`")?;
            reader.stem_is(node, path, "stations", &name, "station");
            Some(name)
        });
    let instrument = fields
        .get("instrument")
        .map(|node| equipment::instrument(reader, node));
    let jig = fields.get("jig").map(|node| equipment::jig(reader, node));
    let names = METHODS.map(|(name, _)| name);
    let method = reader
        .required(&fields, "method", what, "direct")
        .and_then(|node| reader.one_of(node, "a measurement method", &names))
        .and_then(|index| METHODS.get(index))
        .map(|(_, method)| *method);
    let reference = fields.get("reference").map(|node| reference(reader, node));
    if let Some(method) = method {
        reference_belongs(reader, &fields, method);
    }
    let layout = fields.get("layout").map(|node| layout::read(reader, node));
    if let (Some(method), Some(Some(layout)), Some(node)) = (method, &layout, fields.get("layout"))
    {
        layout_suits(reader, node, method, layout);
    }
    let compensation = standards::read(reader, fields.get("compensation"));
    let uncertainty = uncertainty::read(reader, fields.get("uncertainty"));
    let watch = fields.get("watch").map(|node| watch::read(reader, node));
    let link = instrument_link(reader, &fields, method, &layout);
    let jig_check = fields
        .get("jig_check")
        .map(|node| jig_check::read(reader, node));
    let link = given(link)?;
    let layout = given(layout)?.or_else(|| link.as_ref().map(layout::of_link));
    Some(Station {
        name: name?,
        instrument: given(instrument)?,
        jig: given(jig)?,
        method: method?,
        reference: given(reference)?,
        layout,
        compensation: compensation?,
        uncertainty: uncertainty?,
        watch: given(watch)?,
        instrument_link: link,
        jig_check: given(jig_check)?,
    })
}

/// The link, where its answers suit the method: a network method has no set of quantities.
fn instrument_link(
    reader: &mut Reader<'_>,
    fields: &Fields<'_>,
    method: Option<Method>,
    layout: &Option<Option<super::Layout>>,
) -> Option<Option<super::InstrumentLink>> {
    let (key, node) = fields.entry("instrument_link")?;
    let network = matches!(
        method,
        Some(Method::ShuntThrough | Method::SeriesThrough | Method::Reflection)
    );
    if network {
        reader.fault(
            key.span,
            "layout_does_not_suit",
            "`instrument_link` with a network method, whose sweeps are Touchstone files",
            "`watch`, and the analyser's own software to save them",
            Some("correct `method`, or put `watch` in its place".to_owned()),
        );
        return Some(None);
    }
    let stated = layout.as_ref().and_then(Option::as_ref);
    let link = link::read(reader, node, stated);
    if let (Some(link), Some(method), None) = (&link, method, layout) {
        layout_suits(reader, node, method, &layout::of_link(link));
    }
    Some(link)
}

/// `None` only where the key is there and has faults.
pub(super) fn given<T>(read: Option<Option<T>>) -> Option<Option<T>> {
    match read {
        None => Some(None),
        Some(None) => None,
        Some(value) => Some(value),
    }
}

fn reference(reader: &mut Reader<'_>, node: &Node) -> Option<Reference> {
    let what = "`reference`";
    let fields = reader.fields(node, what, &["resistance", "tolerance", "inductance"])?;
    let resistance = reader
        .required(&fields, "resistance", what, "1.000 Ω")
        .and_then(|node| {
            let expected = "a resistance above zero";
            let possible = |v: f64| v > 0.0;
            reader.quantity_if(
                node,
                "`resistance`",
                Dimension::Resistance,
                possible,
                expected,
            )
        });
    let tolerance = fields.get("tolerance").map(|node| tolerance(reader, node));
    let inductance = fields
        .get("inductance")
        .map(|node| standards::not_negative(reader, node, "`inductance`", Dimension::Inductance));
    Some(Reference {
        resistance: resistance?,
        tolerance: given(tolerance)?.unwrap_or(0.0),
        inductance: given(inductance)?.unwrap_or(0.0),
    })
}

/// The half-width of the reference's resistance: `0.1 %`.
fn tolerance(reader: &mut Reader<'_>, node: &Node) -> Option<f64> {
    let expected = "a half-width from 0 to below 50 %, such as `0.1 %`";
    let possible = |v: f64| (0.0..0.5).contains(&v);
    reader.share_if(node, "`tolerance`", possible, expected)
}

fn reference_belongs(reader: &mut Reader<'_>, fields: &Fields<'_>, method: Method) {
    let given = fields.entry("reference");
    match (given, method) {
        (None, Method::SeriesReference) => {
            reader.required(
                fields,
                "reference",
                "`series_reference`",
                "{resistance: 1.000 Ω}",
            );
        }
        (Some((key, _)), method) if method != Method::SeriesReference => reader.fault(
            key.span,
            "no_effect",
            "`reference` with a method that has none",
            "`reference` with `method: series_reference` only",
            Some("delete it, or correct `method`".to_owned()),
        ),
        _ => {}
    }
}

/// Channels and ratios are made impedance by the reference; impedance columns need none.
fn layout_suits(reader: &mut Reader<'_>, node: &Node, method: Method, layout: &super::Layout) {
    let has = |column: Column| layout.columns.iter().any(|(c, _)| *c == column);
    let relative = has(Column::ARe) || has(Column::RatioDb);
    let (found, expected) = match method {
        Method::Direct if relative => (
            "columns of channels or of their ratio with `method: direct`",
            "columns of impedance, or `method: series_reference` with `reference`",
        ),
        Method::SeriesReference if !relative => (
            "columns of impedance with `method: series_reference`",
            "columns of two channels (`a_re a_im b_re b_im`) or of their ratio \
             (`ratio_db phase`)",
        ),
        Method::ShuntThrough | Method::SeriesThrough | Method::Reflection => (
            "`layout` with a network method, whose sweeps are Touchstone files",
            "no `layout`: Touchstone files need none",
        ),
        Method::Direct | Method::SeriesReference => return,
    };
    let hint = Some("correct `method` or `layout`".to_owned());
    reader.fault(node.span, "layout_does_not_suit", found, expected, hint);
}
