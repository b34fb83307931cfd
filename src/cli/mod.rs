//! The command line: what can be typed, and which command runs. One file per command: it reads,
//! calls the library and renders; only `report` prints diagnostics and chooses exit codes.

mod band;
mod check;
mod compare;
mod input;
mod options;
mod output;
mod report;
mod solve;
mod swap;
mod sweep;

use clap::{Parser, Subcommand};
use std::ffi::OsString;
use std::process::ExitCode;

/// Solves AC networks with coupled windings.
///
/// A circuit is a text file (.bfl); `-` reads it from standard input.
/// Exit codes: 0 done, 1 a limit was missed or circuits differ, 2 the circuit or the call is wrong,
/// 3 there is no solution that could be trusted.
#[derive(Parser)]
#[command(name = "bifilar", version, max_term_width = 80, subcommand_required = true)]
struct Cli {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    Check(check::CheckArgs),
    Compare(compare::CompareArgs),
    Solve(solve::SolveArgs),
    Sweep(sweep::SweepArgs),
    Swap(swap::SwapArgs),
}

/// Runs the program with these arguments, the first being its own name.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> ExitCode {
    let cli = match Cli::try_parse_from(arguments) {
        Ok(cli) => cli,
        Err(usage) => return report::usage(&usage),
    };
    let outcome = match cli.command {
        Command::Check(typed) => check::run(&typed),
        Command::Compare(typed) => compare::run(&typed),
        Command::Solve(typed) => solve::run(&typed),
        Command::Sweep(typed) => sweep::run(&typed),
        Command::Swap(typed) => swap::run(&typed),
    };
    report::finish(outcome)
}

#[cfg(test)]
mod tests {
    use crate::cli::Cli;
    use clap::{CommandFactory, Parser};

    #[test]
    fn the_command_line_is_consistent() {
        Cli::command().debug_assert();
    }

    fn refused(arguments: &[&str]) -> String {
        match Cli::try_parse_from([&["bifilar"], arguments].concat()) {
            Ok(_) => panic!("{arguments:?} is taken"),
            Err(error) => error.to_string(),
        }
    }

    #[test]
    fn values_that_make_no_sense_are_refused_when_typed() {
        assert!(refused(&["solve", "a.bfl", "--at", "--peak"]).contains("value is missing"));
        assert!(refused(&["solve", "a.bfl", "--set", "k"]).contains("name=value"));
        assert!(refused(&["solve", "a.bfl", "--digits", "0"]).contains("1..=17"));
        assert!(refused(&["solve", "a.bfl", "--digits", "18"]).contains("1..=17"));
        let both = refused(&["sweep", "a.bfl", "--per-decade", "5", "--points", "5"]);
        assert!(both.contains("cannot be used with"), "{both}");
        assert!(refused(&["sweep", "a.bfl", "--linear"]).contains("--points"));
    }

    #[test]
    fn a_value_may_begin_with_a_minus() {
        let typed = ["bifilar", "solve", "-", "--at", "-5kHz", "--read", "-re(power(load))"];
        assert!(Cli::try_parse_from(typed).is_ok());
    }
}
