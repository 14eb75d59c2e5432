//! What the operator types while the run goes on: a word, its first letter, or nothing (the pedal).

/// One line, understood.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Command {
    /// Enter alone.
    Enter,
    Undo,
    Again,
    Skip,
    Check,
    Operator(String),
    End,
    Pause,
    Help,
    /// Anything else: a scan of a label, or a slip.
    Text(String),
}

/// A command that takes nothing behind it.
const WORDS: [(&str, Command); 7] = [
    ("undo", Command::Undo),
    ("again", Command::Again),
    ("skip", Command::Skip),
    ("check", Command::Check),
    ("end", Command::End),
    ("pause", Command::Pause),
    ("help", Command::Help),
];

/// Understands a line.
pub fn read(line: &str) -> Command {
    let text = line.trim();
    if text.is_empty() {
        return Command::Enter;
    }
    if text == "?" {
        return Command::Help;
    }
    let lower = text.to_lowercase();
    if let Some((word, rest)) = text.split_once(char::is_whitespace)
        && ["operator", "o"].contains(&word.to_lowercase().as_str())
        && !rest.trim().is_empty()
    {
        return Command::Operator(rest.trim().to_owned());
    }
    for (word, command) in WORDS {
        if lower == word || (lower.len() == 1 && word.starts_with(&lower)) {
            return command;
        }
    }
    Command::Text(text.to_owned())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_and_their_first_letters() {
        assert_eq!(read("  "), Command::Enter);
        assert_eq!(read("u"), Command::Undo);
        assert_eq!(read("UNDO "), Command::Undo);
        assert_eq!(read("?"), Command::Help);
        assert_eq!(read("o OP-08"), Command::Operator("OP-08".into()));
        assert_eq!(read("operator"), Command::Text("operator".into()));
        assert_eq!(read("un"), Command::Text("un".into()));
        assert_eq!(read("1T26K-0457"), Command::Text("1T26K-0457".into()));
        let firsts: std::collections::BTreeSet<_> = WORDS.iter().map(|(w, _)| &w[..1]).collect();
        assert_eq!(firsts.len(), WORDS.len(), "no two begin alike");
    }
}
