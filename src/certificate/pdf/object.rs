//! PDF objects as bytes (ISO 32000-1, 7.3).

use super::content::natural;
use lopdf::{Dictionary, Object, StringFormat};

/// Writes an object as it stands within others.
pub(in crate::certificate) fn value(out: &mut Vec<u8>, object: &Object) {
    match object {
        Object::Boolean(true) => out.extend_from_slice(b"true"),
        Object::Boolean(false) => out.extend_from_slice(b"false"),
        Object::Integer(number) => {
            if *number < 0 {
                out.push(b'-');
            }
            natural(out, number.unsigned_abs());
        }
        Object::Real(number) => out.extend_from_slice(number.to_string().as_bytes()),
        Object::Name(text) => name(out, text),
        Object::String(bytes, StringFormat::Literal) => literal(out, bytes),
        Object::String(bytes, StringFormat::Hexadecimal) => hexadecimal(out, bytes),
        Object::Array(objects) => {
            out.push(b'[');
            for (index, object) in objects.iter().enumerate() {
                if index > 0 {
                    out.push(b' ');
                }
                value(out, object);
            }
            out.push(b']');
        }
        Object::Dictionary(entries) => dictionary(out, entries),
        Object::Reference((id, generation)) => {
            natural(out, u64::from(*id));
            out.push(b' ');
            natural(out, u64::from(*generation));
            out.extend_from_slice(b" R");
        }
        // No stream stands within another object.
        Object::Null | Object::Stream(_) => out.extend_from_slice(b"null"),
    }
}

/// Writes a dictionary.
pub(in crate::certificate) fn dictionary(out: &mut Vec<u8>, entries: &Dictionary) {
    out.extend_from_slice(b"<<");
    for (key, object) in entries {
        name(out, key);
        out.push(b' ');
        value(out, object);
    }
    out.extend_from_slice(b">>");
}

fn name(out: &mut Vec<u8>, text: &[u8]) {
    out.push(b'/');
    for byte in text {
        if byte.is_ascii_graphic() && !b"()<>[]{}/%#".contains(byte) {
            out.push(*byte);
        } else {
            out.push(b'#');
            digits(out, *byte);
        }
    }
}

fn literal(out: &mut Vec<u8>, text: &[u8]) {
    out.push(b'(');
    for byte in text {
        match byte {
            b'(' | b')' | b'\\' => out.extend_from_slice(&[b'\\', *byte]),
            // An end of line of any kind would be read as a line feed.
            b'\r' => out.extend_from_slice(b"\\r"),
            _ => out.push(*byte),
        }
    }
    out.push(b')');
}

/// Writes bytes as hexadecimal digits in angle brackets.
pub(in crate::certificate) fn hexadecimal(out: &mut Vec<u8>, bytes: &[u8]) {
    out.push(b'<');
    for byte in bytes {
        digits(out, *byte);
    }
    out.push(b'>');
}

fn digits(out: &mut Vec<u8>, byte: u8) {
    const DIGITS: &[u8; 16] = b"0123456789ABCDEF";
    out.push(DIGITS[usize::from(byte >> 4)]);
    out.push(DIGITS[usize::from(byte & 15)]);
}
