//! `swap`: the circuit with its couplings replaced, as a text that reads back.

use crate::circuit::Circuit;
use crate::circuit::print::Printer;
use crate::circuit::program::{Call, Program};
use crate::cli::input::{self, Text};
use crate::cli::options::{assignment, typed_value};
use crate::cli::output;
use crate::cli::report::{self, Ending, Stop};
use crate::diag::Severity;
use crate::swap::{self, Kind, Options, Ratio, Series, Twin};
use clap::Args;
use std::path::PathBuf;

/// Write a circuit with its couplings replaced by an uncoupled equivalent
///
/// The twin comes as a circuit text on standard output, with comments that say what was replaced,
/// what allowed it and by which formulas. Every value is a formula of the values given, so the twin
/// is exact. What must be known before it is built goes to standard error.
///
/// Kinds: tee and pi for two windings with a common node (islands are joined where no current can
/// notice it, else an ideal transformer is added); mesh for any number; leakage (inductances and
/// ideal transformers) and dependent (dependent sources) for any number, always, islands kept apart.
///
/// Example: bifilar swap charger.bfl --into tee | bifilar check -
#[derive(Args, Debug)]
pub struct SwapArgs {
    /// The circuit; `-` is standard input
    #[arg(value_name = "FILE")]
    file: PathBuf,
    /// Give a `let` of the circuit another value, as in `--set k=0.2`
    #[arg(long, value_name = "NAME=VALUE", value_parser = assignment, allow_hyphen_values = true)]
    set: Vec<(String, String)>,
    /// One more reading to be carried over
    #[arg(long, value_name = "EXPR", value_parser = typed_value, allow_hyphen_values = true)]
    read: Vec<String>,
    /// tee, pi, mesh, leakage or dependent
    #[arg(long, value_name = "KIND")]
    into: Kind,
    #[command(flatten)]
    how: HowArgs,
    /// Add a table of the sets, their legs and what could be bought, as comments
    #[arg(long)]
    explain: bool,
}

/// How couplings are replaced.
#[derive(Args, Debug)]
pub struct HowArgs {
    /// Replace only the set of these windings, as in `--only dock,buoy`
    #[arg(long, value_name = "WINDINGS", value_delimiter = ',')]
    only: Vec<String>,
    /// Join islands at these two nodes, as in `--tie gnd,keel`
    #[arg(long, value_name = "NODES", value_parser = two_nodes, conflicts_with = "keep_isolation")]
    tie: Option<(String, String)>,
    /// Never join islands; add an ideal 1:1 transformer instead
    #[arg(long)]
    keep_isolation: bool,
    /// Put an ideal transformer of this ratio before the second winding; `auto`: no negative leg
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    ratio: Option<Ratio>,
    /// Round the legs to preferred values, as in `--round E24`
    #[arg(long, value_name = "SERIES")]
    round: Option<Series>,
    /// Leave a leg out
    #[arg(long, value_name = "LEG", value_delimiter = ',')]
    drop: Vec<String>,
}

impl HowArgs {
    /// What was typed, for the library.
    pub fn options(&self, into: Kind) -> Options {
        Options {
            into,
            only: self.only.iter().map(|name| name.trim().to_owned()).collect(),
            tie: self.tie.clone(),
            keep_isolation: self.keep_isolation,
            ratio: self.ratio,
            round: self.round,
            drop: self.drop.iter().map(|name| name.trim().to_owned()).collect(),
        }
    }
}

fn two_nodes(text: &str) -> Result<(String, String), String> {
    match text.split_once(',') {
        Some((a, b)) if !a.trim().is_empty() && !b.trim().is_empty() => {
            Ok((a.trim().to_owned(), b.trim().to_owned()))
        }
        _ => Err("write two nodes, as in gnd,keel".to_owned()),
    }
}

/// Runs the command.
pub fn run(typed: &SwapArgs) -> Result<Ending, Stop> {
    let Text { name, text, folder } = input::read(&typed.file).map_err(Stop::wrong)?;
    let call = Call { set: typed.set.clone(), reads: typed.read.clone() };
    let (program, found) = Program::load(&name, text, &folder, &call, &input::load);
    if found.iter().any(|d| d.severity == Severity::Error) {
        return Err(Stop::Wrong(found, program.sources));
    }
    let (circuit, found) = program.circuit();
    let Some(circuit) = circuit else { return Err(Stop::Wrong(found, program.sources)) };
    let twin = swap::twin(&circuit, &typed.how.options(typed.into))
        .map_err(|error| Stop::Wrong(vec![error.diagnostic()], program.sources.clone()))?;
    let head = head(&input::short_name(&typed.file), &circuit, &twin, typed.explain);
    output::write_all(Printer::new(&twin.circuit).text(&head).as_bytes())?;
    twin.warnings.iter().for_each(|warning| report::note(warning));
    Ok(Ending::Done)
}

/// The comment lines at the head of the twin.
fn head(name: &str, circuit: &Circuit, twin: &Twin, explain: bool) -> Vec<String> {
    let mut lines = vec![format!("Twin of {name}:")];
    if explain {
        lines.extend(swap::explain(circuit, twin));
    } else {
        lines.extend(twin.records.iter().flat_map(swap::summary));
    }
    lines.extend(twin.warnings.iter().map(|warning| format!("Note: {warning}.")));
    lines.push(String::new());
    lines
}
