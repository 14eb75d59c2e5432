//! Parse the arguments, run one command, turn the outcome into an exit status.
#![forbid(unsafe_code)]

fn main() {}
