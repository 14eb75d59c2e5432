//! Where an answer ends: lines and blocks of IEEE 488.2 (8.7.9 definite length, 8.7.10 indefinite
//! length arbitrary block response data; 8.5 response message terminator), as they come over a
//! socket. Pure: bytes in, borders out.

use crate::bench::source::Trouble;
use crate::diagnostic::excerpt;
use std::ops::Range;

/// Longest answer, in bytes: 200,000 points of five numbers.
pub const LONGEST: usize = 16 << 20;

/// What the bytes so far are.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Frame {
    /// More must come.
    Open,
    /// The answer's contents. `end` is one past its last byte.
    #[allow(missing_docs)]
    Whole { contents: Range<usize>, end: usize },
    /// The contents, if nothing more comes: a block whose newline is outstanding, or one that only
    /// its end of message ends.
    #[allow(missing_docs)]
    Perhaps { contents: Range<usize>, end: usize },
}

/// Blank bytes before an answer: the newline of the one before, where that came late.
fn start(bytes: &[u8]) -> usize {
    let blank = |b: &u8| matches!(b, b'\n' | b'\r' | b' ' | b'\t');
    bytes.iter().take_while(|b| blank(b)).count()
}

/// A line of text.
pub fn line(bytes: &[u8]) -> Frame {
    let start = start(bytes);
    let rest = bytes.get(start..).unwrap_or_default();
    let Some(length) = rest.iter().position(|b| *b == b'\n') else {
        return Frame::Open;
    };
    let text = rest.get(..length).unwrap_or_default();
    let trimmed = text.trim_ascii_end().len();
    Frame::Whole {
        contents: start..start + trimmed,
        end: start + length + 1,
    }
}

/// A block. `item` is the length in bytes of what it holds whole numbers of; `expected` its length,
/// where that is known.
///
/// # Errors
/// What comes is no block, or one that cannot hold such items.
pub fn block(bytes: &[u8], item: usize, expected: Option<usize>) -> Result<Frame, Trouble> {
    let start = start(bytes);
    let rest = bytes.get(start..).unwrap_or_default();
    let Some(first) = rest.first() else {
        return Ok(Frame::Open);
    };
    if *first != b'#' {
        let text = String::from_utf8_lossy(rest.get(..rest.len().min(60)).unwrap_or_default());
        return Err(wrong(
            format!(
                "the answer begins with `{}`, not with `#`",
                excerpt(text.trim_end())
            ),
            "the instrument does not answer in blocks: check `format` in the station file, and \
             whether `setup` asks for binary answers",
        ));
    }
    let digits = match rest.get(1) {
        None => return Ok(Frame::Open),
        Some(b'0') => return Ok(indefinite(rest, start, item, expected)),
        Some(digit @ b'1'..=b'9') => usize::from(digit - b'0'),
        Some(_) => return Err(bad_header(rest)),
    };
    let header = 2 + digits;
    let Some(number) = rest.get(2..header) else {
        // What is there must be digits already.
        let all = rest.iter().skip(2).all(u8::is_ascii_digit);
        return if all {
            Ok(Frame::Open)
        } else {
            Err(bad_header(rest))
        };
    };
    if !number.iter().all(u8::is_ascii_digit) {
        return Err(bad_header(rest));
    }
    let length = number.iter().fold(0usize, |n, d| {
        n.saturating_mul(10).saturating_add(usize::from(d - b'0'))
    });
    if length > LONGEST {
        return Err(wrong(
            format!("the instrument announces a block of {length} bytes"),
            "a sweep is smaller: check the question in the station file",
        ));
    }
    if !length.is_multiple_of(item.max(1)) || length == 0 {
        return Err(wrong(
            format!(
                "the instrument announces a block of {length} bytes, which is no whole number of {item}"
            ),
            "check `format` and `quantity` in the station file",
        ));
    }
    let contents = start + header..start + header + length;
    Ok(match bytes.get(contents.end..) {
        None => Frame::Open,
        Some([]) | Some([b'\r']) => Frame::Perhaps {
            end: bytes.len(),
            contents,
        },
        Some([b'\n', ..]) => Frame::Whole {
            end: contents.end + 1,
            contents,
        },
        Some([b'\r', b'\n', ..]) => Frame::Whole {
            end: contents.end + 2,
            contents,
        },
        Some(more) => {
            return Err(wrong(
                format!(
                    "{} more than the {length} bytes that the block announces",
                    more.len()
                ),
                "the instrument or something on the way mixes answers: measure again; if it \
                 stays so, check the question in the station file",
            ));
        }
    })
}

/// `#0`, data, newline with the end of the message. A newline can be in the data; what is known of
/// the length says more.
fn indefinite(rest: &[u8], start: usize, item: usize, expected: Option<usize>) -> Frame {
    let data = rest.get(2..).unwrap_or_default();
    let Some((b'\n', body)) = data.split_last().map(|(last, body)| (*last, body)) else {
        return Frame::Open;
    };
    if body.is_empty() || !body.len().is_multiple_of(item.max(1)) {
        return Frame::Open;
    }
    let (contents, end) = (start + 2..start + 2 + body.len(), start + rest.len());
    match expected {
        Some(length) if body.len() == length => Frame::Whole { contents, end },
        Some(_) => Frame::Open,
        None => Frame::Perhaps { contents, end },
    }
}

fn bad_header(rest: &[u8]) -> Trouble {
    let text = String::from_utf8_lossy(rest.get(..rest.len().min(12)).unwrap_or_default());
    wrong(
        format!(
            "the block begins with `{}`, which says no length",
            excerpt(text.trim_end())
        ),
        "measure again; if it stays so, check `format` in the station file",
    )
}

fn wrong(text: String, remedy: &str) -> Trouble {
    Trouble::new("answer_wrong", text, remedy)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn whole(contents: Range<usize>, end: usize) -> Frame {
        Frame::Whole { contents, end }
    }

    #[test]
    fn lines_end_with_a_newline() {
        assert_eq!(line(b"1,2"), Frame::Open);
        assert_eq!(line(b"1,2\r\n"), whole(0..3, 5));
        // The newline of a block before.
        assert_eq!(line(b"\n1,2\n3"), whole(1..4, 5));
    }

    #[test]
    fn blocks_of_definite_length() {
        // IEEE 488.2-1992, 8.7.9: # , digit, that many digits of length, the bytes.
        let read = |bytes: &[u8]| block(bytes, 4, None).expect("a block");
        assert_eq!(read(b"#14abcd\n"), whole(3..7, 8));
        assert_eq!(read(b"#800000004ab\nc\n"), whole(10..14, 15));
        assert_eq!(read(b"#800000004ab\n"), Frame::Open);
        assert!(
            block(b"#800000004ab\ncd", 4, None).is_err(),
            "a byte beyond"
        );
    }

    #[test]
    fn a_newline_in_the_data_ends_nothing() {
        assert_eq!(
            block(b"#14\n\n\n\n\n", 4, None).expect("a block"),
            whole(3..7, 8)
        );
        assert_eq!(
            block(b"#0\n\n\n\n\n", 4, Some(4)).expect("a block"),
            whole(2..6, 7)
        );
        assert_eq!(
            block(b"#0\n\n\n\n\n", 4, Some(8)).expect("a block"),
            Frame::Open
        );
        let perhaps = Frame::Perhaps {
            contents: 2..6,
            end: 7,
        };
        assert_eq!(block(b"#0abcd\n", 4, None).expect("a block"), perhaps);
    }

    #[test]
    fn what_is_no_block_is_said() {
        for bytes in [
            b"1.0,2.0\n".as_slice(),
            b"#A12",
            b"#1x",
            b"#2a",
            b"#13abc\n",
            b"#10\n",
            b"#9999999999",
            b"#14abcdefgh",
            "\u{fffd}".as_bytes(),
        ] {
            let trouble = block(bytes, 4, None).expect_err("no block");
            assert_eq!(trouble.code, "answer_wrong");
        }
    }

    proptest! {
        #[test]
        fn borders_lie_inside(bytes in prop::collection::vec(any::<u8>(), 0..60), item in 0usize..9, expected in prop::option::of(0usize..40)) {
            let mut marked = bytes.clone();
            marked.insert(0, b'#');
            for bytes in [&bytes, &marked] {
                for frame in [Ok(line(bytes)), block(bytes, item, expected)] {
                    if let Ok(Frame::Whole { contents, end } | Frame::Perhaps { contents, end }) = frame {
                        prop_assert!(contents.start <= contents.end && contents.end <= end && end <= bytes.len());
                    }
                }
            }
        }

        #[test]
        fn a_block_is_whole_with_its_last_byte_and_not_before(data in prop::collection::vec(any::<u8>(), 1..50)) {
            let data: Vec<u8> = data.iter().copied().cycle().take(data.len() * 4).collect();
            let length = data.len().to_string();
            let mut bytes = format!("#{}{length}", length.len()).into_bytes();
            bytes.extend(&data);
            for cut in 0..bytes.len() {
                prop_assert_eq!(block(&bytes[..cut], 4, None).expect("so far a block"), Frame::Open);
            }
            bytes.push(b'\n');
            match block(&bytes, 4, None).expect("a block") {
                Frame::Whole { contents, end } => {
                    prop_assert_eq!(&bytes[contents], data.as_slice());
                    prop_assert_eq!(end, bytes.len());
                }
                other => prop_assert!(false, "{other:?}"),
            }
        }
    }
}
