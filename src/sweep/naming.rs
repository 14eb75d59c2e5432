//! File names: which are sweeps, which part and try they belong to, and the order people expect.

use super::Attempt;
use std::cmp::Ordering;

/// Extensions of delimited sweep tables.
const TABLES: [&str; 4] = ["csv", "txt", "tsv", "dat"];

/// How a sweep file is to be read, by its name.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Kind {
    Delimited,
    /// Touchstone; the number of ports where the extension tells it (`.s2p`), not with `.ts`.
    Touchstone {
        ports: Option<usize>,
    },
}

/// The kind of a file by its extension; `None` for what is no sweep.
pub(super) fn kind(name: &str) -> Option<Kind> {
    let (_, extension) = file_name(name).rsplit_once('.')?;
    let extension = extension.to_ascii_lowercase();
    if TABLES.contains(&extension.as_str()) {
        return Some(Kind::Delimited);
    }
    if extension == "ts" {
        return Some(Kind::Touchstone { ports: None });
    }
    let digits = extension
        .strip_prefix(['s', 'y', 'z', 'g', 'h'])?
        .strip_suffix('p')?;
    match digits.parse::<usize>() {
        Ok(ports) if (1..=99).contains(&ports) => Some(Kind::Touchstone { ports: Some(ports) }),
        _ => None,
    }
}

/// Whether a file of the sweep folder is a sweep: tables (`csv`, `txt`, `tsv`, `dat`) and
/// Touchstone (`s1p`, `s2p`, `z1p`, `ts`, …). Hidden files, leftovers of editors and office
/// programs, and readme texts are not.
pub fn is_sweep_file(name: &str) -> bool {
    let hidden = name.split('/').any(|folder| {
        folder.starts_with('.') && folder != "." && folder != ".." || folder == "__MACOSX"
    });
    let leaf = file_name(name);
    let leftover = leaf.starts_with("~$") || leaf.starts_with('#') || leaf.ends_with('~');
    let readme = stem(name).eq_ignore_ascii_case("readme");
    !hidden && !leftover && !readme && kind(name).is_some()
}

fn file_name(name: &str) -> &str {
    name.rsplit_once('/').map_or(name, |(_, leaf)| leaf)
}

/// The file name without folders and without its last extension.
pub(super) fn stem(name: &str) -> &str {
    let leaf = file_name(name);
    leaf.rsplit_once('.').map_or(leaf, |(stem, _)| stem)
}

/// Part and try from a stem or a cell of the `part` column: `017~2` is the second try at 017.
pub(super) fn part_and_attempt(text: &str) -> (&str, u32) {
    let try_of = |(part, digits): (&'_ str, &'_ str)| {
        let numeric = !digits.is_empty() && digits.bytes().all(|b| b.is_ascii_digit());
        let attempt = digits.parse::<u32>().ok().filter(|&n| numeric && n > 0)?;
        (!part.is_empty()).then_some(attempt)
    };
    match text.rsplit_once('~') {
        Some(pair) => match try_of(pair) {
            Some(attempt) => (pair.0, attempt),
            None => (text, 1),
        },
        None => (text, 1),
    }
}

/// Orders attempts by part (2 before 10), then try, then file.
pub fn order(attempts: &mut [Attempt]) {
    attempts.sort_by(|a, b| {
        natural_order(&a.part, &b.part)
            .then(a.attempt.cmp(&b.attempt))
            .then_with(|| natural_order(&a.file, &b.file))
    });
}

/// Compares texts with runs of digits taken as numbers of any length; a total order.
pub fn natural_order(a: &str, b: &str) -> Ordering {
    let (mut x, mut y) = (a.as_bytes(), b.as_bytes());
    loop {
        match (x.first(), y.first()) {
            (None, None) => return a.cmp(b),
            (None, Some(_)) => return Ordering::Less,
            (Some(_), None) => return Ordering::Greater,
            (Some(p), Some(q)) if p.is_ascii_digit() && q.is_ascii_digit() => {
                let (m, n) = (digits(&mut x), digits(&mut y));
                match m.len().cmp(&n.len()).then_with(|| m.cmp(n)) {
                    Ordering::Equal => {}
                    unequal => return unequal,
                }
            }
            (Some(p), Some(q)) => {
                match p.cmp(q) {
                    Ordering::Equal => {}
                    unequal => return unequal,
                }
                x = x.get(1..).unwrap_or_default();
                y = y.get(1..).unwrap_or_default();
            }
        }
    }
}

/// Takes the leading run of digits; without its leading zeros.
fn digits<'a>(text: &mut &'a [u8]) -> &'a [u8] {
    let end = text
        .iter()
        .position(|b| !b.is_ascii_digit())
        .unwrap_or(text.len());
    let (run, rest) = text.split_at(end);
    *text = rest;
    let zeros = run.iter().position(|&b| b != b'0').unwrap_or(run.len());
    run.get(zeros..).unwrap_or_default()
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn sweeps_are_told_from_leftovers() {
        for name in [
            "017.csv",
            "a/017~2.CSV",
            "x.s1p",
            "x.S2P",
            "x.z1p",
            "x.ts",
            "n.tsv",
            "d.dat",
            "t.txt",
        ] {
            assert!(is_sweep_file(name), "{name}");
        }
        for name in [
            ".017.csv",
            "._017.csv",
            "~$017.csv",
            "017.csv~",
            "#017.csv#",
            "017.csv.bak",
            "lot.yaml",
            "017",
            "README.txt",
            ".git/017.csv",
            "__MACOSX/017.csv",
            "017.sp",
            "017.s0p",
            "photo.png",
            "",
        ] {
            assert!(!is_sweep_file(name), "{name}");
        }
    }

    #[test]
    fn tries_are_counted_after_the_tilde() {
        assert_eq!(part_and_attempt("017"), ("017", 1));
        assert_eq!(part_and_attempt("017~2"), ("017", 2));
        assert_eq!(part_and_attempt("017~0"), ("017~0", 1));
        assert_eq!(part_and_attempt("017~x"), ("017~x", 1));
        assert_eq!(part_and_attempt("017~+2"), ("017~+2", 1));
        assert_eq!(part_and_attempt("~2"), ("~2", 1));
        assert_eq!(part_and_attempt("a~1~3"), ("a~1", 3));
    }

    #[test]
    fn two_stands_before_ten() {
        let mut names = vec![
            "10",
            "2",
            "1",
            "a10",
            "a9",
            "002",
            "99999999999999999999999",
            "3",
        ];
        names.sort_by(|a, b| natural_order(a, b));
        assert_eq!(
            names,
            [
                "1",
                "002",
                "2",
                "3",
                "10",
                "99999999999999999999999",
                "a9",
                "a10"
            ]
        );
    }

    proptest! {
        #[test]
        fn natural_order_is_total(a in "[a0-9é~]{0,6}", b in "[a0-9é~]{0,6}", c in "[a0-9é~]{0,6}") {
            prop_assert_eq!(natural_order(&a, &b), natural_order(&b, &a).reverse());
            prop_assert_eq!(natural_order(&a, &b) == Ordering::Equal, a == b);
            if natural_order(&a, &b).is_le() && natural_order(&b, &c).is_le() {
                prop_assert!(natural_order(&a, &c).is_le());
            }
        }
    }
}
