//! A sweep as its file has it, before any measurement method is applied.

use super::network::Network;
use num_complex::Complex64;

/// Points in file order with the line each of them stands in.
#[derive(Debug, Clone)]
pub(super) struct RawSweep {
    /// Hz, as written.
    pub frequency: Vec<f64>,
    /// 1-based line of each point.
    pub lines: Vec<u32>,
    pub measured: Measured,
}

/// What the instrument delivered at each point.
#[derive(Debug, Clone)]
pub(super) enum Measured {
    /// Ω
    Impedance(Vec<Complex64>),
    /// Two voltage channels in V; peak values where `peak`.
    Channels {
        a: Vec<Complex64>,
        b: Vec<Complex64>,
        peak: bool,
    },
    /// B over A.
    Ratio(Vec<Complex64>),
    /// Network parameters of a Touchstone file.
    Network(Network),
}

impl Measured {
    /// In words, for a fault: what the file holds.
    pub fn words(&self) -> &'static str {
        match self {
            Measured::Impedance(_) => "the impedance itself",
            Measured::Channels { .. } => "two voltage channels",
            Measured::Ratio(_) => "the ratio of two channels",
            Measured::Network(network) if network.ports == 1 => "one-port network parameters",
            Measured::Network(_) => "multi-port network parameters",
        }
    }

    /// Puts the points into the given order.
    pub fn reorder(&mut self, order: &[usize]) {
        match self {
            Measured::Impedance(z) | Measured::Ratio(z) => *z = pick(z, order),
            Measured::Channels { a, b, .. } => {
                *a = pick(a, order);
                *b = pick(b, order);
            }
            Measured::Network(network) => {
                let size = network.ports * network.ports;
                let blocks: Vec<&[Complex64]> = network.values.chunks(size.max(1)).collect();
                network.values = order
                    .iter()
                    .filter_map(|&i| blocks.get(i))
                    .flat_map(|block| block.iter().copied())
                    .collect();
                network.frequency = pick(&network.frequency, order);
            }
        }
    }

    /// Whether two points hold the same values.
    pub fn same(&self, i: usize, j: usize) -> bool {
        match self {
            Measured::Impedance(z) | Measured::Ratio(z) => z.get(i) == z.get(j),
            Measured::Channels { a, b, .. } => a.get(i) == a.get(j) && b.get(i) == b.get(j),
            Measured::Network(network) => network.at(i) == network.at(j),
        }
    }
}

pub(super) fn pick<T: Copy>(values: &[T], order: &[usize]) -> Vec<T> {
    order
        .iter()
        .filter_map(|&i| values.get(i).copied())
        .collect()
}
