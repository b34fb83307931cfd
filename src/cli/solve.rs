//! `solve`: everything in a circuit at one frequency.

use crate::cli::options::{CommonArgs, typed_value};
use crate::cli::output;
use crate::cli::report::{self, Ending, Stop};
use crate::diag::Diagnostic;
use crate::render::{Format, SolvedPage, renderer};
use crate::study::Solution;
use crate::study::grid;
use crate::study::point;
use clap::Args;

/// Solve a circuit at one frequency
///
/// Shows node voltages, every element's drop, current and power, the power balance and the
/// readings. With `--at 0Hz`, windings are short and capacitors open.
///
/// Example: bifilar solve charger.bfl --at 85kHz --read "volts(bus)"
#[derive(Args, Debug)]
pub struct SolveArgs {
    #[command(flatten)]
    common: CommonArgs,
    /// The frequency, as in `--at 85kHz`
    #[arg(long, value_name = "FREQUENCY", value_parser = typed_value, allow_hyphen_values = true)]
    at: Option<String>,
}

/// Runs the command.
pub fn run(typed: &SolveArgs) -> Result<Ending, Stop> {
    let Some(at) = &typed.at else {
        let wrong = Diagnostic::error("`solve` has to know the frequency");
        let help = "add one, as in `--at 85kHz`; `sweep` solves over a band of frequencies";
        return Err(Stop::wrong(wrong.help(help)));
    };
    let mut common = typed.common.open()?;
    let frequency_hz = common.frequency("--at", at)?;
    let frequency_hz = grid::given(&[frequency_hz])
        .map_err(|wrong| common.stop(Diagnostic::error(format!("`--at {at}`: {wrong}"))))?[0];
    let (circuit, found) = common.program.circuit();
    let Some(circuit) = circuit else {
        return Err(Stop::Wrong(found, common.program.sources));
    };
    let solution = point::solve(&circuit, frequency_hz)
        .map_err(|error| Stop::study(error, &common.program.sources))?;

    let format = common.format.unwrap_or(Format::Table);
    let page = SolvedPage {
        circuit: &common.circuit_name,
        title: circuit.title.as_deref(),
        solution: &solution,
    };
    let mut out = Vec::new();
    renderer(format, common.style).solution(&page, &mut out);
    output::write_all(&out)?;
    Ok(remark(&solution, format, common.style.peak))
}

/// Says beside the output what does not stand in it.
fn remark(solution: &Solution, format: Format, peak: bool) -> Ending {
    if format == Format::Csv && peak {
        report::note("volts and amperes are amplitudes (peak); powers are means");
    }
    // JSON has the notes too, but who reads it with a program may not show them to anybody.
    solution.notes.iter().for_each(|text| report::note(text));
    let missed = solution.readings.iter().filter(|reading| !reading.missed.is_empty());
    let mut ending = Ending::Done;
    for reading in missed {
        ending = Ending::LimitMissed;
        // The table shows it already.
        if format != Format::Table {
            report::missed(&format!("{}: {}", reading.name, reading.missed.join(", ")));
        }
    }
    ending
}
