//! Distribution functions against 50-digit references (mpmath, exact rationals).
//!
//! Tolerances are relative: 1e-10 at ordinary arguments and 1e-6 in the extreme tails are demanded;
//! what is asserted below is a few times what was measured.

use crate::reference::{Row, rows};
use reelgate::statistics::distributions::*;

/// Largest relative error over the rows of a grid for which the function gives a value.
struct Worst {
    relative: f64,
    at: String,
    rows: usize,
}

fn worst(file: &str, column: &str, found: impl Fn(&Row<'_>) -> Option<f64>) -> Worst {
    let mut worst = Worst {
        relative: 0.0,
        at: String::new(),
        rows: 0,
    };
    for row in rows(file).iter() {
        let Some(value) = found(&row) else { continue };
        worst.rows += 1;
        let expected = row.number(column);
        // Below 1e-300 doubles lose digits by themselves.
        if value == expected || (expected.abs() < 1e-300 && value.abs() < 1e-300) {
            continue;
        }
        let relative = ((value - expected) / expected).abs();
        if relative > worst.relative || relative.is_nan() {
            worst.relative = relative;
            worst.at = format!("{value:e} for {expected:e}");
        }
    }
    worst
}

#[track_caller]
fn assert_grid(file: &str, func: &str, tolerance: f64, count: usize, f: impl Fn(&Row<'_>) -> f64) {
    let worst = worst(file, "ref", |row| {
        (row.text("func") == func).then(|| f(row))
    });
    println!("{file} {func}: {:.1e} {}", worst.relative, worst.at);
    assert_eq!(worst.rows, count);
    assert!(
        worst.relative <= tolerance,
        "{file} {func}: relative error {:e}, {}",
        worst.relative,
        worst.at
    );
}

#[test]
fn normal() {
    let file = "s11_grid_normal.csv";
    let arg = |row: &Row<'_>| row.number("arg");
    assert_grid(file, "cdf", 1e-12, 93, |r| normal_cdf(arg(r)));
    assert_grid(file, "sf", 1e-12, 93, |r| normal_sf(arg(r)));
    assert_grid(file, "logcdf", 1e-12, 93, |r| normal_ln_cdf(arg(r)));
    assert_grid(file, "ppf", 1e-12, 66, |r| normal_quantile(arg(r)));
    assert_grid(file, "isf", 1e-12, 43, |r| normal_upper_quantile(arg(r)));
}

#[test]
fn student_t() {
    let file = "s11_grid_student_t.csv";
    let of = |row: &Row<'_>| (row.number("arg"), row.number("nu"));
    assert_grid(file, "sf", 1e-11, 208, |r| {
        let (t, nu) = of(r);
        student_t_sf(t, nu)
    });
    assert_grid(file, "isf", 1e-12, 135, |r| {
        let (p, nu) = of(r);
        student_t_upper_quantile(p, nu)
    });
}

#[test]
fn chi_squared() {
    let file = "s11_grid_chi2.csv";
    let of = |row: &Row<'_>| (row.number("arg"), row.number("nu"));
    assert_grid(file, "cdf", 1e-12, 166, |r| {
        let (x, nu) = of(r);
        chi_squared_cdf(x, nu)
    });
    assert_grid(file, "sf", 1e-12, 168, |r| {
        let (x, nu) = of(r);
        chi_squared_sf(x, nu)
    });
    assert_grid(file, "ppf", 1e-12, 160, |r| {
        let (p, nu) = of(r);
        chi_squared_quantile(p, nu)
    });
}

#[test]
fn fisher() {
    let file = "s11_grid_f.csv";
    let of = |row: &Row<'_>| (row.number("arg"), row.number("df1"), row.number("df2"));
    assert_grid(file, "sf", 1e-12, 166, |r| {
        let (x, a, b) = of(r);
        f_sf(x, a, b)
    });
    assert_grid(file, "isf", 1e-12, 126, |r| {
        let (p, a, b) = of(r);
        f_upper_quantile(p, a, b)
    });
}

#[test]
fn beta() {
    let file = "s11_grid_beta.csv";
    let of = |row: &Row<'_>| (row.number("arg"), row.number("a"), row.number("b"));
    assert_grid(file, "cdf", 1e-12, 178, |r| {
        let (x, a, b) = of(r);
        beta_cdf(x, a, b)
    });
    assert_grid(file, "ppf", 1e-12, 120, |r| {
        let (p, a, b) = of(r);
        beta_quantile(p, a, b)
    });
}

#[test]
fn binomial() {
    let file = "s11_grid_binomial.csv";
    for (column, f) in [
        ("cdf_ref", binomial_cdf as fn(u64, u64, f64) -> f64),
        ("sf_ref", binomial_sf),
    ] {
        let worst = worst(file, column, |r| {
            Some(f(r.count("k"), r.count("n"), r.number("p")))
        });
        println!("{file} {column}: {:.1e} {}", worst.relative, worst.at);
        assert!(worst.relative <= 1e-12, "{} {}", worst.relative, worst.at);
    }
}

#[test]
fn hypergeometric() {
    let file = "s11_grid_hypergeom.csv";
    for (column, f) in [
        (
            "cdf_ref",
            hypergeometric_cdf as fn(u64, u64, u64, u64) -> f64,
        ),
        ("sf_ref", hypergeometric_sf),
    ] {
        let worst = worst(file, column, |r| {
            Some(f(r.count("k"), r.count("N"), r.count("D"), r.count("n")))
        });
        println!("{file} {column}: {:.1e} {}", worst.relative, worst.at);
        assert!(worst.relative <= 1e-12, "{} {}", worst.relative, worst.at);
    }
}

/// scipy itself is wrong in places here; the references are 40-digit integrals.
#[test]
fn noncentral_t() {
    let file = "s11_grid_nct_cdf.csv";
    let of = |row: &Row<'_>| (row.number("t"), row.number("nu"), row.number("delta"));
    for (column, f) in [
        ("cdf_ref", noncentral_t_cdf as fn(f64, f64, f64) -> f64),
        ("sf_ref", noncentral_t_sf),
    ] {
        let worst = worst(file, column, |r| {
            let (t, nu, delta) = of(r);
            Some(f(t, nu, delta))
        });
        println!("{file} {column}: {:.1e} {}", worst.relative, worst.at);
        assert_eq!(worst.rows, 290);
        assert!(worst.relative <= 1e-10, "{} {}", worst.relative, worst.at);
    }
    let file = "s11_grid_nct_ppf.csv";
    let worst = worst(file, "ppf_ref", |r| {
        Some(noncentral_t_quantile(
            r.number("p"),
            r.number("nu"),
            r.number("delta"),
        ))
    });
    println!("{file}: {:.1e} {}", worst.relative, worst.at);
    assert!(worst.relative <= 1e-10, "{} {}", worst.relative, worst.at);
}

/// δ at an observed t is the inverse of the upper tail in δ.
#[test]
fn noncentrality() {
    for (t, nu, p) in [(5.0, 9.0, 0.05), (21.9, 29.0, 0.05), (-1.0, 4.0, 0.9)] {
        let delta = noncentrality_at(t, nu, p);
        assert!((noncentral_t_sf(t, nu, delta) / p - 1.0).abs() < 1e-11);
    }
}

#[test]
fn outside_the_domain_is_not_a_number() {
    assert!(normal_quantile(1.5).is_nan());
    assert!(chi_squared_quantile(-0.1, 3.0).is_nan());
    assert!(chi_squared_cdf(1.0, 0.0).is_nan());
    assert!(student_t_sf(1.0, -1.0).is_nan());
    assert!(student_t_upper_quantile(f64::NAN, 3.0).is_nan());
    assert!(beta_cdf(0.5, 0.0, 1.0).is_nan());
    assert!(binomial_cdf(1, 10, f64::NAN).is_nan());
    assert!(f_sf(f64::NAN, 1.0, 2.0).is_nan());
    assert!(poisson_cdf(3, f64::NAN).is_nan());
    assert!(noncentral_t_cdf(1.0, 0.5, 0.0).is_nan());
    assert!(noncentral_t_quantile(1.0, 5.0, 0.0).is_nan());
}
