//! Names of parts, lots and stations, which become names of files.

/// Longest name, in characters.
pub const LONGEST: usize = 64;

/// Device names that Windows gives no file, with or without an extension.
const RESERVED: [&str; 28] = [
    "CON", "PRN", "AUX", "NUL", "CONIN$", "CONOUT$", "COM0", "COM1", "COM2", "COM3", "COM4",
    "COM5", "COM6", "COM7", "COM8", "COM9", "LPT0", "LPT1", "LPT2", "LPT3", "LPT4", "LPT5", "LPT6",
    "LPT7", "LPT8", "LPT9", "CLOCK$", "CONFIG$",
];

/// Why a text cannot be the name of a file on every platform; `None` where it can.
///
/// Allowed are letters and digits of ASCII and `- _ . +` and single spaces inside, up to 64
/// characters, not starting or ending with a dot or space, and no reserved device name.
pub fn fault_of(name: &str) -> Option<String> {
    if name.is_empty() {
        return Some("an empty name".to_owned());
    }
    if name.chars().count() > LONGEST {
        return Some(format!("a name longer than {LONGEST} characters"));
    }
    if let Some(c) = name.chars().find(|&c| !allowed(c)) {
        return Some(format!("`{}` in a name", super::printable(&c.to_string())));
    }
    let ends = |c: char| c == '.' || c == ' ';
    if name.starts_with(ends) || name.ends_with(ends) {
        return Some("a name that starts or ends with a dot or a space".to_owned());
    }
    let stem = name.split('.').next().unwrap_or(name).trim_end();
    let reserved = RESERVED.iter().any(|r| stem.eq_ignore_ascii_case(r));
    reserved.then(|| format!("`{stem}`, which Windows keeps for a device"))
}

fn allowed(c: char) -> bool {
    c.is_ascii_alphanumeric() || matches!(c, '-' | '_' | '.' | '+' | ' ')
}

/// Why a text cannot be a relative path inside a folder, written with `/`; `None` where it can.
pub fn fault_of_path(path: &str) -> Option<String> {
    if path.is_empty() {
        return Some("an empty path".to_owned());
    }
    if path.contains('\\') {
        return Some("a path with `\\`".to_owned());
    }
    if path.starts_with('/') || path.contains(':') {
        return Some("an absolute path".to_owned());
    }
    if path.chars().count() > 240 {
        return Some("a path longer than 240 characters".to_owned());
    }
    path.split('/').find_map(fault_of_step)
}

fn fault_of_step(step: &str) -> Option<String> {
    match step {
        "" => Some("a path with an empty step".to_owned()),
        "." | ".." => Some(format!("a path with `{step}`")),
        _ if step.chars().any(super::printable::is_hidden) => {
            Some("a path with an invisible character".to_owned())
        }
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_that_every_platform_takes() {
        for name in [
            "RG-0475-X7R",
            "26K-0457",
            "BENCH-2",
            "a",
            "COMET",
            "lot 7",
            "v1.2+b",
        ] {
            assert_eq!(fault_of(name), None, "{name}");
        }
    }

    #[test]
    fn names_that_some_platform_refuses() {
        for name in [
            "",
            "a/b",
            "a\\b",
            "..",
            ".a",
            "a.",
            "a ",
            " a",
            "con",
            "NUL.yaml",
            "COM1",
            "a:b",
            "a\u{0}",
            "a\u{202e}b",
            "a*",
            "x\"y",
            "µ",
        ] {
            assert!(fault_of(name).is_some(), "{name:?}");
        }
        assert!(fault_of(&"x".repeat(65)).is_some());
    }

    #[test]
    fn paths_stay_in_their_folder() {
        assert_eq!(fault_of_path("compensation/open.csv"), None);
        for path in ["", "/etc/x", "../x", "a/../b", "C:/x", "a\\b", "a//b", "a/"] {
            assert!(fault_of_path(path).is_some(), "{path}");
        }
    }
}
