//! Names of files by pattern: `*` stands for any characters, `?` for one.

/// Whether a name fits a pattern, without regard to the case of ASCII letters.
pub fn fits(pattern: &str, name: &str) -> bool {
    let pattern: Vec<char> = pattern.chars().map(|c| c.to_ascii_lowercase()).collect();
    let name: Vec<char> = name.chars().map(|c| c.to_ascii_lowercase()).collect();
    // The last `*` and how far its run has come; going back there is enough, since a later `*`
    // can take over whatever an earlier one could.
    let mut star: Option<(usize, usize)> = None;
    let (mut p, mut n) = (0, 0);
    while n < name.len() {
        match (pattern.get(p), name.get(n)) {
            (Some('*'), _) => {
                star = Some((p, n));
                p += 1;
            }
            (Some('?'), Some(_)) => {
                p += 1;
                n += 1;
            }
            (Some(a), Some(b)) if a == b => {
                p += 1;
                n += 1;
            }
            _ => {
                let Some((at, run)) = star else { return false };
                star = Some((at, run + 1));
                p = at + 1;
                n = run + 1;
            }
        }
    }
    pattern
        .get(p..)
        .unwrap_or_default()
        .iter()
        .all(|c| *c == '*')
}

#[cfg(test)]
mod tests {
    use super::fits;

    #[test]
    fn stars_and_question_marks() {
        for (pattern, name) in [
            ("*.csv", "017.csv"),
            ("*.csv", "017.CSV"),
            ("*.csv", ".csv"),
            ("sweep_???.s2p", "sweep_017.s2p"),
            ("*a*b*", "xxaxxbxx"),
            ("*ab", "aab"),
            ("*", ""),
            ("", ""),
            ("Messung *.csv", "Messung für µF.csv"),
        ] {
            assert!(fits(pattern, name), "{pattern} {name}");
        }
        for (pattern, name) in [
            ("*.csv", "017.csv.tmp"),
            ("sweep_???.s2p", "sweep_17.s2p"),
            ("*ab", "aba"),
            ("?", ""),
            ("a", "b"),
            ("", "a"),
        ] {
            assert!(!fits(pattern, name), "{pattern} {name}");
        }
    }

    #[test]
    fn many_stars_do_not_take_forever() {
        let pattern = "*a".repeat(60);
        assert!(!fits(&pattern, &"a".repeat(5000).replace("aaaaa", "aaab ")));
    }
}
