"""Checks against the outside that `cargo test` makes: where they are."""

from .page import Section

LINES = [
    ("Touchstone, every file that the scikit-rf package ships: S, and Z up to 10 MΩ", "scikit-rf", "S 1e-12; Z 1e-10, growing with Z over 50 Ω, as the conversion loses digits", "sweep_touchstone_scikit_rf.rs"),
    ("impedance of two-channel and Touchstone sweeps, point by point", "ngspice, scikit-rf; the networks' exact impedance", "digits of the files", "sweep_reference.rs"),
    ("readings of clean sweeps of six parts", "networks evaluated with 50 digits (mpmath)", "1e-5 (SRF) to 3e-4 (ESR minimum)", "readings_truth.rs"),
    ("readings of noisy sweeps, and their stated uncertainty", "the same networks; Cramér-Rao bound", "2.25 times the bound", "readings_accuracy.rs"),
    ("uncertainty budgets", "Monte-Carlo method, JCGM 101:2008", "as stated there", "readings_uncertainty.rs"),
    ("distribution functions", "mpmath with 50 digits, exact rationals", "1e-12, far tails 1e-10", "statistics/distributions.rs"),
    ("tables 1 and 2-A to 2-C, every cell", "ISO 2859-1:1999; sources in the reference files", "none may differ", "statistics/sampling.rs"),
    ("table 2-C: three columns as printed, its diagonals, and the gaps of MIL-STD-105E Table II-C", "reprints of NTE INEN-ISO 2859-1 and of MIL-STD-105E", "none may differ", "statistics/sampling.rs"),
    ("n, k, M by variables, normal, tightened and reduced; worked examples of one limit and of two", "MIL-STD-414 tables B-1, B-3 and examples B-1 to B-3; ISO 3951-1, 15.2; samples of ANSI/ASQ Z1.9 Table B-4", "none may differ; M of Z1.9, which recalculated it, within 4 %", "statistics/variables.rs"),
    ("severity of inspection, lot by lot", "sequences over ISO 2859-1:1999, 9.3 and 9.4, from an independent state machine", "none may differ", "lot_history.rs"),
    ("100 000 lots judged part by part; 100 000 samples by count and by variables", "the operating characteristic that the record states; the laws", "4 standard errors", "lot_simulation.rs"),
    ("operating characteristics and their inverses", "scipy; NIST/SEMATECH e-Handbook 6.2.3.2", "1e-10; printed digits", "statistics/operating_characteristic.rs"),
    ("mean, s of nine data sets", "NIST StRD, certified values", "1e-14 and what double precision can hold of the data", "statistics/summary.rs"),
    ("capability and its bounds", "NIST/SEMATECH e-Handbook 6.1.6; scipy", "1e-9", "statistics/capability.rs"),
    ("Grubbs, generalized ESD, modified z", "NIST/SEMATECH e-Handbook 1.3.5.17; Rosner 1983", "printed digits", "statistics/outliers.rs"),
    ("Anderson-Darling", "scipy; published tables", "1e-7", "statistics/normality.rs"),
    ("quantities, tolerance letters, E series", "SI Brochure, IEC 60062, IEC 60063, GUM", "none may differ", "quantity.rs"),
    ("labels", "ISO/IEC 15434, ANSI MH10.8.2", "none may differ", "label.rs"),
    ("Merkle tree", "RFC 6962 and RFC 9162 with their reference vectors; the `ct-merkle` library", "none may differ", "ledger/merkle.rs"),
    ("PDF lot records: structure, fonts, text", "qpdf, poppler", "none may complain", "certificate/structure.rs"),
    ("JSON Schemas of the files", "the `jsonschema` validator", "none may differ", "limits/schema.rs"),
]


def section():
    lines = [(what, source, allowed, f"[tests/{file}](../tests/{file})") for what, source, allowed, file in LINES]
    return Section(
        "Checked by `cargo test`", "Comparisons with the outside that need the inside of the program. Each fails the run where a difference is larger than allowed.",
        head=("what", "against", "allowed", "where"), lines=lines,
    )
