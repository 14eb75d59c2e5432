//! Data identifiers of ANSI MH10.8.2: none to three digits and one capital letter.

/// The identifiers met on component labels, in the groups of the standard; the first of each group
/// are the ones used here.
const KNOWN: &[&[&str]] = &[
    ITEM, QUANTITY, TRACE, PACKAGE, DATE, ORDER, PLACE, PARTY, OTHER,
];

/// `P` part number of the customer, `1P` of the supplier.
const ITEM: &[&str] = &[
    "P", "1P", "2P", "6P", "9P", "20P", "21P", "22P", "23P", "24P", "30P", "31P", "32P", "33P",
    "34P", "50P",
];
/// `Q` pieces, `7Q` with a unit.
const QUANTITY: &[&str] = &["Q", "7Q", "2Q", "3Q", "13Q"];
/// `1T` lot of the supplier, `T` of the customer.
const TRACE: &[&str] = &["1T", "T", "20T", "30T", "31T", "32T", "33T", "34T"];
/// `3S` package, `S` serial number.
const PACKAGE: &[&str] = &["3S", "S", "4S", "5S"];
/// `9D` agreed structure, `10D` YYWW, `11D` YYYYWW, `16D` production.
const DATE: &[&str] = &[
    "9D", "10D", "11D", "16D", "D", "1D", "2D", "3D", "4D", "6D", "12D", "13D", "14D",
];
/// `K` purchase order of the customer.
const ORDER: &[&str] = &["K", "1K", "2K", "4K", "10K", "11K", "14K"];
/// `4L` country of origin.
const PLACE: &[&str] = &["4L", "L", "1L", "20L", "21L", "22L", "23L", "24L"];
/// `V` supplier by the customer's code, `1V` by its own.
const PARTY: &[&str] = &["V", "1V", "10V", "12V", "13V", "14V", "17V", "18V", "25V"];
/// Environment and free text.
const OTHER: &[&str] = &[
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
    KNOWN.iter().any(|group| group.contains(&identifier))
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
        assert!(KNOWN.concat().iter().all(|id| split(id) == Some((*id, ""))));
    }
}
