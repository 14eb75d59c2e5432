//! Passphrases: from the terminal without showing them, or from a file for scripts; never from the
//! command line, which other users of the machine can read.

use std::fs::File;
use std::io::Read;
use std::path::Path;

/// Longest passphrase file that is read, in bytes.
const MOST: u64 = 4096;

/// The passphrase of the first line of a file (`-`: standard input), else what is typed; `twice`
/// where a mistake could not be mended later.
///
/// # Errors
/// In words.
pub fn get(file: Option<&Path>, whose: &str, twice: bool) -> Result<String, String> {
    match file {
        Some(path) if path == Path::new("-") => first_line(&mut std::io::stdin(), "standard input"),
        Some(path) => {
            let name = path.display().to_string();
            let mut file = File::open(path).map_err(|e| format!("{name}: cannot be read: {e}"))?;
            first_line(&mut file, &name)
        }
        None => typed(whose, twice),
    }
}

fn first_line(from: &mut dyn Read, name: &str) -> Result<String, String> {
    let mut text = String::new();
    from.take(MOST)
        .read_to_string(&mut text)
        .map_err(|e| format!("{name}: cannot be read: {e}"))?;
    match text.lines().next() {
        Some(line) if !line.is_empty() => Ok(line.to_owned()),
        _ => Err(format!("{name}: the first line holds no passphrase")),
    }
}

fn typed(whose: &str, twice: bool) -> Result<String, String> {
    let ask = |prompt: String| {
        rpassword::prompt_password(prompt).map_err(|e| {
            format!("there is no terminal to ask for the passphrase ({e}): give --passphrase-file")
        })
    };
    let first = ask(format!("Passphrase for the key {whose}: "))?;
    if twice && ask("The same again: ".to_owned())? != first {
        return Err("the two passphrases differ: nothing was made; do it again".to_owned());
    }
    Ok(first)
}
