//! Letters of block characters, five rows high: to be read from two metres.

/// Rows of a letter.
pub const ROWS: usize = 5;

/// The rows of a letter; `#` is a block.
fn letter(c: char) -> [&'static str; ROWS] {
    match c {
        'A' => [" ## ", "#  #", "####", "#  #", "#  #"],
        'C' => [" ###", "#   ", "#   ", "#   ", " ###"],
        'D' => ["### ", "#  #", "#  #", "#  #", "### "],
        'E' => ["####", "#   ", "### ", "#   ", "####"],
        'F' => ["####", "#   ", "### ", "#   ", "#   "],
        'G' => [" ###", "#   ", "# ##", "#  #", " ###"],
        'H' => ["#  #", "#  #", "####", "#  #", "#  #"],
        'I' => ["#", "#", "#", "#", "#"],
        'J' => ["  ##", "   #", "   #", "#  #", " ## "],
        'K' => ["#  #", "# # ", "##  ", "# # ", "#  #"],
        'L' => ["#   ", "#   ", "#   ", "#   ", "####"],
        'M' => ["#   #", "## ##", "# # #", "#   #", "#   #"],
        'N' => ["#  #", "## #", "# ##", "#  #", "#  #"],
        'O' => [" ## ", "#  #", "#  #", "#  #", " ## "],
        'P' => ["### ", "#  #", "### ", "#   ", "#   "],
        'R' => ["### ", "#  #", "### ", "# # ", "#  #"],
        'S' => [" ###", "#   ", " ## ", "   #", "### "],
        'T' => ["#####", "  #  ", "  #  ", "  #  ", "  #  "],
        'U' => ["#  #", "#  #", "#  #", "#  #", " ## "],
        '✔' => ["      #", "     ##", "#   ## ", "## ##  ", " ###   "],
        '✘' => ["##   ##", " ## ## ", "  ###  ", " ## ## ", "##   ##"],
        '?' => [" #### ", "#    #", "   ## ", "      ", "   #  "],
        '○' => ["  ####  ", " #    # ", "#      #", " #    # ", "  ####  "],
        '‖' => ["## ##", "## ##", "## ##", "## ##", "## ##"],
        ' ' => ["  ", "  ", "  ", "  ", "  "],
        _ => ["", "", "", "", ""],
    }
}

/// A word in large letters: its rows, of equal width.
pub fn word(text: &str) -> [String; ROWS] {
    let mut rows: [String; ROWS] = Default::default();
    for (i, c) in text.chars().enumerate() {
        for (row, piece) in rows.iter_mut().zip(letter(c)) {
            if i > 0 {
                row.push(' ');
            }
            row.extend(piece.chars().map(|c| if c == '#' { '█' } else { ' ' }));
        }
    }
    rows
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bench::words;
    use crate::judgement::PartVerdict::*;
    use crate::lot::LotVerdict;

    #[test]
    fn every_verdict_has_its_letters_and_fits_eighty_columns() {
        let parts = [Conforming, Nonconforming, Undecided, Unmeasured]
            .map(|v| format!("{} {}", words::mark(v), words::verdict(v)));
        let lots = [LotVerdict::Accept, LotVerdict::Reject, LotVerdict::Hold]
            .map(|v| format!("{} {}", words::lot_mark(v), words::lot_verdict(v)));
        for text in parts.iter().chain(&lots) {
            for c in text.chars() {
                assert!(!letter(c)[0].is_empty(), "no letter {c}");
                let widths: Vec<usize> = letter(c).iter().map(|r| r.len()).collect();
                assert!(widths.iter().all(|w| *w == widths[0]), "{c} is ragged");
            }
            let width = word(text)[0].chars().count();
            assert!(width <= 78, "{text}: {width}");
        }
    }
}
