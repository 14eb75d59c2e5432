//! The one byte form of a record: JSON, two-space indent, keys in the order of the types, floats
//! in the shortest form that reads back to the same value, a final newline.

use super::LotRecord;

/// The bytes of `<record>.json`.
///
/// # Errors
/// None for records made by this program: they hold no non-finite numbers and no maps but with
/// text keys. The error is kept so that no input can cause a panic.
pub fn to_bytes(record: &LotRecord) -> Result<Vec<u8>, serde_json::Error> {
    let mut bytes = serde_json::to_vec_pretty(record)?;
    bytes.push(b'\n');
    Ok(bytes)
}

/// Reads `<record>.json` back.
///
/// # Errors
/// Anything that is not a record of this schema.
pub fn from_bytes(bytes: &[u8]) -> Result<LotRecord, serde_json::Error> {
    serde_json::from_slice(bytes)
}
