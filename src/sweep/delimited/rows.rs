//! Lines and their fields, in one pass over the bytes and without a copy.

use super::decimal;

/// What stands between two fields.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Delimiter {
    Comma,
    Semicolon,
    Tab,
    /// Any run of blanks and tabs.
    Whitespace,
}

impl Delimiter {
    /// In the order in which they are tried.
    pub const ALL: [Delimiter; 4] = [
        Delimiter::Semicolon,
        Delimiter::Tab,
        Delimiter::Comma,
        Delimiter::Whitespace,
    ];

    pub fn is(self, byte: u8) -> bool {
        match self {
            Delimiter::Comma => byte == b',',
            Delimiter::Semicolon => byte == b';',
            Delimiter::Tab => byte == b'\t',
            Delimiter::Whitespace => byte == b' ' || byte == b'\t',
        }
    }

    /// The byte that it always is; none for runs of blanks.
    fn byte(self) -> Option<u8> {
        match self {
            Delimiter::Comma => Some(b','),
            Delimiter::Semicolon => Some(b';'),
            Delimiter::Tab => Some(b'\t'),
            Delimiter::Whitespace => None,
        }
    }

    /// The bytes that end a field without quotes.
    fn ends(self) -> &'static [bool; 256] {
        match self {
            Delimiter::Comma => &COMMA,
            Delimiter::Semicolon => &SEMICOLON,
            Delimiter::Tab => &TAB,
            Delimiter::Whitespace => &WHITESPACE,
        }
    }

    /// Whether the delimiter stands anywhere in a text.
    pub fn is_in(self, text: &[u8]) -> bool {
        match self {
            Delimiter::Comma => text.contains(&b','),
            Delimiter::Semicolon => text.contains(&b';'),
            Delimiter::Tab => text.contains(&b'\t'),
            Delimiter::Whitespace => text.contains(&b' ') || text.contains(&b'\t'),
        }
    }

    /// Code and words of the note that says so; the comma is what everyone expects.
    pub fn note(self) -> Option<(&'static str, &'static str)> {
        match self {
            Delimiter::Comma => None,
            Delimiter::Semicolon => Some(("delimiter_semicolon", "a semicolon")),
            Delimiter::Tab => Some(("delimiter_tab", "a tab")),
            Delimiter::Whitespace => Some(("delimiter_whitespace", "blanks")),
        }
    }
}

static COMMA: [bool; 256] = ends(b',', b',');
static SEMICOLON: [bool; 256] = ends(b';', b';');
static TAB: [bool; 256] = ends(b'\t', b'\t');
static WHITESPACE: [bool; 256] = ends(b' ', b'\t');

const fn ends(delimiter: u8, other: u8) -> [bool; 256] {
    let mut table = [false; 256];
    table[b'\n' as usize] = true;
    table[b'\r' as usize] = true;
    table[delimiter as usize] = true;
    table[other as usize] = true;
    table
}

/// One field without surrounding blanks and quotes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Field<'a> {
    pub bytes: &'a [u8],
    pub quoted: bool,
}

/// The lines of a text, split on demand.
#[derive(Debug, Clone)]
pub(super) struct Rows<'a> {
    bytes: &'a [u8],
    at: usize,
    line: u32,
    delimiter: Delimiter,
}

impl<'a> Rows<'a> {
    pub fn new(bytes: &'a [u8], delimiter: Delimiter) -> Self {
        Rows {
            bytes,
            at: 0,
            line: 0,
            delimiter,
        }
    }

    /// Splits the next line into `fields`; its 1-based number, or `None` at the end. A quoted
    /// field ends on its own line. Blank lines have no fields.
    pub fn next(&mut self, fields: &mut Vec<Field<'a>>) -> Option<u32> {
        fields.clear();
        if self.at >= self.bytes.len() {
            return None;
        }
        self.line += 1;
        loop {
            let (field, end) = self.field();
            match end {
                End::Delimiter => fields.push(field),
                End::Line => {
                    // Nothing behind the last blank, and nothing at all on an empty line.
                    let trailing = self.delimiter == Delimiter::Whitespace || fields.is_empty();
                    if !(field.bytes.is_empty() && !field.quoted && trailing) {
                        fields.push(field);
                    }
                    return Some(self.line);
                }
            }
        }
    }

    /// Reads the next line at once where it is numbers alone, one for each place, as nearly all lines are: its
    /// 1-based number, and a bit for each number that has a decimal point. `None`, and nothing is read, where it
    /// is anything else, or ends with the text.
    pub fn numbers(&mut self, numbers: &mut [f64]) -> Option<(u32, u64)> {
        let delimiter = self.delimiter.byte()?;
        let mut rest = self.bytes.get(self.at..)?;
        let (mut points, mut bit) = (0, 1u64);
        let last = numbers.len().checked_sub(1)?;
        for (place, number) in numbers.iter_mut().enumerate() {
            while let [b' ', behind @ ..] = rest {
                rest = behind;
            }
            let found = decimal::leading(rest)?;
            *number = found.value;
            points |= if found.has_point { bit } else { 0 };
            bit = bit.wrapping_shl(1);
            rest = match rest.get(found.length..)? {
                [b'\r', b'\n', behind @ ..] | [b'\n', behind @ ..] if place == last => behind,
                [byte, behind @ ..] if *byte == delimiter && place < last => behind,
                _ => return None,
            };
        }
        self.at = self.bytes.len() - rest.len();
        self.line += 1;
        Some((self.line, points))
    }

    fn field(&mut self) -> (Field<'a>, End) {
        let bytes = self.bytes;
        let mut start = self.at;
        while bytes
            .get(start)
            .is_some_and(|&b| b == b' ' || b == b'\t' && self.delimiter != Delimiter::Tab)
        {
            start += 1;
        }
        if bytes.get(start) == Some(&b'"')
            && let Some(quoted) = self.quoted(start + 1)
        {
            return quoted;
        }
        let rest = bytes.get(start..).unwrap_or_default();
        let ends = self.delimiter.ends();
        let length = rest.iter().position(|&byte| ends[usize::from(byte)]);
        let end = length.map_or(bytes.len(), |length| start + length);
        let field = bytes.get(start..end).unwrap_or_default().trim_ascii_end();
        (
            Field {
                bytes: field,
                quoted: false,
            },
            self.step_over(end),
        )
    }

    /// A field from behind its opening quote; `None` where the quote never closes on this line
    /// or something other than the end of the field follows it.
    fn quoted(&mut self, start: usize) -> Option<(Field<'a>, End)> {
        let mut end = start;
        loop {
            match self.bytes.get(end)? {
                b'\n' | b'\r' => return None,
                b'"' if self.bytes.get(end + 1) == Some(&b'"') => end += 2,
                b'"' => break,
                _ => end += 1,
            }
        }
        let mut after = end + 1;
        while self.delimiter != Delimiter::Whitespace && self.bytes.get(after) == Some(&b' ') {
            after += 1;
        }
        match self.bytes.get(after) {
            None | Some(b'\n' | b'\r') => {}
            Some(&byte) if self.delimiter.is(byte) => {}
            Some(_) => return None,
        }
        let bytes = self.bytes.get(start..end)?.trim_ascii();
        Some((
            Field {
                bytes,
                quoted: true,
            },
            self.step_over(after),
        ))
    }

    /// Moves behind the delimiter or line end at `at`.
    fn step_over(&mut self, at: usize) -> End {
        let (end, next) = match self.bytes.get(at) {
            None => (End::Line, at),
            Some(b'\r') if self.bytes.get(at + 1) == Some(&b'\n') => (End::Line, at + 2),
            Some(b'\r' | b'\n') => (End::Line, at + 1),
            Some(_) => (End::Delimiter, at + 1),
        };
        self.at = next;
        if end == End::Delimiter && self.delimiter == Delimiter::Whitespace {
            while self
                .bytes
                .get(self.at)
                .is_some_and(|&b| self.delimiter.is(b))
            {
                self.at += 1;
            }
            if matches!(self.bytes.get(self.at), None | Some(b'\n' | b'\r')) {
                return self.step_over(self.at);
            }
        }
        end
    }
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum End {
    Delimiter,
    Line,
}

#[cfg(test)]
mod tests {
    use super::*;

    fn split(text: &str, delimiter: Delimiter) -> Vec<Vec<&str>> {
        let mut rows = Rows::new(text.as_bytes(), delimiter);
        let mut fields = Vec::new();
        let mut all = Vec::new();
        while rows.next(&mut fields).is_some() {
            all.push(
                fields
                    .iter()
                    .map(|f| std::str::from_utf8(f.bytes).expect("text"))
                    .collect(),
            );
        }
        all
    }

    #[test]
    fn lines_end_in_every_way() {
        let expected: Vec<Vec<&str>> = vec![vec!["a", "b"], vec![], vec!["c", "d"]];
        assert_eq!(split("a,b\n\nc,d\n", Delimiter::Comma), expected);
        assert_eq!(split("a,b\r\n\r\nc,d", Delimiter::Comma), expected);
        assert_eq!(split("a,b\r\rc,d\r", Delimiter::Comma), expected);
    }

    #[test]
    fn fields_are_trimmed_and_unquoted() {
        assert_eq!(
            split(" \"a, x\" , b ,", Delimiter::Comma),
            [vec!["a, x", "b", ""]]
        );
        assert_eq!(split("5\" jig,b", Delimiter::Comma), [vec!["5\" jig", "b"]]);
        assert_eq!(split("\"open,b", Delimiter::Comma), [vec!["\"open", "b"]]);
        assert_eq!(split("\"a\"x,b", Delimiter::Comma), [vec!["\"a\"x", "b"]]);
    }

    #[test]
    fn lines_of_numbers_are_read_at_once_and_no_others() {
        let read = |text: &str, delimiter| {
            let mut rows = Rows::new(text.as_bytes(), delimiter);
            let mut numbers = [0.0; 2];
            let found = rows.numbers(&mut numbers);
            // What was not read is still there, and what was is not.
            let mut fields = Vec::new();
            let line = rows.next(&mut fields);
            assert_eq!(line, Some(if found.is_some() { 2 } else { 1 }), "{text}");
            found.map(|(line, points)| (line, points, numbers))
        };
        let comma = |text: &str| read(text, Delimiter::Comma);
        assert_eq!(comma("1,-2.5e-3\nx"), Some((1, 0b10, [1.0, -2.5e-3])));
        assert_eq!(comma("1., 2\r\nx"), Some((1, 0b01, [1.0, 2.0])));
        assert_eq!(read("7\t8\nx", Delimiter::Tab), Some((1, 0, [7.0, 8.0])));
        for text in [
            "1,2",
            "1,2\rx",
            "1\n2,3\nx",
            "1,2,3\nx",
            "1,2,\nx",
            "1,\nx",
            "\nx",
            "1,\"2\"\nx",
            "1,2 \nx",
            "1;2\nx",
            "1,0x2\nx",
            "1,1e400\nx",
            "#1,2\nx",
            "1,12345678901234567890\nx",
        ] {
            assert_eq!(comma(text), None, "{text}");
        }
        assert_eq!(read("1 2\nx", Delimiter::Whitespace), None);
    }

    #[test]
    fn blanks_in_a_row_are_one_delimiter() {
        assert_eq!(
            split("  1 \t 2  \n3 4", Delimiter::Whitespace),
            [vec!["1", "2"], vec!["3", "4"]]
        );
        assert_eq!(split("1\t\t2", Delimiter::Tab), [vec!["1", "", "2"]]);
    }
}
