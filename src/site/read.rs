//! A site file from its bytes.

use super::{Approval, Role, Signing, SiteFile, trusted};
use crate::diagnostic::yaml::{Fields, Node, Reader};
use crate::diagnostic::{Faults, Source, yaml};

/// JSON Schema (draft 2020-12) of a site file, for editors.
pub const SCHEMA: &str = include_str!("site.schema.json");

const KEYS: [&str; 5] = ["site", "approval", "trusted_keys", "witness", "signing"];

/// Reads a site file.
///
/// `path` is only named in faults. Errors: every fault of the file, with its place.
pub fn read(path: &str, bytes: &[u8]) -> Result<SiteFile, Faults> {
    let source = Source::new(path, bytes)?;
    let root = yaml::parse(&source)?;
    let mut reader = Reader::new(&source);
    let site = site(&mut reader, &root);
    reader.finish(site)
}

fn site(reader: &mut Reader<'_>, root: &Node) -> Option<SiteFile> {
    let what = "a site file";
    let fields = reader.fields(root, what, &KEYS)?;
    let name = reader
        .required(&fields, "site", what, "Goods-in, hall 2")
        .and_then(|node| reader.line(node, "`site`"));
    let approval = match fields.get("approval") {
        None => Some(Approval::default()),
        Some(node) => approval(reader, node),
    };
    let trusted_keys = match fields.get("trusted_keys") {
        None => Some(Vec::new()),
        Some(node) => trusted::read_all(reader, node),
    };
    if let (Some(Approval::Required), Some(keys)) = (approval, &trusted_keys)
        && !keys.iter().any(|key| key.role == Role::QualityEngineer)
    {
        nobody_approves(reader, &fields);
    }
    let witness = fields
        .get("witness")
        .map(|node| file(reader, node, "`witness`"));
    let signing = fields.get("signing").map(|node| signing(reader, node));
    Some(SiteFile {
        name: name?,
        approval: approval?,
        trusted_keys: trusted_keys?,
        witness: given(witness)?,
        signing: given(signing)?,
    })
}

/// `None` only where the key is there and has faults.
pub(super) fn given<T>(read: Option<Option<T>>) -> Option<Option<T>> {
    match read {
        None => Some(None),
        Some(None) => None,
        Some(value) => Some(value),
    }
}

fn approval(reader: &mut Reader<'_>, node: &Node) -> Option<Approval> {
    let both = [Approval::Required, Approval::Optional];
    let index = reader.one_of(node, "a demand for approval", &both.map(Approval::name))?;
    both.get(index).copied()
}

/// Every lot would be held, and nobody could change that.
fn nobody_approves(reader: &mut Reader<'_>, fields: &Fields<'_>) {
    let span = fields.get("approval").map_or(fields.span, |node| node.span);
    reader.fault(
        span,
        "nobody_approves",
        "`approval: required` without a trusted key that may approve limit files",
        "a key with `role: quality_engineer` in `trusted_keys`",
        Some(
            "make a key with `reelgate limits key` and put the line that it prints under `trusted_keys:`"
                .to_owned(),
        ),
    );
}

/// A file that may lie outside of the site's folder: on another machine, or where few can read.
fn file(reader: &mut Reader<'_>, node: &Node, what: &str) -> Option<String> {
    let path = reader.line(node, what)?;
    if path.ends_with(['/', '\\']) {
        reader.fault(
            node.span,
            "not_a_file",
            format!("the folder `{path}` for {what}"),
            "the path of a file",
            Some("name a file in that folder".to_owned()),
        );
        return None;
    }
    Some(path)
}

fn signing(reader: &mut Reader<'_>, node: &Node) -> Option<Signing> {
    let what = "`signing`";
    let fields = reader.fields(node, what, &["certificate", "key"])?;
    let certificate = reader
        .required(&fields, "certificate", what, "keys/goods-in.crt.pem")
        .and_then(|node| file(reader, node, "`certificate`"));
    let key = reader
        .required(&fields, "key", what, "keys/goods-in.key.pem")
        .and_then(|node| file(reader, node, "`key`"));
    Some(Signing {
        certificate: certificate?,
        key: key?,
    })
}
