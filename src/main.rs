//! The command-line program; see [`bifilar::cli`].

use std::process::ExitCode;

fn main() -> ExitCode {
    bifilar::cli::run(std::env::args_os())
}
