//! The keys that a site trusts.

use super::read::given;
use super::{Role, TrustedKey};
use crate::diagnostic::excerpt;
use crate::diagnostic::yaml::{Node, Reader, Shape};
use crate::keys::Verifier;

const KEYS: [&str; 5] = ["name", "role", "key", "from_entry", "revoked_at_entry"];
/// No ledger has more entries.
const LAST_ENTRY: u64 = 1 << 53;

/// All keys of the list.
pub fn read_all(reader: &mut Reader<'_>, node: &Node) -> Option<Vec<TrustedKey>> {
    let Shape::List(nodes) = &node.shape else {
        reader.fault(
            node.span,
            "not_a_list",
            format!("{} for `trusted_keys`", node.shape.words()),
            "a list, one `- {name: …, role: …, key: …}` for each key",
            Some("put the line that `reelgate limits key` prints, with its dash".to_owned()),
        );
        return None;
    };
    let read: Vec<Option<(TrustedKey, &Node)>> =
        nodes.iter().map(|node| one(reader, node)).collect();
    let mut kept: Vec<TrustedKey> = Vec::new();
    let mut complete = true;
    for found in read {
        match found {
            Some((key, at)) if is_new(reader, at, &key, &kept) => kept.push(key),
            _ => complete = false,
        }
    }
    complete.then_some(kept)
}

fn one<'n>(reader: &mut Reader<'_>, node: &'n Node) -> Option<(TrustedKey, &'n Node)> {
    let what = "a trusted key";
    let fields = reader.fields(node, what, &KEYS)?;
    let name = reader
        .required(&fields, "name", what, "QE-02")
        .and_then(|node| name(reader, node));
    let roles = Role::ALL.map(Role::name);
    let role = reader
        .required(&fields, "role", what, "quality_engineer")
        .and_then(|node| reader.one_of(node, "a role", &roles))
        .and_then(|index| Role::ALL.get(index).copied());
    let key = reader
        .required(
            &fields,
            "key",
            what,
            "the line that `reelgate limits key` prints",
        )
        .and_then(|node| public(reader, node, name.as_deref()).map(|key| (key, node)));
    let entry = |reader: &mut Reader<'_>, key: &str| {
        let label = format!("`{key}`");
        fields
            .get(key)
            .map(|node| reader.integer(node, &label, (0, LAST_ENTRY)))
    };
    let from = entry(reader, "from_entry");
    let revoked = entry(reader, "revoked_at_entry");
    let (key, at) = key?;
    name?;
    let trusted = TrustedKey {
        key,
        role: role?,
        from_entry: given(from)?.unwrap_or(0),
        revoked_at_entry: given(revoked)?,
    };
    Some((trusted, at))
}

/// Names are of plain letters, so that no two look alike, and stand in signatures, which hold no
/// spaces and no plus signs.
fn name(reader: &mut Reader<'_>, node: &Node) -> Option<String> {
    let name = reader.name(node, "`name`")?;
    if name.contains(['+', ' ']) {
        reader.fault(
            node.span,
            "name_not_safe",
            format!("a space or a plus sign in `name` `{}`", excerpt(&name)),
            "letters A-Z a-z, digits, `-`, `_` and `.`",
            Some("take the code that the site uses for the person, such as `QE-02`".to_owned()),
        );
        return None;
    }
    Some(name)
}

fn public(reader: &mut Reader<'_>, node: &Node, name: Option<&str>) -> Option<Verifier> {
    let text = reader.line(node, "`key`")?;
    let key = match Verifier::read(&text) {
        Ok(key) => key,
        Err(why) => {
            let hint = "copy the whole line that `reelgate limits key` printed for it";
            reader.fault(
                node.span,
                "not_a_key",
                format!("`{}`: {why}", excerpt(&text)),
                "a public key of the form name+id+base64",
                Some(hint.to_owned()),
            );
            return None;
        }
    };
    match name {
        Some(name) if name != key.name() => {
            reader.fault(
                node.span,
                "key_of_another",
                format!("the key of `{}` for `{name}`", excerpt(key.name())),
                "the key that was made under this name",
                Some("correct `name`, or put the key of that person".to_owned()),
            );
            None
        }
        _ => Some(key),
    }
}

fn is_new(reader: &mut Reader<'_>, at: &Node, key: &TrustedKey, kept: &[TrustedKey]) -> bool {
    let same = |other: &&TrustedKey| {
        other.key.name().eq_ignore_ascii_case(key.key.name())
            || other.key.public() == key.key.public()
    };
    let Some(other) = kept.iter().find(same) else {
        return true;
    };
    reader.fault(
        at.span,
        "duplicate_key",
        format!(
            "`{}` after `{}`: the same name or the same key a second time",
            key.key.name(),
            other.key.name()
        ),
        "each person and each key once",
        Some("delete one of the two; a new key gets a new name, such as `QE-02-b`".to_owned()),
    );
    false
}
