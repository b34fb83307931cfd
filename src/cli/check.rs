//! `check`: reads and judges a circuit without solving it.

use crate::circuit::Circuit;
use crate::circuit::island::{Islands, Regime};
use crate::cli::options::CommonArgs;
use crate::cli::output;
use crate::cli::report::{Ending, Stop};
use crate::diag::{Diagnostic, Severity};
use crate::render::check::{CheckPage, Counts};
use crate::render::{Format, renderer};
use clap::Args;

/// Read and judge a circuit without solving it
///
/// Errors go to standard error; what is merely worth knowing comes with a summary on standard
/// output.
///
/// Example: bifilar check charger.bfl
#[derive(Args, Debug)]
pub struct CheckArgs {
    #[command(flatten)]
    common: CommonArgs,
}

fn counts(circuit: &Circuit) -> Counts {
    Counts {
        nodes: circuit.nodes.len(),
        elements: circuit.elements.len(),
        couplings: circuit.couplings.len(),
        islands: Islands::find(circuit, Regime::Alternating).reference.len(),
    }
}

/// Runs the command.
pub fn run(typed: &CheckArgs) -> Result<Ending, Stop> {
    let (program, circuit_name, mut found) = typed.common.parse()?;
    let is_wrong = |d: &Diagnostic| d.severity == Severity::Error;
    let mut circuit = None;
    if !found.iter().any(is_wrong) {
        let (judged, more) = program.circuit();
        circuit = judged;
        found.extend(more);
    }
    let wrong = circuit.is_none() || found.iter().any(is_wrong);
    let format = typed.common.format().unwrap_or(Format::Table);
    if wrong && format == Format::Table {
        return Err(Stop::Wrong(found, program.sources));
    }
    let page = CheckPage {
        circuit: &circuit_name,
        title: circuit.as_ref().and_then(|c| c.title.as_deref()),
        counts: circuit.as_ref().map(counts),
        diagnostics: &found,
        sources: &program.sources,
    };
    let mut out = Vec::new();
    renderer(format, typed.common.style()).check(&page, &mut out);
    output::write_all(&out)?;
    Ok(if wrong { Ending::Refused } else { Ending::Done })
}
