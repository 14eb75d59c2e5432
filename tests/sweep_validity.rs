//! Validity of sweeps: every class of fault is found, clean sweeps pass.

mod sweep_support;

use num_complex::Complex64;
use reelgate::station::{Method, Reference};
use reelgate::sweep::Sweep;
use reelgate::sweep::validity::{Evidence, check};
use std::f64::consts::TAU;
use sweep_support::*;

fn two_channel_station() -> reelgate::station::Station {
    station(Method::SeriesReference, Some(two_channel()))
}

/// The fault sweeps by the code that must come first; none where only limits can see the fault.
const FAULTS: [(&str, &[&str]); 19] = [
    ("good_100n", &[]),
    ("open_no_part", &["open_contact"]),
    ("short_bridge", &["short_contact"]),
    ("intermittent_contact_resistance", &["intermittent_contact"]),
    ("intermittent_open", &["intermittent_contact"]),
    ("contact_drift_during_sweep", &["kramers_kronig"]),
    ("clipped_channels_low_f", &["channel_clipped"]),
    ("clipped_A_only", &["channel_clipped"]),
    ("channels_swapped", &["channels_swapped"]),
    ("channel_B_inverted", &["channel_inverted"]),
    (
        "dut_and_reference_swapped",
        &["part_and_reference_exchanged"],
    ),
    ("drive_too_low", &["noise_floor"]),
    ("channel_skew_3ns", &["not_passive"]),
    ("parallel_part_left_in_jig", &["multiple_resonances"]),
    ("range_change_step", &["step_in_sweep"]),
    // Passive linear networks themselves: a smaller, a larger, an inductively mounted part, and a
    // skew of a tenth of the other one.
    ("wrong_part_10n", &[]),
    ("wrong_part_4u7", &[]),
    ("tilted_part_extra_inductance", &[]),
    ("channel_skew_300ps", &[]),
];

#[test]
fn every_class_of_fault_is_found_and_named() {
    let mut wrong = Vec::new();
    for (name, expected) in FAULTS {
        let attempt = one(
            &reference_file(&format!("sweeps/faults/{name}.csv")),
            &two_channel_station(),
        );
        let found = codes(&attempt);
        println!("{name}: {:?}", attempt.sweep.as_ref().map(|_| ()));
        if found.first().map(String::as_str) != expected.first().copied() {
            wrong.push(format!("{name}: {found:?}, expected {expected:?}"));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn clean_noisy_sweeps_are_not_refused() {
    for name in [
        "mlcc_100n_0402_x7r",
        "mlcc_4u7_0805_x7r",
        "polymer_47u",
        "alu_330u",
    ] {
        let attempt = one(
            &reference_file(&format!("sweeps/noisy/{name}_noisy.csv")),
            &two_channel_station(),
        );
        println!("{name}: {:?} {:?}", codes(&attempt), attempt.notes);
        assert!(attempt.sweep.is_ok(), "{name}: {:?}", attempt.sweep);
    }
    let mut station = two_channel_station();
    station.reference = Some(Reference {
        resistance: 100.0,
        tolerance: 0.0,
        inductance: 0.8e-9,
    });
    let attempt = one(
        &reference_file("sweeps/noisy/c0g_1n_0402_rref100_noisy.csv"),
        &station,
    );
    assert!(attempt.sweep.is_ok(), "{:?}", attempt.sweep);
    assert!(attempt.notes.iter().any(|n| n.code == "noisy_low_end"));
}

/// One part on a list of its own density.
fn truth(name: &str, per_decade: f64, from: f64, to: f64) -> (Vec<f64>, Vec<Complex64>) {
    let points = (per_decade * (to / from).log10()).floor() as i32;
    let frequency: Vec<f64> = (0..=points)
        .map(|i| from * 10f64.powf(f64::from(i) / per_decade))
        .collect();
    let part = part(name);
    let impedance = frequency.iter().map(|f| part.impedance(*f)).collect();
    (frequency, impedance)
}

/// Two-channel noise: additive in V and proportional, on an EMF of 2 V behind 50 Ω.
fn measured(
    z: &[Complex64],
    f: &[f64],
    rref: f64,
    additive: f64,
    proportional: f64,
    random: &mut Random,
) -> Vec<Complex64> {
    z.iter()
        .zip(f)
        .map(|(z, f)| {
            let zref = Complex64::new(rref, TAU * f * 0.3e-9);
            let i = 2.0 / (50.0 + zref + z);
            let mut noisy = |v: Complex64| {
                v * (1.0 + random.complex() * proportional) + random.complex() * additive
            };
            let (a, b) = (noisy(i * (zref + z)), noisy(i * z));
            zref * b / (a - b)
        })
        .collect()
}

#[test]
fn fewer_than_one_clean_sweep_in_a_thousand_is_refused() {
    let station = station(Method::Direct, None);
    let evidence = Evidence::of(&station);
    let mut random = Random(2859);
    let mut refused = Vec::new();
    let mut sweeps = 0;
    let mut judge = |what: String, frequency: &[f64], impedance: Vec<Complex64>| {
        let sweep = Sweep {
            frequency: frequency.to_vec(),
            impedance,
            level: None,
        };
        let findings = check(&sweep, &evidence);
        if let Some(fault) = findings.faults.first() {
            refused.push(format!("{what}: {fault:?}"));
        }
        sweeps += 1;
    };
    for name in PARTS {
        for per_decade in [10.0, 25.0, 50.0, 100.0] {
            let (f, z) = truth(name, per_decade, 1e3, 65e6);
            judge(format!("{name} {per_decade} without noise"), &f, z.clone());
            for _ in 0..60 {
                // 0.5 % of magnitude and 0.1° of phase at each point.
                let noisy = z.iter().map(|z| {
                    let (a, b) = (random.complex(), random.complex());
                    z * Complex64::from_polar(
                        1.0 + 0.005 * a.re * 2f64.sqrt(),
                        0.1f64.to_radians() * b.re * 2f64.sqrt(),
                    )
                });
                let noisy: Vec<Complex64> = noisy.collect();
                judge(format!("{name} {per_decade} polar noise"), &f, noisy);
            }
            for _ in 0..60 {
                let rref = if name == "c0g_1n_0402" { 100.0 } else { 1.0 };
                let additive = random.uniform(1e-6, 8e-6);
                let proportional = random.uniform(1e-6, 1e-4);
                let z = measured(&z, &f, rref, additive, proportional, &mut random);
                judge(
                    format!("{name} {per_decade} channel noise {additive:e} {proportional:e}"),
                    &f,
                    z,
                );
            }
        }
    }
    println!(
        "{} of {sweeps} clean sweeps refused\n{}",
        refused.len(),
        refused.join("\n")
    );
    assert!(
        refused.len() * 1000 < sweeps,
        "{} of {sweeps} refused",
        refused.len()
    );
}

/// A fault made in a clean sweep: what it does to the impedance.
type Break = fn(&[f64], &mut [Complex64], &mut Random);

const BREAKS: [(&str, Break); 6] = [
    // The contact opens at one to four points in a row, to the stray of the jig.
    ("contact opens", |f, z, random| {
        let at = place(z.len(), random);
        for i in at..at + 1 + (random.uniform(0.0, 4.0) as usize) {
            z[i] = Complex64::new(1e-6, TAU * f[i] * 16e-12).inv();
        }
    }),
    // At 3 to 10 % of the points the contact adds as much as the part's own impedance or more.
    ("contact resistance flickers", |_, z, random| {
        let share = random.uniform(0.03, 0.1);
        let at = place(z.len(), random);
        for (i, z) in z.iter_mut().enumerate() {
            if i == at || random.uniform(0.0, 1.0) < share {
                *z += z.norm() * random.uniform(1.0, 5.0);
            }
        }
    }),
    ("range step of 5 % to 20 %", |_, z, random| {
        let (at, factor) = (place(z.len(), random), 1.0 + random.uniform(0.05, 0.2));
        z[at..].iter_mut().for_each(|z| *z *= factor);
    }),
    // The resistance drifts by half to twice the impedance at resonance while the sweep runs.
    ("contact drifts", |_, z, random| {
        let least = z.iter().map(|z| z.norm()).fold(f64::INFINITY, f64::min);
        let (n, drift) = (z.len() as f64, least.max(0.02) * random.uniform(3.0, 10.0));
        z.iter_mut()
            .enumerate()
            .for_each(|(i, z)| *z += drift * i as f64 / n);
    }),
    ("short", |f, z, random| {
        let (r, l) = (random.uniform(0.2e-3, 5e-3), random.uniform(0.1e-9, 1e-9));
        f.iter()
            .zip(z)
            .for_each(|(f, z)| *z = Complex64::new(r, TAU * f * l));
    }),
    ("phase off by 3° to 10°", |_, z, random| {
        let turn = Complex64::from_polar(1.0, -random.uniform(3.0, 10.0).to_radians());
        z.iter_mut().for_each(|z| *z *= turn);
    }),
];

/// A place well inside the sweep.
fn place(points: usize, random: &mut Random) -> usize {
    random.uniform(0.1, 0.85).mul_add(points as f64, 0.0) as usize
}

/// The confusion table of made faults: how many of each class are refused. Drift of a contact is
/// as large as it takes to matter; small drift is within what passive networks can show.
#[test]
fn made_faults_are_refused() {
    let station = station(Method::Direct, None);
    let evidence = Evidence::of(&station);
    let mut random = Random(1995);
    println!("{:28} {:>8} {:>8}", "fault", "made", "refused");
    let mut short_of = Vec::new();
    for (what, make) in BREAKS {
        let (mut made, mut refused) = (0, 0);
        for name in PARTS {
            let (f, z) = truth(name, 50.0, 1e3, 65e6);
            for _ in 0..40 {
                let noise = random.uniform(1e-5, 2e-3);
                let mut z: Vec<Complex64> = z
                    .iter()
                    .map(|z| z * (1.0 + random.complex() * noise))
                    .collect();
                make(&f, &mut z, &mut random);
                let sweep = Sweep {
                    frequency: f.clone(),
                    impedance: z,
                    level: None,
                };
                made += 1;
                refused += usize::from(!check(&sweep, &evidence).faults.is_empty());
            }
        }
        println!("{what:28} {made:8} {refused:8}");
        if refused * 100 < made * 95 {
            short_of.push(format!("{what}: {refused} of {made}"));
        }
    }
    assert!(short_of.is_empty(), "{short_of:?}");
}

/// What a thread keeps of the lists it has seen must not show: the same findings in any order, and
/// by a thread that has seen nothing.
#[test]
fn findings_do_not_depend_on_the_sweeps_before() {
    let mut random = Random(710);
    let mut sweeps = Vec::new();
    for name in PARTS {
        for per_decade in [10.0, 17.0, 25.0, 50.0, 61.0, 100.0] {
            let (frequency, z) = truth(name, per_decade, 1e3, 65e6);
            // Drift from none to much, so that some are refused by the Kramers-Kronig test.
            let most = z.iter().map(|z| z.norm()).fold(f64::INFINITY, f64::min);
            let (n, drift) = (z.len() as f64, most * random.uniform(-1.0, 8.0).max(0.0));
            let impedance = z
                .iter()
                .enumerate()
                .map(|(i, z)| z * (1.0 + random.complex() * 1e-4) + drift * i as f64 / n)
                .collect();
            sweeps.push(Sweep {
                frequency,
                impedance,
                level: None,
            });
        }
    }
    let evidence = Evidence::of(&station(Method::Direct, None));
    let findings = |order: Vec<usize>| -> Vec<String> {
        let mut found = vec![String::new(); sweeps.len()];
        std::thread::scope(|scope| {
            let work = scope.spawn(|| {
                for i in order {
                    found[i] = format!("{:?}", check(&sweeps[i], &evidence));
                }
            });
            work.join().expect("findings");
        });
        found
    };
    let forwards = findings((0..sweeps.len()).collect());
    let refused = forwards.iter().filter(|f| f.contains("kramers_kronig"));
    assert!((3..sweeps.len()).contains(&refused.count()), "{forwards:?}");
    assert_eq!(findings((0..sweeps.len()).rev().collect()), forwards);
    for (i, expected) in forwards.iter().enumerate() {
        assert_eq!(findings(vec![i])[i], *expected);
    }
}
