//! `sweep`: the readings over a band of frequencies and ranges of parameters.

mod plan;
mod rows;

use crate::cli::band::{self, BandArgs};
use crate::cli::options::CommonArgs;
use crate::cli::report::{Ending, Stop};
use crate::diag::Diagnostic;
use crate::render::{Format, renderer};
use crate::study::sweep;
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
}

/// Runs the command.
pub fn run(typed: &SweepArgs) -> Result<Ending, Stop> {
    band::judge("sweep", &typed.band).map_err(Stop::wrong)?;
    let mut common = typed.common.open()?;
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
    );
    let swept = sweep::run(&mut common.program, &plan, &mut |event| rows.take(event));
    let ending = rows.finish();
    swept.map_err(|error| Stop::study(error, &common.program.sources))?;
    ending
}
