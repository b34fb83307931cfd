//! `check`: reads and judges a circuit without solving it.

use crate::circuit::Circuit;
use crate::circuit::island::{Islands, Regime};
use crate::circuit::judge::tied_nodes;
use crate::cli::options::CommonArgs;
use crate::cli::output;
use crate::cli::report::{Ending, Stop};
use crate::diag::{Diagnostic, Severity};
use crate::render::check::{CheckPage, Counts};
use crate::render::{Format, renderer};
use crate::study::explain;
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
    let islands = Islands::find(circuit, Regime::Alternating);
    // `gnd` is always there, also where no element touches it.
    let used = tied_nodes(circuit);
    Counts {
        nodes: used.iter().filter(|used| **used).count(),
        elements: circuit.elements.len(),
        couplings: circuit.couplings.len(),
        islands: islands.reference.iter().filter(|node| used[node.index()]).count(),
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
    // Loops of sources and the like show without solving.
    let mut unsolvable = false;
    if let Some(circuit) = &circuit {
        let islands = Islands::find(circuit, Regime::Alternating);
        let graph = explain::graph(circuit, &islands, Regime::Alternating);
        unsolvable = !graph.is_empty();
        found.extend(graph);
    }
    let format = typed.common.format().unwrap_or(Format::Table);
    match format == Format::Table {
        true if wrong => return Err(Stop::Wrong(found, program.sources)),
        true if unsolvable => return Err(Stop::NoSolution(found, program.sources)),
        _ => {}
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
    Ok(match (wrong, unsolvable) {
        (true, _) => Ending::Refused,
        (false, true) => Ending::Unsolvable,
        (false, false) => Ending::Done,
    })
}
