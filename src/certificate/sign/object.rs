//! PDF objects as bytes (ISO 32000-1, 7.3), for what is appended to a finished file.

use lopdf::{Dictionary, Object, StringFormat};

/// Writes a direct object. Streams are not among them and are written as null.
pub(super) fn write(out: &mut Vec<u8>, object: &Object) {
    match object {
        Object::Null | Object::Stream(_) => out.extend(b"null"),
        Object::Boolean(value) => out.extend(value.to_string().bytes()),
        Object::Integer(value) => out.extend(value.to_string().bytes()),
        Object::Real(value) => out.extend(value.to_string().bytes()),
        Object::Name(name) => write_name(out, name),
        Object::String(bytes, StringFormat::Hexadecimal) => hexadecimal(out, bytes),
        Object::String(bytes, StringFormat::Literal) => literal(out, bytes),
        Object::Array(items) => {
            out.push(b'[');
            for (index, item) in items.iter().enumerate() {
                if index > 0 {
                    out.push(b' ');
                }
                write(out, item);
            }
            out.push(b']');
        }
        Object::Dictionary(dictionary) => write_dictionary(out, dictionary),
        Object::Reference((id, generation)) => {
            out.extend(format!("{id} {generation} R").bytes());
        }
    }
}

/// Writes a dictionary.
pub(super) fn write_dictionary(out: &mut Vec<u8>, dictionary: &Dictionary) {
    out.extend(b"<<");
    for (key, value) in dictionary.iter() {
        write_name(out, key);
        out.push(b' ');
        write(out, value);
    }
    out.extend(b">>");
}

fn write_name(out: &mut Vec<u8>, name: &[u8]) {
    out.push(b'/');
    for byte in name {
        let regular = byte.is_ascii_graphic() && !b"#()<>[]{}/%".contains(byte);
        if regular {
            out.push(*byte);
        } else {
            out.extend(format!("#{byte:02X}").bytes());
        }
    }
}

/// As hexadecimal digits in angle brackets.
pub(super) fn hexadecimal(out: &mut Vec<u8>, bytes: &[u8]) {
    out.push(b'<');
    for byte in bytes {
        out.extend(format!("{byte:02X}").bytes());
    }
    out.push(b'>');
}

fn literal(out: &mut Vec<u8>, bytes: &[u8]) {
    out.push(b'(');
    for byte in bytes {
        match byte {
            b'(' | b')' | b'\\' => out.extend([b'\\', *byte]),
            b' '..=b'~' => out.push(*byte),
            _ => out.extend(format!("\\{byte:03o}").bytes()),
        }
    }
    out.push(b')');
}
