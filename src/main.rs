//! Runs one command and turns its outcome into an exit code.

use std::process::ExitCode;

fn main() -> ExitCode {
    let (mut out, mut err) = (anstream::stdout(), anstream::stderr());
    ExitCode::from(reelgate::commands::run(
        std::env::args_os(),
        &mut out,
        &mut err,
    ))
}
