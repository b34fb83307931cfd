//! `compare`: two circuits over a band, or proved alike at every frequency.

use crate::circuit::Circuit;
use crate::circuit::program::{Call, Program};
use crate::cli::band::{self, BandArgs};
use crate::cli::input::{self, Text};
use crate::cli::options::CommonArgs;
use crate::cli::output;
use crate::cli::report::{self, Ending, Stop};
use crate::cli::swap::HowArgs;
use crate::diag::{Diagnostic, Severity};
use crate::render::compare::ComparePage;
use crate::render::{Format, renderer};
use crate::study::compare::{self, Plan};
use crate::study::pair::{Correspondence, Matching};
use crate::study::prove::{self, Verdict};
use crate::swap;
use clap::Args;
use std::path::{Path, PathBuf};

/// Compare two circuits over a band of frequencies
///
/// Quantities are matched by the names of nodes, elements and readings; what only one circuit has
/// is listed. Differences are relative to the larger of both values, or to 1e-9 of the largest
/// value of the same kind at that frequency. The edges of the bands over which all differences are
/// within the limit are bisected, not read off the list of frequencies.
///
/// With `--prove` it is also decided whether the circuits agree at every frequency above zero.
/// Exit code 1: not within the limit, or not proved identical.
///
/// Example: bifilar compare charger.bfl --into tee --from 1kHz --to 1MHz --prove
///
/// Example: bifilar compare charger.bfl by_hand.bfl --from 1kHz --to 1MHz --within 1%
#[derive(Args, Debug)]
pub struct CompareArgs {
    #[command(flatten)]
    common: CommonArgs,
    /// The other circuit
    #[arg(value_name = "OTHER")]
    other: Option<PathBuf>,
    #[command(flatten)]
    how: Option<HowArgs>,
    #[command(flatten)]
    band: BandArgs,
    /// The largest relative difference allowed
    #[arg(long, value_name = "RATIO", default_value = "1e-9", value_parser = ratio)]
    within: f64,
    /// Also decide whether they agree at every frequency above zero
    #[arg(long)]
    prove: bool,
    /// Repeat the random draws of an earlier proof
    #[arg(long, value_name = "N", requires = "prove")]
    seed: Option<u64>,
}

fn ratio(text: &str) -> Result<f64, String> {
    let (digits, unit) = match text.strip_suffix('%') {
        Some(percent) => (percent.trim_end(), 0.01),
        None => (text, 1.0),
    };
    match digits.parse::<f64>().map(|ratio| ratio * unit) {
        Ok(ratio) if ratio >= 0.0 && ratio.is_finite() => Ok(ratio),
        _ => Err("give a ratio, as in 1e-6 or 1%".to_owned()),
    }
}

/// Runs the command.
pub fn run(typed: &CompareArgs) -> Result<Ending, Stop> {
    if typed.other.is_some() == typed.how.is_some() {
        let wrong = Diagnostic::error("`compare` needs one thing to compare with");
        return Err(Stop::wrong(
            wrong.help("give a second file, or `--into KIND` for the circuit's own twin"),
        ));
    }
    band::judge("compare", &typed.band).map_err(Stop::wrong)?;
    let mut common = typed.common.open()?;
    let plan = Plan {
        frequencies_hz: band::frequencies(&typed.band, band::USUAL_PER_DECADE, &mut common)?,
        band: typed.band.at.is_none(),
        within: typed.within,
    };
    let (circuit, found) = common.program.circuit();
    let Some(first) = circuit else { return Err(Stop::Wrong(found, common.program.sources)) };
    let (second, same, second_name) = match (&typed.other, &typed.how) {
        (Some(other), _) => {
            let second = open(other)?;
            let same = Correspondence::by_names(&first, &second);
            (second, same, input::short_name(other))
        }
        (None, Some(how)) => {
            let twin = swap::twin(&first, &how.options())
                .map_err(|e| Stop::Wrong(vec![e.diagnostic()], common.program.sources.clone()))?;
            twin.warnings.iter().for_each(|warning| report::note(warning));
            let same = Correspondence::by_twin(&twin);
            (twin.circuit, same, format!("its {} twin", how.into))
        }
        (None, None) => unreachable!("one of the two was asked for above"),
    };
    let matching = Matching::new(&first, &second, &same);
    let mut comparison = compare::run(&first, &second, &matching.matched, &plan)
        .map_err(|error| Stop::study(error, &common.program.sources))?;
    comparison.unmatched = matching.unmatched;
    if typed.prove {
        let options =
            prove::Options { seed: typed.seed, frequencies_hz: plan.frequencies_hz.clone() };
        comparison.proof = Some(prove::decide(&first, &second, &matching.matched, &options));
    }
    let format = common.format.unwrap_or(Format::Table);
    let page =
        ComparePage { first: &common.circuit_name, second: &second_name, comparison: &comparison };
    let mut out = Vec::new();
    renderer(format, common.style).comparison(&page, &mut out);
    output::write_all(&out)?;
    if format != Format::Json {
        comparison.notes.iter().for_each(|text| report::note(text));
    }
    let proved = comparison
        .proof
        .as_ref()
        .is_none_or(|proof| matches!(proof.verdict, Verdict::Identical { .. }));
    Ok(if comparison.pass && proved { Ending::Done } else { Ending::Different })
}

/// Reads the other circuit.
fn open(file: &Path) -> Result<Circuit, Stop> {
    let Text { name, text, folder } = input::read(file).map_err(Stop::wrong)?;
    let (program, found) = Program::load(&name, text, &folder, &Call::default(), &input::load);
    if found.iter().any(|d| d.severity == Severity::Error) {
        return Err(Stop::Wrong(found, program.sources));
    }
    let (circuit, found) = program.circuit();
    circuit.ok_or(Stop::Wrong(found, program.sources))
}
