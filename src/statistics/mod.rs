//! Pure mathematics of lot decisions: sampling tables, capability, outliers.
//! Knows nothing of capacitors, files or verdicts.
