//! Numbers of an answer, as texts for the table: what cannot be read is a trouble, what the
//! instrument marks as no number stays marked, and nothing becomes zero.

use crate::bench::source::Trouble;
use crate::diagnostic::excerpt;
use crate::quantity::{self, Dimension};
use crate::station::{Answer, ByteOrder, Column, Form};

/// What SCPI-99 writes for infinity (volume 1, 7.2.1.4); 9.91E37 is no number.
const INFINITY: f64 = 9.9e37;

/// Longest text of one number.
const LONGEST: usize = 40;

/// The quantities of an answer.
pub type Columns = Vec<(Column, Vec<String>)>;

/// Length in bytes of one number of each quantity of an answer; 1 for text.
pub fn item(answer: &Answer) -> usize {
    let width = match answer.form {
        Form::Ascii => return 1,
        Form::Real32(_) => 4,
        Form::Real64(_) => 8,
    };
    width * answer.quantities.len()
}

/// The numbers of an answer, by quantity. `scale` says what a number in the table is in SI.
///
/// # Errors
/// Something in it is no number, or the quantities do not take turns to the end.
pub fn read(
    answer: &Answer,
    contents: &[u8],
    scale: impl Fn(Column) -> f64,
) -> Result<Columns, Trouble> {
    let turns = answer.quantities.len().max(1);
    let mut columns: Columns = answer
        .quantities
        .iter()
        .map(|q| (q.unwrap_or(Column::Part), Vec::new()))
        .collect();
    let mut count = 0usize;
    let mut put = |text: Result<String, String>| -> Result<(), Trouble> {
        let place = count % turns;
        count += 1;
        match (text, answer.quantities.get(place)) {
            (_, Some(None) | None) => Ok(()),
            (Ok(text), _) => {
                if let Some((_, values)) = columns.get_mut(place) {
                    values.push(text);
                }
                Ok(())
            }
            (Err(found), _) => Err(wrong(
                answer,
                format!("value {count} is {found}, not a number"),
            )),
        }
    };
    match answer.form {
        Form::Ascii => {
            for (i, field) in contents.split(|b| *b == b',').enumerate() {
                let column = answer.quantities.get(i % turns).copied().flatten();
                put(text(field, column, &scale))?;
            }
        }
        Form::Real32(order) => {
            for bytes in contents.chunks(4) {
                put(real32(bytes, order).map_or(Err("cut off".to_owned()), |v| Ok(written(v))))?;
            }
        }
        Form::Real64(order) => {
            for bytes in contents.chunks(8) {
                put(real64(bytes, order).map_or(Err("cut off".to_owned()), |v| Ok(written(v))))?;
            }
        }
    }
    if !count.is_multiple_of(turns) {
        return Err(wrong(
            answer,
            format!("{count} values, where {turns} quantities take turns"),
        ));
    }
    columns.retain(|(column, _)| *column != Column::Part);
    Ok(columns)
}

fn wrong(answer: &Answer, what: String) -> Trouble {
    Trouble::new(
        "answer_wrong",
        format!("the answer to `{}`: {what}", answer.query),
        "measure again; if it stays so, check `read` in the station file",
    )
}

fn real32(bytes: &[u8], order: ByteOrder) -> Option<f64> {
    let bytes = bytes.try_into().ok()?;
    Some(f64::from(match order {
        ByteOrder::Big => f32::from_be_bytes(bytes),
        ByteOrder::Little => f32::from_le_bytes(bytes),
    }))
}

fn real64(bytes: &[u8], order: ByteOrder) -> Option<f64> {
    let bytes = bytes.try_into().ok()?;
    Some(match order {
        ByteOrder::Big => f64::from_be_bytes(bytes),
        ByteOrder::Little => f64::from_le_bytes(bytes),
    })
}

/// A binary number in the fewest digits that give it back.
fn written(value: f64) -> String {
    // 9.9E37 as a number of 32 bits is not that of 64.
    if value.is_nan() || value.abs() >= INFINITY * (1.0 - 1e-6) {
        return "NaN".to_owned();
    }
    format!("{value:e}")
}

/// A number in text, as it stands; one with a unit in the unit of its column.
fn text(
    field: &[u8],
    column: Option<Column>,
    scale: impl Fn(Column) -> f64,
) -> Result<String, String> {
    let quoted = |bytes: &[u8]| format!("`{}`", excerpt(&String::from_utf8_lossy(bytes)));
    let field = field.trim_ascii();
    if field.is_empty() {
        return Err("empty".to_owned());
    }
    let Ok(word) = std::str::from_utf8(field) else {
        return Err(quoted(field));
    };
    if word.len() > LONGEST {
        return Err(quoted(field));
    }
    if is_no_number(word) {
        return Ok("NaN".to_owned());
    }
    if is_decimal(word) {
        return match word.parse::<f64>() {
            Ok(value) if !value.is_finite() => Err(quoted(field)),
            Ok(value) if value.abs() >= INFINITY * (1.0 - 1e-6) => Ok("NaN".to_owned()),
            Ok(_) => Ok(word.to_owned()),
            Err(_) => Err(quoted(field)),
        };
    }
    let Some(column) = column else {
        // Of no use here, whatever it is.
        return Ok(String::new());
    };
    with_unit(word, column)
        .map(|value| format!("{:e}", value / scale(column)))
        .ok_or_else(|| quoted(field))
}

/// NaN and infinity in the words that instruments have for them.
fn is_no_number(word: &str) -> bool {
    let bare = word.trim_start_matches(['+', '-']);
    ["nan", "inf", "infinity", "ninf"]
        .iter()
        .any(|no| bare.eq_ignore_ascii_case(no))
}

/// NR1, NR2 or NR3 of IEEE 488.2 (8.7.2 to 8.7.4): digits, point, exponent.
fn is_decimal(word: &str) -> bool {
    let allowed = |b: u8| matches!(b, b'0'..=b'9' | b'+' | b'-' | b'.' | b'e' | b'E');
    word.bytes().any(|b| b.is_ascii_digit()) && word.bytes().all(allowed)
}

/// A number with a unit, in SI.
fn with_unit(word: &str, column: Column) -> Option<f64> {
    let dimension = match column {
        Column::Frequency => Dimension::Frequency,
        Column::Magnitude | Column::Resistance | Column::Reactance | Column::Esr => {
            Dimension::Resistance
        }
        Column::Capacitance => Dimension::Capacitance,
        Column::ARe | Column::AIm | Column::BRe | Column::BIm => Dimension::Voltage,
        Column::Phase => Dimension::Angle,
        Column::DissipationFactor => Dimension::Ratio,
        Column::RatioDb => {
            let bare = word
                .strip_suffix("dB")
                .or_else(|| word.strip_suffix("DB"))?;
            return bare.trim_end().parse().ok().filter(|v: &f64| v.is_finite());
        }
        Column::Part => return None,
    };
    quantity::parse(word, dimension).ok()
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn answer(quantities: &[Option<Column>], form: Form) -> Answer {
        Answer {
            quantities: quantities.to_vec(),
            query: "Q?".to_owned(),
            form,
        }
    }

    fn ascii(text: &str) -> Result<Vec<String>, Trouble> {
        let answer = answer(&[Some(Column::Resistance)], Form::Ascii);
        let columns = read(&answer, text.as_bytes(), |_| 1.0)?;
        Ok(columns.into_iter().flat_map(|(_, values)| values).collect())
    }

    #[test]
    fn numbers_stay_as_they_were_written() {
        assert_eq!(
            ascii("+1.50E-03, 2,-.5").expect("numbers"),
            ["+1.50E-03", "2", "-.5"]
        );
    }

    /// SCPI-99, volume 1, 7.2.1.4 and 7.2.1.5: 9.9E37 is infinity, 9.91E37 is no number.
    #[test]
    fn what_is_marked_as_no_number_stays_so() {
        for text in ["NAN", "9.91E37", "9.9E+37", "-9.9E37", "inf", "-INF"] {
            assert_eq!(ascii(text).expect("marked"), ["NaN"], "{text}");
        }
    }

    #[test]
    fn what_is_no_number_is_said_with_its_place() {
        for (text, place) in [
            ("1,,2", "value 2 is empty"),
            ("1,x", "value 2 is `x`"),
            ("", "value 1"),
            ("1e999", "1e999"),
            ("1.2.3", "1.2.3"),
            ("0x10", "0x10"),
        ] {
            let trouble = ascii(text).expect_err("no number");
            assert!(trouble.text.contains(place), "{trouble}");
        }
    }

    #[test]
    fn units_are_put_into_that_of_the_column() {
        let answer = answer(&[Some(Column::Frequency)], Form::Ascii);
        let read = read(&answer, b"1 kHz,2.5E3 Hz,7", |_| 1e3).expect("numbers");
        assert_eq!(read[0].1, ["1e0", "2.5e0", "7"]);
    }

    #[test]
    fn quantities_take_turns_and_some_are_passed_over() {
        let turns = [Some(Column::Resistance), None, Some(Column::Reactance)];
        let answer = answer(&turns, Form::Ascii);
        let columns = read(&answer, b"1,x,2,3,,4", |_| 1.0).expect("numbers");
        assert_eq!(
            columns[0],
            (Column::Resistance, vec!["1".to_owned(), "3".to_owned()])
        );
        assert_eq!(
            columns[1],
            (Column::Reactance, vec!["2".to_owned(), "4".to_owned()])
        );
        assert!(read(&answer, b"1,x,2,3", |_| 1.0).is_err());
    }

    proptest! {
        #[test]
        fn both_orders_of_bytes_give_the_number_back(values in prop::collection::vec(any::<f64>(), 1..20)) {
            for (order, bytes) in [(ByteOrder::Big, f64::to_be_bytes as fn(f64) -> [u8; 8]), (ByteOrder::Little, f64::to_le_bytes)] {
                let block: Vec<u8> = values.iter().flat_map(|v| bytes(*v)).collect();
                let answer = answer(&[Some(Column::Resistance)], Form::Real64(order));
                let columns = read(&answer, &block, |_| 1.0).expect("numbers");
                for (value, text) in values.iter().zip(&columns[0].1) {
                    let back: f64 = text.parse().expect("a number");
                    let kept = if value.is_nan() || value.abs() > 9.8e37 { back.is_nan() } else { back == *value };
                    prop_assert!(kept, "{} {}", value, text);
                }
            }
        }

        #[test]
        fn no_bytes_make_it_panic_and_none_become_another_number(bytes in prop::collection::vec(any::<u8>(), 0..200), turns in 1usize..4) {
            let quantities = vec![Some(Column::Frequency); turns];
            for form in [Form::Ascii, Form::Real32(ByteOrder::Big), Form::Real64(ByteOrder::Little)] {
                if let Ok(columns) = read(&answer(&quantities, form), &bytes, |_| 1.0) {
                    for text in columns.iter().flat_map(|(_, values)| values) {
                        prop_assert!(text.parse::<f64>().is_ok(), "{}", text);
                    }
                }
            }
        }
    }
}
