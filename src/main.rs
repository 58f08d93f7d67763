//! The program: all of it lives in the library.

use std::process::ExitCode;

fn main() -> ExitCode {
    ExitCode::from(binrail::cli::run(std::env::args_os()))
}
