//! The pictures of docs/certificate.md that show what no sample lot has, and the grid of page one.
//! `REELGATE_UPDATE=1 cargo test --test certificate pictures` writes them anew.

use super::{PAPERS, lots, sources, tools};
use reelgate::certificate::{Paper, render, render_with_grid};
use std::path::Path;

#[test]
fn the_grid_names_the_margins_on_either_paper_and_leaves_the_text_as_it_is() {
    let case = lots::rejected();
    for paper in PAPERS {
        let plain = render(&case.record, &case.curves, &sources(&case), paper).expect("a document");
        let grid = render_with_grid(&case.record, &case.curves, &sources(&case), paper)
            .expect("a document");
        let words = |pdf: &[u8]| {
            let saved = tools::save(pdf);
            tools::run(
                "pdftotext",
                &["-raw", "-f", "1", "-l", "1", "FILE", "-"],
                &saved.path,
            )
        };
        let (plain, grid) = (words(&plain.pdf), words(&grid.pdf));
        for name in [
            "left margin 56.0",
            "right margin",
            "running head",
            "sentence",
            "bottom",
        ] {
            assert!(grid.contains(name) && !plain.contains(name), "{name}");
        }
        for line in plain.lines().filter(|l| l.len() > 3) {
            assert!(grid.contains(line), "{line}");
        }
    }
}

#[test]
fn pictures_are_written_where_that_is_asked_for() {
    let found = lots::found();
    let pdf =
        render(&found.record, &found.curves, &sources(&found), Paper::A4).expect("a document");
    let saved = tools::save(&pdf.pdf);
    let pages = tools::pages(&saved.path);
    let page = |heading: &str| {
        let at = pages
            .iter()
            .position(|p| p.lines().any(|l| l.trim() == heading));
        at.unwrap_or_else(|| panic!("no page with the heading {heading}")) + 1
    };
    let wanted = [
        ("populations", page("Two populations")),
        ("lots", page("Lot to lot")),
    ];
    if std::env::var_os("REELGATE_UPDATE").is_none() {
        return;
    }
    let picture = |name: &str, page: usize, path: &Path| {
        let number = page.to_string();
        let to = format!("{}/docs/certificate/{name}", env!("CARGO_MANIFEST_DIR"));
        let arguments = [
            "-r",
            "64",
            "-png",
            "-singlefile",
            "-f",
            &number,
            "-l",
            &number,
            "FILE",
            &to,
        ];
        tools::run("pdftoppm", &arguments, path);
    };
    for (name, page) in wanted {
        picture(name, page, &saved.path);
    }
    let case = lots::rejected();
    let grid = render_with_grid(&case.record, &case.curves, &sources(&case), Paper::A4)
        .expect("a document");
    let saved = tools::save(&grid.pdf);
    picture("grid", 1, &saved.path);
}
