//! The operator's run, driven as at a bench: the real program, a watched folder, a scanner that types.
//!
//! Nothing here depends on how long anything takes: a test waits for what it wants to see, and fails only when that
//! does not come in two minutes.

mod checks;
mod plain;
mod scan;
mod screen;
mod site;
