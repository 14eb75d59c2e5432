//! Every cell of the tables of ISO 2859-1:1999 for single sampling.

use crate::reference::rows;
use reelgate::statistics::Undefined;
use reelgate::statistics::sampling::{
    AQL_SERIES, CodeLetter, InspectionLevel, Plan, Severity, aql_index, code_letter,
    neighbouring_aqls, one_step_tighter, plan_for, single_sampling,
};

/// Table 1. The file's cross-reading: a public copy of level II and a national edition of the table.
#[test]
fn every_code_letter_of_table_1() {
    let table = rows("s1_code_letters.csv");
    assert_eq!(table.len(), 15);
    for row in table.iter() {
        let smallest = row.count("lot_min");
        let largest = row.text("lot_max").parse().unwrap_or(u64::MAX);
        for level in InspectionLevel::ALL {
            let expected: CodeLetter = row.text(&level.to_string()).parse().unwrap();
            for lot in [smallest, smallest + 1, largest - 1, largest] {
                assert_eq!(code_letter(lot, level), Ok(expected), "{lot} {level}");
            }
        }
    }
}

#[test]
fn every_sample_size() {
    for row in rows("s1_sample_sizes.csv").iter() {
        let letter: CodeLetter = row.text("letter").parse().unwrap();
        for severity in Severity::ALL {
            let expected = row.text(&format!("n_{severity}")).parse().ok();
            assert_eq!(
                letter.sample_size(severity),
                expected,
                "{letter} {severity}"
            );
        }
    }
}

#[test]
fn every_cell_of_table_2a() {
    every_cell("s1_single_normal.csv", Severity::Normal, 256);
}

#[test]
fn every_cell_of_table_2b() {
    every_cell("s1_single_tightened.csv", Severity::Tightened, 257);
}

/// Three columns of Table 2-C as an independent reprint of a national edition prints them: with
/// the diagonals of the table they say what every other column is.
#[test]
fn three_columns_of_table_2c_as_printed() {
    let table = rows("s1_single_reduced_columns.csv");
    assert_eq!(table.len(), 48);
    for row in table.iter() {
        let letter: CodeLetter = row.text("letter").parse().unwrap();
        let plan = single_sampling(letter, row.number("aql_percent"), Severity::Reduced).unwrap();
        let at = |l: CodeLetter| CodeLetter::ALL.iter().position(|known| *known == l);
        match row.text("cell") {
            "v" => assert!(at(plan.letter) > at(letter), "{letter}"),
            "^" => assert!(at(plan.letter) < at(letter), "{letter}"),
            ac => assert_eq!((plan.letter, plan.ac), (letter, ac.parse().unwrap())),
        }
    }
}

/// The diagonals: code letter and AQL, each one step further, have the same Ac. So every column
/// follows from the three that an independent reprint has.
#[test]
fn table_2c_is_made_of_diagonals() {
    const AC: [Option<u64>; 11] = [
        Some(0),
        None,
        None,
        None,
        Some(1),
        Some(2),
        Some(3),
        Some(5),
        Some(6),
        Some(8),
        Some(10),
    ];
    for (row, letter) in CodeLetter::ALL[..16].iter().enumerate() {
        for (column, aql) in AQL_SERIES.into_iter().enumerate() {
            let plan = single_sampling(*letter, aql, Severity::Reduced).unwrap();
            let own = plan.letter == *letter;
            let expected = (row + column).checked_sub(14).and_then(|d| *AC.get(d)?);
            match expected {
                Some(ac) => assert_eq!((own, plan.ac), (true, ac), "{letter} {aql}"),
                None => assert!(!own, "{letter} {aql}"),
            }
        }
    }
}

/// MIL-STD-105E Table II-C has its plans at the same places with the same samples. Its Re leaves a gap
/// above Ac, in which ISO 2859-1:1999 put one number; the plans with Ac 0 and Re 2 became an arrow down.
#[test]
fn table_2c_lies_in_the_gaps_of_mil_std_105e() {
    let table = rows("s1_single_reduced_105E_reprint.csv");
    assert_eq!(table.len(), 256);
    let (mut plans, mut arrows) = (0, 0);
    for row in table.iter() {
        let letter: CodeLetter = row.text("letter").parse().unwrap();
        let aql = row.number("aql_percent");
        let plan = single_sampling(letter, aql, Severity::Reduced).unwrap();
        let (n, ac, re) = (row.count("n"), row.count("ac"), row.count("re"));
        if (ac, re) == (0, 2) {
            arrows += 1;
            // Where there is no plan below, the arrow turns round to Ac 0.
            let down = plan.ac == 1 && plan.n > n;
            assert!(down || plan.ac == 0, "{letter} {aql}");
            continue;
        }
        plans += 1;
        assert_eq!(plan.n, n, "{letter} {aql}");
        assert!(ac <= plan.ac && plan.ac < re, "{letter} {aql}");
    }
    assert_eq!((plans, arrows), (227, 29));
}

#[test]
fn every_cell_of_table_2c() {
    every_cell(
        "s1_single_reduced_ISO2859_1_1999.csv",
        Severity::Reduced,
        256,
    );
}

fn every_cell(file: &str, severity: Severity, cells: usize) {
    let table = rows(file);
    assert_eq!(table.len(), cells);
    for row in table.iter() {
        let letter: CodeLetter = row.text("letter").parse().unwrap();
        let aql = row.number("aql_percent");
        let expected = Plan {
            letter: row.text("resolved_letter").parse().unwrap(),
            n: row.count("n"),
            ac: row.count("resolved_ac"),
            re: row.count("resolved_re"),
        };
        assert_eq!(
            single_sampling(letter, aql, severity),
            Ok(expected),
            "{letter} {aql} {severity}"
        );
    }
}

/// The tables' own logic: a tighter AQL or a larger letter never demands less of the lot.
#[test]
fn tightened_is_never_more_lenient_than_normal() {
    for letter in &CodeLetter::ALL[..16] {
        for aql in AQL_SERIES {
            let normal = single_sampling(*letter, aql, Severity::Normal).unwrap();
            let tightened = single_sampling(*letter, aql, Severity::Tightened).unwrap();
            assert!(
                tightened.ac as f64 / tightened.n as f64 <= normal.ac as f64 / normal.n as f64
                    || tightened.n > normal.n,
                "{letter} {aql}"
            );
        }
    }
}

/// ISO 2859-1:1999 10.3: a sample that would equal or exceed the lot is the whole lot.
#[test]
fn a_sample_beyond_the_lot_is_the_whole_lot() {
    // Letter D for 16 to 25 at level III, arrow down to K at AQL 0.10: 125 items of a lot of 20.
    let plan = plan_for(20, InspectionLevel::III, 0.10, Severity::Normal).unwrap();
    assert_eq!((plan.letter, plan.n, plan.ac), (CodeLetter::K, 20, 0));
}

/// Lot 4000, level II, AQL 0.65 and 1.5: letter L, n = 200, Ac 3 and 7.
#[test]
fn a_plan_from_the_lot() {
    let at = |aql| plan_for(4000, InspectionLevel::II, aql, Severity::Normal).unwrap();
    assert_eq!((at(0.65).n, at(0.65).ac, at(0.65).re), (200, 3, 4));
    assert_eq!((at(1.5).n, at(1.5).ac, at(1.5).re), (200, 7, 8));
}

#[test]
fn what_the_tables_do_not_hold_is_said() {
    assert_eq!(
        code_letter(1, InspectionLevel::II),
        Err(Undefined::LotTooSmall {
            smallest: 2,
            found: 1
        })
    );
    assert_eq!(
        single_sampling(CodeLetter::K, 0.7, Severity::Normal),
        Err(Undefined::AqlNotInSeries { found: 0.7 })
    );
    assert_eq!(
        single_sampling(CodeLetter::S, 0.025, Severity::Normal),
        Err(Undefined::NoPlan)
    );
    assert!(single_sampling(CodeLetter::K, f64::NAN, Severity::Normal).is_err());
}

#[test]
fn the_aql_series_is_known_and_neighbours_are_named() {
    for (index, aql) in AQL_SERIES.into_iter().enumerate() {
        assert_eq!(aql_index(aql), Some(index));
        assert_eq!(aql_index(aql / 100.0 * 100.0), Some(index));
    }
    assert_eq!(neighbouring_aqls(0.7), (Some(0.65), Some(1.0)));
    assert_eq!(neighbouring_aqls(1.0), (Some(0.65), Some(1.5)));
    assert_eq!(neighbouring_aqls(0.001), (None, Some(0.010)));
    assert_eq!(neighbouring_aqls(12.0), (Some(10.0), None));
}

/// Letter K at AQL 1.0 has Ac 3, one step tighter Ac 2 (Table 2-A).
#[test]
fn one_step_tighter_is_the_next_aql() {
    let plan = one_step_tighter(CodeLetter::K, 1.0, Severity::Normal).unwrap();
    assert_eq!((plan.n, plan.ac), (125, 2));
    assert_eq!(
        one_step_tighter(CodeLetter::Q, 0.010, Severity::Normal),
        None
    );
}

#[test]
fn words_go_there_and_back() {
    for level in InspectionLevel::ALL {
        assert_eq!(level.to_string().parse(), Ok(level));
    }
    for severity in Severity::ALL {
        assert_eq!(severity.to_string().parse(), Ok(severity));
    }
    let error = "IV".parse::<InspectionLevel>().unwrap_err();
    assert_eq!(
        error.to_string(),
        "found \"IV\", expected one of S-1, S-2, S-3, S-4, I, II, III"
    );
}
