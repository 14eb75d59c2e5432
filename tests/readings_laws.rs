//! Laws that readings keep whatever the sweep, and that no sweep makes them panic.

mod readings_support;

use num_complex::Complex64;
use proptest::prelude::*;
use readings_support::*;
use reelgate::readings::{
    Budget, Characteristic as Ch, Equivalent, Place, Reader, Referral, Request, Value, refer,
};
use reelgate::sweep::Sweep;

fn series(r: f64, l: f64, c: f64) -> Network {
    Network::Series(vec![Network::R(r), Network::L(l), Network::C(c)])
}

fn known(sweep: &Sweep, request: &Request) -> Option<f64> {
    read(sweep, request).lowest.known_value()
}

fn near(a: f64, b: f64, tolerance: f64) -> bool {
    (a / b - 1.0).abs() <= tolerance
}

fn everything() -> Vec<Request> {
    let mut all: Vec<Request> = [
        Ch::Capacitance,
        Ch::DissipationFactor,
        Ch::Esr,
        Ch::Impedance,
    ]
    .into_iter()
    .flat_map(|c| [at(c, 1e4), at(c, 3.3e5)])
    .collect();
    all.extend([Ch::EsrMinimum, Ch::Srf, Ch::Esl].map(anywhere));
    for characteristic in [Ch::Esr, Ch::Impedance, Ch::EsrMinimum] {
        all.push(Request {
            place: Place::Between(2e4, 5e5),
            ..anywhere(characteristic)
        });
    }
    all.push(Request {
        equivalent: Equivalent::Parallel,
        ..at(Ch::Capacitance, 1e4)
    });
    all
}

proptest! {
    /// A series circuit's elements come back, with the resonance `1/(2π√(LC))`.
    #[test]
    fn a_series_circuit(c in -8.0..-4.5f64, q in 0.3..30.0f64, srf in 5.0..6.8f64) {
        let (c, srf) = (10f64.powf(c), 10f64.powf(srf));
        let w = std::f64::consts::TAU * srf;
        let (l, r) = (1.0 / (w * w * c), 1.0 / (w * c * q));
        let sweep = clean(&series(r, l, c), &grid(1e3, 65e6, 50));
        prop_assert!(near(known(&sweep, &anywhere(Ch::Srf)).unwrap(), srf, 1e-8));
        prop_assert!(near(known(&sweep, &anywhere(Ch::EsrMinimum)).unwrap(), r, 1e-5));
        prop_assert!(near(known(&sweep, &anywhere(Ch::Esl)).unwrap(), l, 1e-6));
        let f = 1e4;
        let apparent = c / (1.0 - (f / srf) * (f / srf));
        prop_assert!(near(known(&sweep, &at(Ch::Capacitance, f)).unwrap(), apparent, 1e-8));
    }

    /// Z times k: resistances and inductance times k, capacitance over k, resonance and loss alike.
    #[test]
    fn impedance_scales(k in -3.0..3.0f64, seed in 0u64..1000, which in 0usize..6) {
        let k = 10f64.powf(k);
        let exact = clean(&parts()[which].network, &grid(1e3, 65e6, 50));
        let sweep = noisy(&exact, 1e-3, 1e-3, &mut Random::new(seed));
        let mut scaled = sweep.clone();
        scaled.impedance.iter_mut().for_each(|z| *z *= k);
        for request in everything() {
            let (before, after) = (read(&sweep, &request), read(&scaled, &request));
            let power = match request.characteristic {
                Ch::Capacitance => -1,
                Ch::DissipationFactor | Ch::Srf => 0,
                _ => 1,
            };
            match (before.lowest.value, after.lowest.value) {
                (Value::Known(a), Value::Known(b)) => {
                    let u = before.lowest.standard_uncertainty.unwrap() * k.powi(power);
                    if near(b, a * k.powi(power), 1e-6) {
                        let scaled = after.lowest.standard_uncertainty.unwrap();
                        prop_assert!(near(scaled, u, 1e-4), "{request:?}: u {u} {scaled}");
                    } else {
                        // Where noise hides nearly all of a value, rounding decides between two
                        // fits that differ by a small share of its uncertainty.
                        let apart = (b - a * k.powi(power)).abs();
                        prop_assert!(apart < 0.05 * u, "{request:?}: {a} {b}, u {u}");
                    }
                }
                (Value::Below(a), Value::Below(b)) => {
                    prop_assert!(near(b, a * k.powi(power), 1e-4), "{request:?}: {a} {b}");
                }
                (a, b) => prop_assert_eq!(a, b),
            }
        }
    }

    /// Frequencies times k: resonance times k, inductance and capacitance over k.
    #[test]
    fn frequency_scales(k in -1.0..1.0f64, which in 0usize..6) {
        let k = 10f64.powf(k);
        let sweep = clean(&parts()[which].network, &grid(1e3, 65e6, 50));
        let mut scaled = sweep.clone();
        scaled.frequency.iter_mut().for_each(|f| *f *= k);
        let pairs = [
            (Ch::Srf, known(&sweep, &anywhere(Ch::Srf)), known(&scaled, &anywhere(Ch::Srf)), k),
            (Ch::Esl, known(&sweep, &anywhere(Ch::Esl)), known(&scaled, &anywhere(Ch::Esl)), 1.0 / k),
            (
                Ch::Capacitance,
                known(&sweep, &at(Ch::Capacitance, 2e4)),
                known(&scaled, &at(Ch::Capacitance, 2e4 * k)),
                1.0 / k,
            ),
        ];
        for (what, before, after, factor) in pairs {
            match (before, after) {
                (Some(a), Some(b)) => prop_assert!(near(b, a * factor, 1e-6), "{what:?}: {a} {b}"),
                (a, b) => prop_assert_eq!(a, b),
            }
        }
    }

    /// Whatever numbers a sweep holds: readings are finite with a finite uncertainty, or missing
    /// with a reason, and nothing panics.
    #[test]
    fn nonsense_is_survived(
        values in prop::collection::vec((0.01..3.0f64, any::<f64>(), any::<f64>()), 2..60),
        start in 1.0..1e6f64,
    ) {
        let mut sweep = Sweep { frequency: vec![], impedance: vec![], level: None };
        let mut f = start;
        for (step, re, im) in values {
            let finite = |v: f64| if v.is_finite() { v } else { 0.0 };
            sweep.frequency.push(f);
            sweep.impedance.push(Complex64::new(finite(re), finite(im)));
            f *= step.exp();
        }
        for request in everything() {
            let extremes = read(&sweep, &request);
            for reading in [extremes.lowest, extremes.highest] {
                match reading.value {
                    Value::Known(v) => prop_assert!(v.is_finite()),
                    Value::Above(v) | Value::Below(v) => prop_assert!(v > 0.0),
                    Value::Missing => prop_assert!(!reading.warnings.is_empty()),
                }
                prop_assert!(reading.standard_uncertainty.is_none_or(|u| u.is_finite() && u >= 0.0));
            }
        }
    }

    /// Two random values of moderate size on a sound grid.
    #[test]
    fn any_course_is_survived(
        values in prop::collection::vec((-1e3..1e3f64, -1e3..1e3f64), 2..120),
    ) {
        let frequency = (0..values.len()).map(|i| 1e3 * 10f64.powf(i as f64 / 25.0)).collect();
        let impedance = values.into_iter().map(|(a, b)| Complex64::new(a, b)).collect();
        let sweep = Sweep { frequency, impedance, level: None };
        for request in everything() {
            let extremes = read(&sweep, &request);
            if let (Some(low), Some(high)) =
                (extremes.lowest.known_value(), extremes.highest.known_value())
            {
                prop_assert!(low <= high);
            }
        }
    }

    /// Referral to the referee time is undone by referral back, and its uncertainty grows with the
    /// distance in decades.
    #[test]
    fn ageing_goes_both_ways(rate in 0.0..0.10f64, age in 0.0..5.0f64, to in 0.0..5.0f64) {
        let (age, to) = (10f64.powf(age), 10f64.powf(to));
        let there = Referral { per_decade: rate, age, refer_to: to };
        let back = Referral { per_decade: rate, age: to, refer_to: age };
        let (there, back) = (there.factor().unwrap(), back.factor().unwrap());
        prop_assert!((there * back - 1.0).abs() < 1e-12);
        prop_assert_eq!(there >= 1.0 - 1e-15, age >= to || rate == 0.0);
    }
}

#[test]
fn an_intermittent_point_in_a_band_counts_as_measured() {
    // Smoothing must not hide a peak that is no noise.
    let mut sweep = clean(&part("mlcc_4u7_0805_x7r").network, &grid(1e3, 65e6, 50));
    let i = sweep.frequency.partition_point(|f| *f < 1e6);
    sweep.impedance[i] += 0.5;
    let band = Request {
        place: Place::Between(7e5, 4e6),
        ..anywhere(Ch::Impedance)
    };
    let highest = read(&sweep, &band).highest;
    assert!(highest.known_value().unwrap() > 0.5, "{highest:?}");
    assert_eq!(highest.frequency, Some(sweep.frequency[i]));
}

#[test]
fn several_crossings_give_the_first_and_say_so() {
    // A second part left in the jig: a small one in parallel makes an anti-resonance.
    let both = Network::Parallel(vec![
        series(5e-3, 5e-9, 4.7e-6),
        series(20e-3, 1e-9, 100e-9),
    ]);
    let sweep = clean(&both, &grid(1e3, 65e6, 50));
    let reading = read(&sweep, &anywhere(Ch::Srf)).lowest;
    let srf = reading.known_value().unwrap();
    assert!((9e5..1.2e6).contains(&srf), "{srf}");
    assert!(
        reading
            .warnings
            .iter()
            .any(|w| w.code == "multiple_resonances"),
        "{reading:?}"
    );
}

#[test]
fn ageing_worked_example_and_its_uncertainty() {
    // IEC 60384-22 annex on ageing: C(t) = C(1 h)(1 − k lg t). 8000 h to 1000 h, k = 2.5 %: +2.50 %.
    let referral = Referral {
        per_decade: 0.025,
        age: 8000.0,
        refer_to: 1000.0,
    };
    assert!((referral.factor().unwrap() - 1.0250).abs() < 5e-5);
    let reading = reelgate::readings::Reading::known(4.5e-6, Some(9e-9));
    let (referred, measured) = refer(&reading, &referral).unwrap();
    assert_eq!(measured, Some(4.5e-6));
    let u = referred.standard_uncertainty.unwrap();
    // ±40 % of 2.5 % a decade, rectangular, over 0.903 decades: 0.521 % of the value.
    let rate = 4.5e-6 * 0.4 / 3f64.sqrt() * 0.025 * 8f64.log10();
    assert!((u - (9e-9 * referral.factor().unwrap()).hypot(rate)).abs() < 1e-14);
    assert_eq!(referred.warnings[0].code, "referred_to_referee_time");
}

#[test]
fn a_loss_that_noise_hides_is_a_bound_and_never_negative() {
    // 1 µF film at 1 kHz: tan δ = 2.1e-4 under 0.1° = 17e-4 of phase noise at each point.
    let exact = clean(&part("film_1u_pp").network, &grid(1e3, 65e6, 50));
    let truth = truth("film_1u_pp", "D_test");
    let (mut bounds, mut held) = (0, 0);
    for seed in 1..=200 {
        let sweep = noisy(&exact, 5e-3, 1.7e-3, &mut Random::new(seed));
        let reading = read(&sweep, &at(Ch::DissipationFactor, 1e3)).lowest;
        match reading.value {
            Value::Below(most) => {
                let note = reading.warnings.last().unwrap();
                assert_eq!(note.code, "hidden_by_noise");
                let shown = format!(
                    "dissipation factor: it is known only to lie below {:.3} %",
                    100.0 * most
                );
                assert!(note.text.contains(&shown), "{}", note.text);
                bounds += 1;
                held += u32::from(truth < most);
            }
            Value::Known(d) => assert!(d > 0.0, "{reading:?}"),
            _ => panic!("{reading:?}"),
        }
    }
    assert!(bounds > 100, "{bounds} of 200 are bounds");
    assert!(
        f64::from(held) >= 0.93 * f64::from(bounds),
        "{held} of {bounds} hold"
    );
}

/// What a thread keeps of the frequencies it has seen must not show: the same readings and circuits
/// in any order, and by a thread that has seen nothing.
#[test]
fn readings_do_not_depend_on_the_sweeps_before() {
    let mut sweeps = Vec::new();
    for (part, seed) in parts().into_iter().zip(1..) {
        for per_decade in [25, 50, 83] {
            let whole = grid(1e3, 65e6, per_decade);
            // A list, its lower half, and one that is the same but for one frequency.
            let half = whole[..whole.len() / 2].to_vec();
            let mut moved = whole.clone();
            moved[whole.len() / 2] *= 1.001;
            for frequency in [whole, half, moved] {
                let exact = clean(&part.network, &frequency);
                sweeps.push(noisy(&exact, 2e-3, 1e-3, &mut Random::new(seed)));
            }
        }
    }
    let budget = Budget::of(&station(1e-3, 1e-3));
    let of = |sweep: &Sweep| {
        let reader = Reader::new(sweep, &budget);
        let readings: Vec<_> = everything().iter().map(|r| reader.read(r)).collect();
        format!("{readings:?} {:?}", reader.circuit())
    };
    let results = |order: Vec<usize>| -> Vec<String> {
        let mut found = vec![String::new(); sweeps.len()];
        std::thread::scope(|scope| {
            let work = scope.spawn(|| order.iter().for_each(|i| found[*i] = of(&sweeps[*i])));
            work.join().expect("readings");
        });
        found
    };
    let forwards = results((0..sweeps.len()).collect());
    assert_eq!(results((0..sweeps.len()).rev().collect()), forwards);
    for (i, expected) in forwards.iter().enumerate() {
        assert_eq!(results(vec![i])[i], *expected);
    }
}
