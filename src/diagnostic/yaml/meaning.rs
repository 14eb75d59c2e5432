//! What a file means, as serde_yaml has it; order and duplicate keys kept.

use serde::de::{
    Deserialize, Deserializer, EnumAccess, IgnoredAny, MapAccess, SeqAccess, VariantAccess, Visitor,
};
use std::fmt;

/// What serde_yaml takes a node for.
#[derive(Debug, Clone, PartialEq)]
pub enum Meaning {
    /// Nothing.
    Null,
    /// `true` or `false`.
    Bool(bool),
    /// Any number; integers beyond 2^53 lose their last digits here and keep them in the text.
    Number(f64),
    /// Text.
    Text(String),
    /// A list.
    List(Vec<Meaning>),
    /// Keys and values in the order of the file.
    Map(Vec<(Meaning, Meaning)>),
    /// Something with a tag of the author's own.
    Tagged,
}

/// Reads a file of one document.
pub fn read(text: &str) -> Result<Meaning, serde_yaml::Error> {
    serde_yaml::from_str(text)
}

impl<'de> Deserialize<'de> for Meaning {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_any(MeaningVisitor)
    }
}

struct MeaningVisitor;

impl<'de> Visitor<'de> for MeaningVisitor {
    type Value = Meaning;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("any YAML node")
    }

    fn visit_unit<E>(self) -> Result<Meaning, E> {
        Ok(Meaning::Null)
    }

    fn visit_bool<E>(self, value: bool) -> Result<Meaning, E> {
        Ok(Meaning::Bool(value))
    }

    fn visit_i64<E>(self, value: i64) -> Result<Meaning, E> {
        Ok(Meaning::Number(value as f64))
    }

    fn visit_u64<E>(self, value: u64) -> Result<Meaning, E> {
        Ok(Meaning::Number(value as f64))
    }

    fn visit_i128<E>(self, value: i128) -> Result<Meaning, E> {
        Ok(Meaning::Number(value as f64))
    }

    fn visit_u128<E>(self, value: u128) -> Result<Meaning, E> {
        Ok(Meaning::Number(value as f64))
    }

    fn visit_f64<E>(self, value: f64) -> Result<Meaning, E> {
        Ok(Meaning::Number(value))
    }

    fn visit_str<E>(self, value: &str) -> Result<Meaning, E> {
        Ok(Meaning::Text(value.to_owned()))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<Meaning, A::Error> {
        let mut list = Vec::new();
        while let Some(item) = items.next_element()? {
            list.push(item);
        }
        Ok(Meaning::List(list))
    }

    fn visit_map<A: MapAccess<'de>>(self, mut entries: A) -> Result<Meaning, A::Error> {
        let mut map = Vec::new();
        while let Some(entry) = entries.next_entry()? {
            map.push(entry);
        }
        Ok(Meaning::Map(map))
    }

    fn visit_enum<A: EnumAccess<'de>>(self, data: A) -> Result<Meaning, A::Error> {
        let (IgnoredAny, content) = data.variant()?;
        content.newtype_variant::<IgnoredAny>()?;
        Ok(Meaning::Tagged)
    }
}
