//! Data identifiers of ANSI MH10.8.2: none to three digits and one capital letter.

/// The identifiers met on component labels, in groups as the standard has them; the meanings are
/// given where this program uses them.
const KNOWN: &[&str] = &[
    // item: P customer's part number, 1P supplier's
    "P", "1P", "2P", "6P", "9P", "20P", "21P", "22P", "23P", "24P", "30P", "31P", "32P", "33P",
    "34P", "50P", // quantity: Q pieces, 7Q with a unit
    "Q", "2Q", "3Q", "7Q", "13Q", // trace: 1T supplier's lot, T customer's
    "T", "1T", "20T", "30T", "31T", "32T", "33T", "34T", // serial and package: 3S package
    "S", "3S", "4S", "5S", // date: 9D agreed, 10D YYWW, 11D YYYYWW, 16D production
    "D", "1D", "2D", "3D", "4D", "6D", "9D", "10D", "11D", "12D", "13D", "14D", "16D",
    // order: K customer's
    "K", "1K", "2K", "4K", "10K", "11K", "14K", // place: 4L country of origin
    "L", "1L", "4L", "20L", "21L", "22L", "23L", "24L",
    // party: V supplier by the customer's code, 1V by its own
    "V", "1V", "10V", "12V", "13V", "14V", "17V", "18V", "25V", // environment, free text
    "E", "13E", "Z", "3Z", "10Z", "11Z", "12Z", "13Z", "14Z", "20Z",
];

/// Identifiers taken on their word in a linear bar code of one field. Others (an `E` before a bare
/// part number) are as likely the first letter of the data.
const ALONE: &[&str] = &[
    "P", "1P", "2P", "30P", "Q", "7Q", "T", "1T", "S", "3S", "4S", "5S", "9D", "10D", "11D", "12D",
    "14D", "16D", "K", "1K", "4K", "11K", "4L", "V", "1V", "13V",
];

/// Splits a field into identifier and data; `None` where it does not begin with an identifier.
pub(super) fn split(field: &str) -> Option<(&str, &str)> {
    let digits = field.bytes().take_while(u8::is_ascii_digit).count();
    let letter = field.as_bytes().get(digits)?;
    if digits > 3 || !letter.is_ascii_uppercase() {
        return None;
    }
    field.split_at_checked(digits + 1)
}

pub(super) fn known(identifier: &str) -> bool {
    KNOWN.contains(&identifier)
}

pub(super) fn stands_alone(identifier: &str) -> bool {
    ALONE.contains(&identifier)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn one_letter_ends_the_identifier() {
        assert_eq!(split("1T7731"), Some(("1T", "7731")));
        assert_eq!(split("P1PX-100"), Some(("P", "1PX-100")));
        assert_eq!(split("100PX"), Some(("100P", "X")));
        assert_eq!(split("4L"), Some(("4L", "")));
        for not in ["", "12", "1234P", "-P", "p1", "1µ", "µ"] {
            assert_eq!(split(not), None, "{not}");
        }
    }

    #[test]
    fn what_stands_alone_is_known() {
        assert!(ALONE.iter().all(|id| known(id)));
        assert!(KNOWN.iter().all(|id| split(id) == Some((*id, ""))));
    }
}
