//! The walk over a file: typed access that collects every fault and goes on.
//!
//! A method that answers `None` has put a fault down, so that a file without faults is complete.

mod kelvin;
mod scalars;

pub use scalars::{parse_date, parse_moment, shown};

use super::{Node, Shape};
use crate::diagnostic::{Fault, Faults, Source, Span, excerpt};

/// Walks the nodes of one file and collects its faults.
#[derive(Debug)]
pub struct Reader<'a> {
    source: &'a Source,
    faults: Vec<Fault>,
}

/// The entries of a map whose keys are all known.
#[derive(Debug)]
pub struct Fields<'n> {
    /// Where faults of the map as a whole are marked.
    pub span: Span,
    entries: Vec<(&'n str, &'n Node, &'n Node)>,
}

impl<'n> Fields<'n> {
    /// The value of a key, where the file has it.
    pub fn get(&self, key: &str) -> Option<&'n Node> {
        self.entry(key).map(|(_, value)| value)
    }

    /// Key and value.
    pub fn entry(&self, key: &str) -> Option<(&'n Node, &'n Node)> {
        self.iter()
            .find(|(name, ..)| *name == key)
            .map(|(_, key, value)| (key, value))
    }

    /// Name, key and value in the order of the file.
    pub fn iter(&self) -> impl Iterator<Item = (&'n str, &'n Node, &'n Node)> + '_ {
        self.entries.iter().copied()
    }
}

impl<'a> Reader<'a> {
    /// A walk with the faults that the text had already.
    pub fn new(source: &'a Source) -> Self {
        Reader {
            source,
            faults: source.hygiene().to_vec(),
        }
    }

    /// Puts a fault down.
    pub fn fault(
        &mut self,
        span: Span,
        code: &'static str,
        found: impl Into<String>,
        expected: impl Into<String>,
        hint: Option<String>,
    ) {
        let fault = self.source.fault(span, code, found, expected, hint);
        self.faults.push(fault);
    }

    /// How many faults there are so far.
    pub fn count(&self) -> usize {
        self.faults.len()
    }

    /// The value where the walk found no fault, all faults otherwise.
    pub fn finish<T>(self, value: Option<T>) -> Result<T, Faults> {
        match (Faults::new(self.faults), value) {
            (None, Some(value)) => Ok(value),
            (Some(faults), _) => Err(faults),
            (None, None) => Err(Faults::of_file(
                self.source.path(),
                "incomplete",
                "a file that could not be read to its end",
                "a complete file",
                None,
            )),
        }
    }

    /// The entries of a map. `what` names it: "a bound". Unknown keys and keys given twice are
    /// faults.
    pub fn fields<'n>(&mut self, node: &'n Node, what: &str, known: &[&str]) -> Option<Fields<'n>> {
        let names: Vec<String> = known.iter().map(|k| format!("`{k}:`")).collect();
        let expected = format!("keys with values: {}", names.join(", "));
        let fields = self.map(node, what, &expected)?;
        for (name, key, _) in fields.iter() {
            if !known.contains(&name) {
                self.unknown(
                    key.span,
                    "unknown_key",
                    name,
                    &format!("no key of {what}"),
                    known,
                );
            }
        }
        Some(fields)
    }

    /// The entries of a map whose keys are names of the author's own.
    pub fn entries<'n>(&mut self, node: &'n Node, what: &str) -> Option<Fields<'n>> {
        self.map(node, what, "keys, each with a value")
    }

    fn map<'n>(&mut self, node: &'n Node, what: &str, expected: &str) -> Option<Fields<'n>> {
        let Shape::Map(map) = &node.shape else {
            self.fault(
                node.span,
                "not_a_map",
                format!("{} in place of {what}", node.shape.words()),
                expected,
                None,
            );
            return None;
        };
        let mut seen = std::collections::HashMap::new();
        let mut fields = Fields {
            span: node.span,
            entries: Vec::with_capacity(map.len()),
        };
        for (key, value) in map {
            let Some(name) = self.key(key) else { continue };
            if let Some(first) = seen.insert(name, key.span.line) {
                seen.insert(name, first);
                self.duplicate(key.span, name, first);
                continue;
            }
            fields.entries.push((name, key, value));
        }
        Some(fields)
    }

    fn key<'n>(&mut self, key: &'n Node) -> Option<&'n str> {
        match &key.shape {
            Shape::Text { text, .. } if text == "<<" => {
                self.fault(
                    key.span,
                    "merge_key",
                    "a merge key (`<<`)",
                    "plain keys: anchors, aliases and merge keys are not used in these files",
                    Some("write the keys out where they are needed".to_owned()),
                );
                None
            }
            Shape::Text { text, .. } | Shape::Number(text, _) | Shape::Bool(text) => Some(text),
            other => {
                let found = format!("{} as a key", other.words());
                self.fault(key.span, "not_a_key", found, "a word as a key", None);
                None
            }
        }
    }

    fn duplicate(&mut self, span: Span, name: &str, first: usize) {
        let name = excerpt(name);
        self.fault(
            span,
            "duplicate_key",
            format!("`{name}` a second time"),
            format!("each key once (the first is on line {first})"),
            Some("delete one of the two".to_owned()),
        );
    }

    /// A name that is none of the known ones, with its nearest neighbour.
    pub fn unknown(
        &mut self,
        span: Span,
        code: &'static str,
        name: &str,
        is: &str,
        known: &[&str],
    ) {
        let list: Vec<String> = known.iter().map(|k| format!("`{k}`")).collect();
        let expected = match list.as_slice() {
            [] => "something else".to_owned(),
            [only] => format!("only {only}"),
            [start @ .., last] => format!("one of {} or {last}", start.join(", ")),
        };
        let hint = nearest(name, known).map_or_else(
            || "use one of the words listed".to_owned(),
            |near| format!("did you mean `{near}`?"),
        );
        let found = format!("`{}` is {is}", excerpt(name));
        self.fault(span, code, found, expected, Some(hint));
    }

    /// Where the file lies in the folder `folder`, its stem must be the name it states.
    pub fn stem_is(&mut self, node: &Node, path: &str, folder: &str, name: &str, key: &str) {
        let mut steps = path.rsplit(['/', '\\']);
        let file = steps.next().unwrap_or_default();
        let stem = file.rsplit_once('.').map_or(file, |(stem, _)| stem);
        if steps.next() != Some(folder) || stem == name {
            return;
        }
        self.fault(
            node.span,
            "name_differs_from_file",
            format!("`{key}: {name}` in a file named `{}`", excerpt(file)),
            format!("the file's name, which is how the {key} is found"),
            Some(format!(
                "rename the file to `{name}.yaml`, or correct `{key}`"
            )),
        );
    }

    /// The value of a key that must be there. `example` shows how it is written.
    pub fn required<'n>(
        &mut self,
        fields: &Fields<'n>,
        key: &str,
        what: &str,
        example: &str,
    ) -> Option<&'n Node> {
        let value = fields.get(key);
        if value.is_none() {
            let misspelt = fields.iter().any(|(name, ..)| is_near(name, key));
            if !misspelt {
                self.fault(
                    fields.span,
                    "missing_key",
                    format!("{what} without `{key}`"),
                    format!("`{key}`"),
                    Some(format!("add `{key}: {example}`")),
                );
            }
        }
        value
    }
}

/// The known name nearest to a misspelt one, where one is near at all.
pub fn nearest<'k>(name: &str, known: &[&'k str]) -> Option<&'k str> {
    if name.len() > 80 {
        return None;
    }
    let plain = |text: &str| text.to_lowercase().replace([' ', '-'], "_");
    let name = plain(name);
    let scored = known
        .iter()
        .map(|k| (strsim::damerau_levenshtein(&name, &plain(k)), *k));
    let (distance, best) = scored.min_by_key(|(distance, _)| *distance)?;
    let length = best.chars().count().max(name.chars().count());
    let prefix = name.len() >= 3
        && best.starts_with(&name)
        && known.iter().filter(|k| k.starts_with(&name)).count() == 1;
    (distance * 5 <= length * 2 || prefix).then_some(best)
}

fn is_near(name: &str, key: &str) -> bool {
    name != key && nearest(name, &[key]).is_some()
}

#[cfg(test)]
mod tests {
    use super::nearest;

    #[test]
    fn the_nearest_name_is_found_and_a_far_one_is_not() {
        let known = ["tolerance", "nominal", "min", "max", "class"];
        assert_eq!(nearest("toleranse", &known), Some("tolerance"));
        assert_eq!(nearest("Nominal", &known), Some("nominal"));
        assert_eq!(nearest("mx", &known), Some("max"));
        assert_eq!(nearest("zebra", &known), None);
        assert_eq!(nearest(&"a".repeat(1000), &known), None);
    }
}
