//! The program `tubewright`: hands its arguments to the library.
//! Must not do anything else.
//! Main function: `main`.

use std::process::ExitCode;

fn main() -> ExitCode {
    tubewright::cli::run()
}
