//! The options that say at which frequencies to solve: what was typed, and the list it means.

use crate::cli::options::{Common, typed_value};
use crate::cli::report::Stop;
use crate::diag::Diagnostic;
use crate::study::grid::{self, GridError, Spacing};
use clap::Args;

/// Points in a decade where nothing else is said.
pub const USUAL_PER_DECADE: usize = 100;

/// A band or a list, as typed.
#[derive(Args, Debug)]
pub struct BandArgs {
    /// Where the band begins
    #[arg(long, value_name = "FREQUENCY", value_parser = typed_value, allow_hyphen_values = true)]
    pub from: Option<String>,
    /// Where the band ends
    #[arg(long, value_name = "FREQUENCY", value_parser = typed_value, allow_hyphen_values = true)]
    pub to: Option<String>,
    /// Points in every factor of ten (100 if nothing else is said)
    #[arg(long, value_name = "N", conflicts_with = "points")]
    pub per_decade: Option<usize>,
    /// Points in the whole band
    #[arg(long, value_name = "N")]
    pub points: Option<usize>,
    /// Equal distances instead of equal ratios
    #[arg(long, requires = "points")]
    pub linear: bool,
    /// Single frequencies, as in `--at 50Hz,150Hz,250Hz`
    #[arg(long, value_name = "LIST", value_parser = typed_value, allow_hyphen_values = true,
          conflicts_with_all = ["from", "to", "per_decade", "points"])]
    pub at: Option<String>,
}

/// Refuses a call that names no band before the file is even read.
pub fn judge(command: &str, typed: &BandArgs) -> Result<(), Diagnostic> {
    let missing = match (&typed.at, &typed.from, &typed.to) {
        (Some(_), _, _) | (None, Some(_), Some(_)) => return Ok(()),
        (None, Some(_), None) => "`--from` needs a `--to`: where does the band end?".to_owned(),
        (None, None, Some(_)) => "`--to` needs a `--from`: where does the band begin?".to_owned(),
        (None, None, None) => format!("`{command}` has to know the frequencies"),
    };
    let help = "as in `--from 10kHz --to 1MHz --per-decade 200`, or `--at 50Hz,150Hz`";
    Err(Diagnostic::error(missing).help(help))
}

/// Splits a list at its commas, but not inside brackets.
fn items(list: &str) -> Vec<&str> {
    let (mut depth, mut start, mut found) = (0usize, 0, Vec::new());
    for (i, letter) in list.char_indices() {
        match letter {
            '(' | '[' => depth += 1,
            ')' | ']' => depth = depth.saturating_sub(1),
            ',' if depth == 0 => {
                found.push(list[start..i].trim());
                start = i + 1;
            }
            _ => {}
        }
    }
    found.push(list[start..].trim());
    found
}

fn grid_error(error: GridError, option: &str) -> Diagnostic {
    let diagnostic = Diagnostic::error(format!("`{option}`: {error}"));
    match error {
        GridError::ZeroStart => diagnostic.help("`--points N --linear` spaces the points evenly"),
        GridError::TooMany => diagnostic.help("ask for fewer points, or split the band"),
        _ => diagnostic,
    }
}

/// The frequencies in hertz; `usual` points in a decade where no number was typed.
pub fn frequencies(typed: &BandArgs, usual: usize, common: &mut Common) -> Result<Vec<f64>, Stop> {
    if let Some(list) = &typed.at {
        let texts = items(list);
        if texts.iter().any(|text| text.is_empty()) {
            let wrong = Diagnostic::error(format!("`--at {list}`: a frequency is missing"));
            return Err(common.stop(wrong.help("write one between every two commas")));
        }
        let values: Result<Vec<_>, _> =
            texts.iter().map(|text| common.frequency("--at", text)).collect();
        return grid::given(&values?).map_err(|e| common.stop(grid_error(e, "--at")));
    }
    let [from, to] = [&typed.from, &typed.to].map(|text| text.as_deref().unwrap_or_default());
    let from_hz = common.frequency("--from", from)?;
    let to_hz = common.frequency("--to", to)?;
    let spacing = match (typed.points, typed.linear) {
        (Some(points), true) => Spacing::Linear(points),
        (Some(points), false) => Spacing::Logarithmic(points),
        (None, _) => Spacing::PerDecade(typed.per_decade.unwrap_or(usual)),
    };
    let option = match spacing {
        Spacing::PerDecade(n) => format!("--from {from} --to {to} --per-decade {n}"),
        Spacing::Linear(n) => format!("--from {from} --to {to} --points {n} --linear"),
        Spacing::Logarithmic(n) => format!("--from {from} --to {to} --points {n}"),
    };
    grid::band(from_hz, to_hz, spacing).map_err(|e| common.stop(grid_error(e, &option)))
}

#[cfg(test)]
mod tests {
    use crate::cli::band::items;

    #[test]
    fn a_list_is_split_at_commas_outside_brackets() {
        assert_eq!(items("50Hz, max(1kHz, 2kHz) ,3kHz"), ["50Hz", "max(1kHz, 2kHz)", "3kHz"]);
        assert_eq!(items("50Hz,"), ["50Hz", ""]);
    }
}
