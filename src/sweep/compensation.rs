//! Open/short/load compensation of the jig.
//!
//! The jig is a linear two-port between the reference plane and the part, so the impedance read
//! is a bilinear function of the part's; with three standards the cross-ratio, which such a
//! function keeps, gives the part without a model of the jig. With open and short alone the jig
//! is taken as a series arm followed by a stray admittance at the part, with the short alone as a
//! series arm, with the open alone as a stray admittance. (Derived from the chain matrix; Pozar,
//! Microwave Engineering, 4th edition, section 4.4.) A standard is what it is defined to be: a
//! short that is taken as zero adds its inductance to every part.

use super::file;
use super::validity;
use super::{RawFile, Sweep};
use crate::diagnostic::Note;
use crate::station::{Standard, Station};
use num_complex::Complex64;
use std::f64::consts::TAU;

/// Grid points nearer to each other than this (relative) are the same.
const SAME: f64 = 1e-6;

/// The open must read so many times the short (in the middle of the common range); less is no
/// pair of standards.
const OPEN_OVER_SHORT: f64 = 20.0;

/// With open and short alone the load must read within this factor of what it is, in the lower half of
/// its sweep, where those two suffice whatever the jig.
const LOAD_OFF: f64 = 1.5;

/// The standards of a station as measured on its jig, ready to be used.
#[derive(Debug, Clone, PartialEq)]
pub struct Standards {
    open: Option<Measured>,
    short: Option<Measured>,
    load: Option<Measured>,
}

/// One standard: what it read and what it is.
#[derive(Debug, Clone, PartialEq)]
struct Measured {
    name: String,
    frequency: Vec<f64>,
    /// `ln f`
    position: Vec<f64>,
    impedance: Vec<Complex64>,
    /// Interpolated as `R, L` (short, load) or as `G, C` (open).
    as_admittance: bool,
    standard: Standard,
}

impl Standards {
    /// Reads the sweeps that the station file names. `files` holds them under those names; more
    /// may be there.
    ///
    /// # Errors
    /// A sweep that is missing or cannot be read, a load without open and short, an open that
    /// does not stand clear of the short, a load that reads like another. At least one note, each naming the standard.
    pub fn read(files: &[RawFile], station: &Station) -> Result<Standards, Vec<Note>> {
        let mut faults = Vec::new();
        let named = &station.compensation;
        let mut one = |role: &str, standard: &Option<Standard>| {
            let standard = standard.as_ref()?;
            match Measured::read(role, files, standard, station) {
                Ok(measured) => Some(measured),
                Err(notes) => {
                    faults.extend(notes);
                    None
                }
            }
        };
        let standards = Standards {
            open: one("open", &named.open),
            short: one("short", &named.short),
            load: one("load", &named.load),
        };
        if named.load.is_some() && (named.open.is_none() || named.short.is_none()) {
            faults.push(Note::new(
                "compensation_incomplete",
                "a load standard is of use only together with an open and a short: add them to the station file or leave the load out",
            ));
        }
        if faults.is_empty() {
            standards
                .distinct()
                .and_then(|()| standards.load_as_stated())
                .map_err(|note| vec![note])?;
            Ok(standards)
        } else {
            Err(faults)
        }
    }

    /// The sweep with the jig taken out; the level stays as it is.
    ///
    /// # Errors
    /// A sweep that reaches beyond a standard's sweep (nothing is extrapolated), or a point at
    /// which the compensation has no finite result.
    pub fn apply(&self, sweep: Sweep) -> Result<Sweep, Vec<Note>> {
        let on_grid = |measured: &Option<Measured>| match measured {
            Some(measured) => measured.at(&sweep.frequency).map(Some),
            None => Ok(None),
        };
        let one = |note| vec![note];
        let open = on_grid(&self.open).map_err(one)?;
        let short = on_grid(&self.short).map_err(one)?;
        let load = on_grid(&self.load).map_err(one)?;
        let value =
            |list: &Option<Vec<Complex64>>, i: usize| list.as_ref().and_then(|l| l.get(i).copied());
        let mut impedance = Vec::with_capacity(sweep.impedance.len());
        for (i, (&frequency, &read)) in sweep.frequency.iter().zip(&sweep.impedance).enumerate() {
            let omega = TAU * frequency;
            let truth = |m: &Option<Measured>| {
                m.as_ref()
                    .map_or(Complex64::default(), |m| m.standard.impedance(omega))
            };
            // The open by its admittance, as an ideal one has no impedance.
            let g = Complex64::new(
                0.0,
                self.open
                    .as_ref()
                    .map_or(0.0, |m| omega * m.standard.capacitance),
            );
            let (s, l) = (truth(&self.short), truth(&self.load));
            let part = match (value(&open, i), value(&short, i), value(&load, i)) {
                (Some(zo), Some(zs), Some(zl)) => open_short_load(read, zo, zs, zl, (g, s, l)),
                (Some(zo), Some(zs), None) => open_short(read, zo, zs, g, s),
                (None, Some(zs), _) => read - zs + s,
                (Some(zo), None, _) => (read.finv() - zo.finv() + g).finv(),
                (None, None, _) => read,
            };
            if !part.is_finite() {
                return Err(vec![Note::new(
                    "compensation_not_finite",
                    format!(
                        "the compensation has no finite result at {}: the part reads like a standard; check the jig and the standards' sweeps",
                        super::faults::hertz(frequency)
                    ),
                )]);
            }
            impedance.push(part);
        }
        Ok(Sweep { impedance, ..sweep })
    }

    /// The open reading in Ω on a frequency list inside its sweep; `None` without an open.
    pub(super) fn open_reading(&self, frequency: &[f64]) -> Option<Vec<Complex64>> {
        self.open.as_ref()?.at(frequency).ok()
    }

    fn distinct(&self) -> Result<(), Note> {
        let (Some(open), Some(short)) = (&self.open, &self.short) else {
            return Ok(());
        };
        let (open_name, short_name) = (&open.name, &short.name);
        let mut ratios: Vec<f64> = short
            .frequency
            .iter()
            .zip(&short.impedance)
            .filter_map(|(f, zs)| {
                let zo = open.at(std::slice::from_ref(f)).ok()?;
                Some(zo.first()?.norm() / zs.norm())
            })
            .collect();
        if ratios.is_empty() {
            return Err(Note::new(
                "compensation_range",
                format!(
                    "the sweeps of open (`{open_name}`) and short (`{short_name}`) have no frequency in common: record both on the sweep's own frequency list"
                ),
            ));
        }
        let middle = ratios.len() / 2;
        let (_, median, _) = ratios.select_nth_unstable_by(middle, f64::total_cmp);
        if *median < OPEN_OVER_SHORT {
            return Err(Note::new(
                "standard_implausible",
                format!(
                    "the open (`{open_name}`) reads only {median:.3} times the short (`{short_name}`), at least {OPEN_OVER_SHORT} times is expected: were they mixed up, or did a contact fail? Record them again"
                ),
            ));
        }
        Ok(())
    }
}

impl Standards {
    /// The load, read with open and short alone, is about what the station file says.
    fn load_as_stated(&self) -> Result<(), Note> {
        let (Some(open), Some(short), Some(load)) = (&self.open, &self.short, &self.load) else {
            return Ok(());
        };
        let half = load.frequency.len().div_ceil(2);
        let mut ratios: Vec<f64> = load
            .frequency
            .iter()
            .zip(&load.impedance)
            .take(half)
            .filter_map(|(f, read)| {
                let omega = TAU * f;
                let one = |m: &Measured| m.at(std::slice::from_ref(f)).ok()?.first().copied();
                let g = Complex64::new(0.0, omega * open.standard.capacitance);
                let s = short.standard.impedance(omega);
                let found = open_short(*read, one(open)?, one(short)?, g, s);
                Some(found.norm() / load.standard.impedance(omega).norm())
            })
            .filter(|ratio| ratio.is_finite())
            .collect();
        let middle = ratios.len() / 2;
        if ratios.is_empty() {
            return Ok(());
        }
        let (_, median, _) = ratios.select_nth_unstable_by(middle, f64::total_cmp);
        if (1.0 / LOAD_OFF..=LOAD_OFF).contains(median) {
            return Ok(());
        }
        Err(Note::new(
            "standard_implausible",
            format!(
                "the load (`{}`) reads {median:.3} times what the station file states: is it the right standard, and was its contact good? Record it again, or correct the station file",
                load.name
            ),
        ))
    }
}

impl Standard {
    /// True impedance in Ω at an angular frequency: `R + jωL`, with `C` in parallel.
    fn impedance(&self, omega: f64) -> Complex64 {
        let series = Complex64::new(self.resistance, omega * self.inductance);
        if self.capacitance == 0.0 {
            return series;
        }
        let parallel = Complex64::new(0.0, omega * self.capacitance);
        series / (1.0 + series * parallel)
    }
}

/// Open, short and load, all defined: `(open admittance, short, load)`.
fn open_short_load(
    zm: Complex64,
    zo: Complex64,
    zs: Complex64,
    zl: Complex64,
    (g, s, l): (Complex64, Complex64, Complex64),
) -> Complex64 {
    // k of the cross-ratio (Z-S)/(Z-O) : (L-S)/(L-O), written with G = 1/O so that O may be ideal.
    let k = (zm - zs) * (zl - zo) * (l - s) / ((zm - zo) * (zl - zs));
    let d = l * g - 1.0;
    (s * d - k) / (d - k * g)
}

/// Open and short: a series arm, then a stray admittance `y` at the part.
///
/// The two standards give `(1 + y/g)(1 + y s) = (1/g - s)/(zo - zs)`; the root is the one that
/// stays when the short tends to zero.
fn open_short(
    zm: Complex64,
    zo: Complex64,
    zs: Complex64,
    g: Complex64,
    s: Complex64,
) -> Complex64 {
    let d = zo - zs;
    let b = 1.0 + s * g;
    let c = g - (1.0 - s * g) / d;
    let y = -2.0 * c / (b + (b * b - 4.0 * s * c).sqrt());
    let arm = zs - s / (1.0 + y * s);
    ((zm - arm).finv() - y).finv()
}

impl Measured {
    fn read(
        role: &str,
        files: &[RawFile],
        standard: &Standard,
        station: &Station,
    ) -> Result<Measured, Vec<Note>> {
        let name = &standard.sweep;
        let Some(raw) = files.iter().find(|file| file.name == *name) else {
            return Err(vec![Note::new(
                "standard_missing",
                format!(
                    "the sweep of the {role} standard, `{name}`, is not there: record it or correct the station file"
                ),
            )]);
        };
        let sweep = file::read_standard(raw, station).map_err(|notes| {
            notes
                .into_iter()
                .map(|note| {
                    Note::new(
                        &note.code,
                        format!("{role} standard, `{name}`: {}", note.text),
                    )
                })
                .collect::<Vec<_>>()
        })?;
        if let Some(note) = validity::unsteady(&sweep) {
            let text = format!("{role} standard, `{name}`: {}", note.text);
            return Err(vec![Note::new(&note.code, text)]);
        }
        Ok(Measured {
            name: name.clone(),
            position: sweep.frequency.iter().map(|f| f.ln()).collect(),
            frequency: sweep.frequency,
            impedance: sweep.impedance,
            as_admittance: role == "open",
            standard: standard.clone(),
        })
    }

    /// The reading on an ascending frequency list: the point itself where the lists agree,
    /// otherwise interpolated in ln f as `R, L` or `G, C`, which change slowly.
    fn at(&self, frequency: &[f64]) -> Result<Vec<Complex64>, Note> {
        let mut values = Vec::with_capacity(frequency.len());
        let mut upper = 0;
        for &f in frequency {
            while self
                .frequency
                .get(upper)
                .is_some_and(|&g| g < f * (1.0 - SAME))
            {
                upper += 1;
            }
            let value = match self.frequency.get(upper) {
                Some(&g) if g <= f * (1.0 + SAME) => self.impedance.get(upper).copied(),
                Some(_) if upper > 0 => self.between(upper - 1, f),
                _ => None,
            };
            values.push(value.ok_or_else(|| self.out_of_range(frequency))?);
        }
        Ok(values)
    }

    fn between(&self, lower: usize, frequency: f64) -> Option<Complex64> {
        let (p, q) = (self.position.get(lower)?, self.position.get(lower + 1)?);
        let weight = (frequency.ln() - p) / (q - p);
        let slow = |i: usize| {
            let z = *self.impedance.get(i)?;
            let value = if self.as_admittance { z.finv() } else { z };
            Some(Complex64::new(value.re, value.im / self.frequency.get(i)?))
        };
        let value = slow(lower)? * (1.0 - weight) + slow(lower + 1)? * weight;
        let value = Complex64::new(value.re, value.im * frequency);
        Some(if self.as_admittance {
            value.finv()
        } else {
            value
        })
    }

    fn out_of_range(&self, frequency: &[f64]) -> Note {
        let hertz = |f: Option<&f64>| super::faults::hertz(f.copied().unwrap_or(f64::NAN));
        Note::new(
            "compensation_range",
            format!(
                "the sweep runs from {} to {}, the standard `{}` only from {} to {}: record the standard over the whole range",
                hertz(frequency.first()),
                hertz(frequency.last()),
                self.name,
                hertz(self.frequency.first()),
                hertz(self.frequency.last()),
            ),
        )
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn standard(resistance: f64, inductance: f64, capacitance: f64) -> Standard {
        Standard {
            sweep: String::new(),
            resistance,
            inductance,
            capacitance,
        }
    }

    fn measured(
        as_admittance: bool,
        standard: Standard,
        frequency: &[f64],
        z: impl Fn(f64) -> Complex64,
    ) -> Measured {
        Measured {
            name: "x".to_owned(),
            frequency: frequency.to_vec(),
            position: frequency.iter().map(|f| f.ln()).collect(),
            impedance: frequency.iter().map(|&f| z(f)).collect(),
            as_admittance,
            standard,
        }
    }

    /// Chain matrix `[a b; c d]` in front of an impedance, given by its admittance where it is large.
    type Chain = [Complex64; 4];

    fn seen_z([a, b, c, d]: Chain, z: Complex64) -> Complex64 {
        (a * z + b) / (c * z + d)
    }

    fn seen_y([a, b, c, d]: Chain, y: Complex64) -> Complex64 {
        (a + b * y) / (c + d * y)
    }

    fn part(f: f64) -> Complex64 {
        let w = TAU * f;
        Complex64::new(4e-3, w * 0.5e-9 - 1.0 / (w * 4.7e-6))
    }

    fn grid() -> Vec<f64> {
        (0..=240)
            .map(|i| 1e3 * 10f64.powf(f64::from(i) / 50.0))
            .collect()
    }

    /// Embeds the part in the jig, compensates, and gives the largest relative error.
    fn law(
        jig: impl Fn(f64) -> Chain,
        open: Option<Standard>,
        short: Option<Standard>,
        load: Option<Standard>,
    ) -> f64 {
        let grid = grid();
        let seen = |s: &Standard, f: f64| seen_z(jig(f), s.impedance(TAU * f));
        let standards = Standards {
            open: open.map(|s| {
                let y = s.capacitance;
                measured(true, s, &grid, |f| {
                    seen_y(jig(f), Complex64::new(0.0, TAU * f * y))
                })
            }),
            short: short.map(|s| measured(false, s.clone(), &grid, |f| seen(&s, f))),
            load: load.map(|s| measured(false, s.clone(), &grid, |f| seen(&s, f))),
        };
        let sweep = Sweep {
            impedance: grid.iter().map(|&f| seen_z(jig(f), part(f))).collect(),
            frequency: grid,
            level: None,
        };
        let found = standards.apply(sweep).expect("compensated");
        let error = |(f, z): (&f64, &Complex64)| ((z - part(*f)) / part(*f)).norm();
        found
            .frequency
            .iter()
            .zip(&found.impedance)
            .map(error)
            .fold(0.0, f64::max)
    }

    fn arm_and_stray(r: f64, l: f64, g: f64, c: f64) -> impl Fn(f64) -> Chain {
        move |f| {
            let w = TAU * f;
            let (z, y) = (Complex64::new(r, w * l), Complex64::new(g, w * c));
            [1.0 + z * y, z, y, Complex64::new(1.0, 0.0)]
        }
    }

    proptest! {
        #[test]
        fn embedding_and_compensating_is_the_identity(
            r in 0.0..2.0f64, l in 0.0..20e-9f64, g in 0.0..1e-6f64, c in 1e-13..5e-12f64,
            sr in 0.0..1e-3f64, sl in 0.0..1e-9f64, oc in 0.0..2e-13f64, lr in 0.5..100.0f64, ll in 0.0..1e-9f64,
        ) {
            let jig = arm_and_stray(r, l, g, c);
            let short = standard(sr, sl, 0.0);
            let open = standard(0.0, 0.0, oc);
            let load = standard(lr, ll, 5e-14);
            prop_assert!(law(&jig, Some(open.clone()), Some(short.clone()), None) < 1e-6);
            prop_assert!(law(&jig, Some(open.clone()), Some(short.clone()), Some(load.clone())) < 1e-6);
            prop_assert!(law(arm_and_stray(r, l, 0.0, 0.0), None, Some(short.clone()), None) < 1e-9);
            prop_assert!(law(arm_and_stray(0.0, 0.0, g, c), Some(open.clone()), None, None) < 1e-9);
            // Any linear two-port: the stray first, then the arm, with a transformer before it.
            let other = move |f: f64| {
                let w = TAU * f;
                let (z, y) = (Complex64::new(r + 0.01, w * l), Complex64::new(g, w * c));
                [Complex64::new(1.3, 0.0), 1.3 * z, y / 1.3, (1.0 + z * y) / 1.3]
            };
            prop_assert!(law(other, Some(open), Some(short), Some(load)) < 1e-6);
        }
    }

    #[test]
    fn a_short_taken_as_zero_moves_the_resonance() {
        // The point of defining the short: its inductance is missing from every part.
        let jig = arm_and_stray(0.1, 5e-9, 0.0, 1e-12);
        let short = standard(0.12e-3, 0.15e-9, 0.0);
        let grid = grid();
        let lie = Standards {
            open: None,
            short: Some(measured(false, standard(0.0, 0.0, 0.0), &grid, |f| {
                seen_z(jig(f), short.impedance(TAU * f))
            })),
            load: None,
        };
        let sweep = Sweep {
            impedance: grid.iter().map(|&f| seen_z(jig(f), part(f))).collect(),
            frequency: grid,
            level: None,
        };
        let found = lie.apply(sweep).expect("compensated");
        let crossing = |z: &[Complex64]| z.iter().position(|z| z.im > 0.0).expect("resonance");
        let truth: Vec<Complex64> = found.frequency.iter().map(|&f| part(f)).collect();
        let decades = (crossing(&found.impedance) - crossing(&truth)) as f64 / 50.0;
        // sqrt(0.50 / 0.35) = 1.195
        assert!((10f64.powf(decades) - 1.195).abs() < 0.06, "{decades}");
    }

    #[test]
    fn standards_are_not_extrapolated() {
        let short = measured(false, standard(0.0, 0.0, 0.0), &[1e3, 1e4, 1e5], |_| {
            Complex64::new(0.1, 0.0)
        });
        assert!(short.at(&[1e3, 2e3, 1e5]).is_ok());
        assert_eq!(
            short.at(&[999.0, 2e3]).expect_err("below").code,
            "compensation_range"
        );
        assert_eq!(
            short.at(&[1e3, 1.1e5]).expect_err("above").code,
            "compensation_range"
        );
    }
}
