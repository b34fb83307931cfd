//! `compare`: two circuits over a band, or proved alike at every frequency.

use crate::circuit::Circuit;
use crate::circuit::program::{Call, Program};
use crate::cli::band::{self, BandArgs};
use crate::cli::input::{self, Text};
use crate::cli::options::{Common, CommonArgs};
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
/// OTHER is a second file; with `--into` it is the circuit's own twin. Quantities are matched by the names of nodes, elements and readings; what only one circuit has
/// is listed. Differences are relative to the larger of both values, or to 1e-9 of the largest
/// value of the same kind at that frequency. The edges of the bands over which all differences are
/// within the limit are bisected, not read off the list of frequencies.
///
/// With `--prove` it is also decided whether the circuits agree at every frequency above zero.
/// Exit code 1: not within the limit, or not proved identical.
///
/// Example: bifilar compare charger.bfl --into tee --from 1kHz --to 1MHz --prove
///
/// Example: bifilar compare charger.bfl by_hand.bfl --from 1kHz --to 1MHz --prove
#[derive(Args, Debug)]
pub struct CompareArgs {
    #[command(flatten)]
    common: CommonArgs,
    /// The other circuit
    #[arg(value_name = "OTHER", conflicts_with = "into")]
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
    match digits.parse::<f64>().map(|digits| digits * unit) {
        Ok(ratio) if ratio >= 0.0 && ratio.is_finite() => Ok(ratio),
        _ => Err("give a ratio, as in 1e-6 or 2%".to_owned()),
    }
}

/// Runs the command.
pub fn run(typed: &CompareArgs) -> Result<Ending, Stop> {
    if typed.other.is_none() && typed.how.is_none() {
        let wrong = Diagnostic::error("`compare` has to know what to compare with");
        let help = "give a second file, or `--into tee` for the circuit's own twin";
        return Err(Stop::wrong(wrong.help(help)));
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
    let Other { name, circuit: second, same } = match (&typed.other, &typed.how) {
        (Some(file), _) => open(file, &first)?,
        (None, Some(how)) => twin(how, &first, &common)?,
        (None, None) => unreachable!("refused above"),
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
    let page = ComparePage { first: &common.circuit_name, second: &name, comparison: &comparison };
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

/// What the circuit is compared with.
struct Other {
    name: String,
    circuit: Circuit,
    same: Correspondence,
}

/// Reads the other circuit.
fn open(file: &Path, first: &Circuit) -> Result<Other, Stop> {
    let Text { name, text, folder } = input::read(file).map_err(Stop::wrong)?;
    let (program, found) = Program::load(&name, text, &folder, &Call::default(), &input::load);
    if found.iter().any(|d| d.severity == Severity::Error) {
        return Err(Stop::Wrong(found, program.sources));
    }
    let (circuit, found) = program.circuit();
    let circuit = circuit.ok_or(Stop::Wrong(found, program.sources))?;
    let same = Correspondence::by_names(first, &circuit);
    Ok(Other { name: input::short_name(file), circuit, same })
}

/// Makes the twin.
fn twin(how: &HowArgs, first: &Circuit, common: &Common) -> Result<Other, Stop> {
    let options = how.options();
    let twin = swap::twin(first, &options).map_err(|error| common.stop(error.diagnostic()))?;
    twin.warnings.iter().for_each(|warning| report::note(warning));
    let same = Correspondence::of_twin(&twin);
    Ok(Other { name: format!("its {}", options.into), circuit: twin.circuit, same })
}
