//! The `windage` program: parse, run, exit code.

use std::process::ExitCode;

fn main() -> ExitCode {
    windage::cli::main()
}
