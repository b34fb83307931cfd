//! `sweep`: the readings over a band of frequencies and ranges of parameters.

mod plan;
mod rows;

use crate::cli::band::{self, BandArgs};
use crate::cli::options::{CommonArgs, typed_value};
use crate::cli::report::{Ending, Stop};
use crate::diag::Diagnostic;
use crate::render::{Format, renderer};
use crate::study::{adaptive, sweep};
use clap::Args;
use std::io::{self, IsTerminal};

/// Solve a circuit over a band of frequencies
///
/// Prints the readings, one row a frequency: a table at a terminal, CSV into a pipe, or one JSON
/// object a line with `--as json`. With `--vary`, the band is swept for each value of a `let`;
/// several nest, the first outermost.
///
/// Example: bifilar sweep charger.bfl --from 10kHz --to 1MHz --per-decade 200
///
/// Example: bifilar sweep charger.bfl --at 85kHz --vary k=0.1..0.3:21
///
/// With `--refine`, points are chosen by the response: dense where a reading bends, one on every
/// peak, few elsewhere.
///
/// Example: bifilar sweep charger.bfl --from 10kHz --to 1MHz --refine
#[derive(Args, Debug)]
pub struct SweepArgs {
    #[command(flatten)]
    common: CommonArgs,
    #[command(flatten)]
    band: BandArgs,
    /// Values for a `let`, evenly spaced, as in `--vary L=200uH..300uH:11`
    #[arg(long, value_name = "NAME=A..B:N", value_parser = plan::typed_range,
          allow_hyphen_values = true)]
    vary: Vec<plan::TypedRange>,
    /// Add points until lines drawn from row to row are within the tolerance
    #[arg(long, conflicts_with = "at")]
    refine: bool,
    /// Largest error of such a line, as a part of the reading (0.1% if nothing else is said)
    #[arg(long, value_name = "PART", value_parser = typed_value, requires = "refine")]
    tolerance: Option<String>,
    /// Most rows of a refined band (20000 if nothing else is said)
    #[arg(long, value_name = "N", requires = "refine",
          value_parser = clap::value_parser!(u32).range(2..=10_000_000))]
    most: Option<u32>,
    /// Say on standard error how the frequencies were solved
    #[arg(long)]
    verbose: bool,
}

/// Runs the command.
pub fn run(typed: &SweepArgs) -> Result<Ending, Stop> {
    band::judge("sweep", &typed.band).map_err(Stop::wrong)?;
    let mut common = typed.common.open()?;
    let refine = plan::refine(typed, &mut common)?;
    let plan = plan::plan(typed, &mut common)?;
    let (circuit, found) = common.program.circuit();
    let Some(circuit) = circuit else {
        return Err(Stop::Wrong(found, common.program.sources));
    };
    if circuit.reads.is_empty() {
        let wrong = Diagnostic::error("there is nothing to sweep: the circuit has no reading");
        let help = "add one here, as in `--read \"volts(bus)\"`, or a `read` line to the circuit";
        return Err(common.stop(wrong.help(help)));
    }
    drop(circuit);

    let terminal = io::stdout().is_terminal();
    let default = if terminal { Format::Table } else { Format::Csv };
    let format = common.format.unwrap_or(default);
    let mut rows = rows::Rows::new(
        renderer(format, common.style),
        common.style.peak && format != Format::Json,
        typed.verbose,
    );
    let mut sink = |event: sweep::Event| rows.take(event);
    let swept = match &refine {
        Some(refine) => adaptive::run(&mut common.program, &plan, refine, &mut sink),
        None => sweep::run(&mut common.program, &plan, &mut sink),
    };
    let ending = rows.finish(&common.program.sources);
    swept.map_err(|error| Stop::study(error, &common.program.sources))?;
    ending
}
