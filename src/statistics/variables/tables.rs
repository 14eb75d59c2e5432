//! MIL-STD-414 Tables B-1 (k) and B-3 (M, percent): variability unknown, standard deviation method,
//! normal inspection.
//!
//! Columns are the AQLs 0.040 to 10 and 15, the last for reduced inspection; `N` where the table has an arrow down, to the next larger
//! sample of the column. The tables stand here from memory of the standard; each pair of k and M
//! agrees with the identity between the two forms within their printed digits. The row of 35 items
//! is also that of ISO 3951:1989 letter J (OIML R 138:2007 Annex A).

/// No plan: arrow down.
pub(super) const N: f64 = f64::NAN;

pub(super) const COLUMNS: usize = 14;

/// The column of [`AQL_SERIES`](crate::statistics::sampling::AQL_SERIES) with which the tables
/// begin, AQL 0.040.
pub(super) const FIRST_COLUMN: usize = 3;

/// A sample size with its acceptability constants and its largest estimated percentages nonconforming.
pub(super) struct Row {
    pub n: u64,
    pub k: [f64; COLUMNS],
    pub m: [f64; COLUMNS],
}

/// The plans of 20 and 30 items belong to reduced inspection alone: normal inspection takes the larger
/// of the two sizes that MIL-STD-414 has where the code letters of ISO 2859-1 have one.
pub(super) const REDUCED_ONLY: [u64; 2] = [20, 30];

/// Sample sizes of reduced inspection.
pub(super) const REDUCED: [u64; 11] = [3, 4, 5, 7, 10, 15, 20, 25, 30, 50, 75];

#[rustfmt::skip]
pub(super) const ROWS: [Row; 15] = [
    Row {
        n: 3,
        k: [    N,     N,     N,     N,     N,     N,     N,     N,     N,  1.12, 0.958, 0.765, 0.566, 0.341],
        m: [    N,     N,     N,     N,     N,     N,     N,     N,     N,  7.59, 18.86, 26.94, 33.69, 40.47],
    },
    Row {
        n: 4,
        k: [    N,     N,     N,     N,     N,     N,     N,  1.45,  1.34,  1.17,  1.01, 0.814, 0.617, 0.393],
        m: [    N,     N,     N,     N,     N,     N,     N,  1.53,   5.5, 10.92, 16.45, 22.86, 29.45,  36.9],
    },
    Row {
        n: 5,
        k: [    N,     N,     N,     N,     N,     N,  1.65,  1.53,   1.4,  1.24,  1.07, 0.874, 0.675, 0.455],
        m: [    N,     N,     N,     N,     N,     N,  1.33,  3.32,  5.83,   9.8, 14.39, 20.19, 26.56, 33.99],
    },
    Row {
        n: 7,
        k: [    N,     N,     N,     N,   2.0,  1.88,  1.75,  1.62,   1.5,  1.33,  1.15, 0.955, 0.755, 0.536],
        m: [    N,     N,     N,     N, 0.422,  1.06,  2.14,  3.55,  5.35,   8.4,  12.2, 17.35, 23.29,  30.5],
    },
    Row {
        n: 10,
        k: [    N,     N,     N,  2.24,  2.11,  1.98,  1.84,  1.72,  1.58,  1.41,  1.23,  1.03, 0.828, 0.611],
        m: [    N,     N,     N, 0.349, 0.716,   1.3,  2.17,  3.26,  4.77,  7.29, 10.54, 15.17, 20.74, 27.57],
    },
    Row {
        n: 15,
        k: [ 2.64,  2.53,  2.42,  2.32,   2.2,  2.06,  1.91,  1.79,  1.65,  1.47,   1.3,  1.09, 0.886, 0.664],
        m: [0.099, 0.186, 0.312, 0.503, 0.818,  1.31,  2.11,  3.05,  4.31,  6.56,  9.46, 13.71, 18.94, 25.61],
    },
    Row {
        n: 20,
        k: [ 2.69,  2.58,  2.47,  2.36,  2.24,  2.11,  1.96,  1.82,  1.69,  1.51,  1.33,  1.12, 0.917, 0.695],
        m: [0.135, 0.228, 0.365, 0.544, 0.846,  1.29,  2.05,  2.95,  4.09,  6.17,  8.92, 12.99, 18.03, 24.53],
    },
    Row {
        n: 25,
        k: [ 2.72,  2.61,   2.5,   2.4,  2.26,  2.14,  1.98,  1.85,  1.72,  1.53,  1.35,  1.14, 0.936, 0.712],
        m: [0.155,  0.25,  0.38, 0.551, 0.877,  1.29,   2.0,  2.86,  3.97,  5.97,  8.63, 12.57, 17.51, 23.97],
    },
    Row {
        n: 30,
        k: [ 2.73,  2.61,  2.51,  2.41,  2.28,  2.15,   2.0,  1.86,  1.73,  1.55,  1.36,  1.15, 0.946, 0.723],
        m: [0.179,  0.28, 0.413, 0.581, 0.879,  1.29,  1.98,  2.83,  3.91,  5.86,  8.47, 12.36, 17.24, 23.58],
    },
    Row {
        n: 35,
        k: [ 2.77,  2.65,  2.54,  2.45,  2.31,  2.18,  2.03,  1.89,  1.76,  1.57,  1.39,  1.18, 0.969, 0.745],
        m: [ 0.17, 0.264, 0.388, 0.535, 0.847,  1.23,  1.87,  2.68,   3.7,  5.57,   8.1, 11.87, 16.65, 22.91],
    },
    Row {
        n: 50,
        k: [ 2.83,  2.71,   2.6,   2.5,  2.35,  2.22,  2.08,  1.93,   1.8,  1.61,  1.42,  1.21,   1.0, 0.774],
        m: [0.163,  0.25, 0.363, 0.503, 0.789,  1.17,  1.71,  2.49,  3.45,   5.2,  7.61, 11.23, 15.87,  22.0],
    },
    Row {
        n: 75,
        k: [  2.9,  2.77,  2.66,  2.55,  2.41,  2.27,  2.12,  1.98,  1.84,  1.65,  1.46,  1.24,  1.03, 0.804],
        m: [0.147, 0.228,  0.33, 0.467,  0.72,  1.07,   1.6,  2.29,   3.2,  4.87,  7.15, 10.63, 15.13, 21.11],
    },
    Row {
        n: 100,
        k: [ 2.92,   2.8,  2.69,  2.58,  2.43,  2.29,  2.14,   2.0,  1.86,  1.67,  1.48,  1.26,  1.05, 0.819],
        m: [0.145,  0.22, 0.317, 0.447, 0.689,  1.02,  1.53,   2.2,  3.07,  4.69,  6.91, 10.32, 14.75, 20.66],
    },
    Row {
        n: 150,
        k: [ 2.96,  2.84,  2.73,  2.61,  2.47,  2.33,  2.18,  2.03,  1.89,   1.7,  1.51,  1.29,  1.07, 0.841],
        m: [0.134, 0.203, 0.293, 0.413, 0.638, 0.949,  1.43,  2.05,  2.89,  4.43,  6.57,  9.88,  14.2, 20.02],
    },
    Row {
        n: 200,
        k: [ 2.97,  2.85,  2.73,  2.62,  2.47,  2.33,  2.18,  2.04,  1.89,   1.7,  1.51,  1.29,  1.07, 0.845],
        m: [0.135, 0.204, 0.294, 0.414, 0.637, 0.945,  1.42,  2.04,  2.87,   4.4,  6.53,  9.81, 14.12, 19.92],
    },
];
