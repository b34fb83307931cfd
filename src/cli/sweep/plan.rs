//! What a sweep's options mean: frequencies, and values of parameters.

use crate::cli::options::{Common, assignment, typed_value};
use crate::cli::report::Stop;
use crate::cli::sweep::SweepArgs;
use crate::diag::Diagnostic;
use crate::study::grid::{self, GridError, MOST_POINTS, Spacing};
use crate::study::sweep::{Plan, Vary};

/// Points in a decade where nothing else is said.
const USUAL_PER_DECADE: usize = 100;

/// `name=a..b:n` as typed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct TypedRange {
    name: String,
    from: String,
    to: String,
    count: usize,
}

/// Takes `name=a..b:n`.
pub fn typed_range(text: &str) -> Result<TypedRange, String> {
    let shape = || "write name=first..last:count, as in k=0.1..0.3:21".to_owned();
    let (name, range) =
        typed_value(text).and_then(|text| assignment(&text)).map_err(|_| shape())?;
    let (ends, count) = range.rsplit_once(':').ok_or_else(shape)?;
    let (from, to) = ends.split_once("..").ok_or_else(shape)?;
    if from.trim().is_empty() || to.trim().is_empty() {
        return Err(shape());
    }
    let count = count.trim();
    let count: usize =
        count.parse().map_err(|_| format!("`{count}` is no count of values: {}", shape()))?;
    match count {
        0 => Err("at least one value is needed".to_owned()),
        _ => Ok(TypedRange { name, from: from.trim().into(), to: to.trim().into(), count }),
    }
}

/// Refuses a call that names no band before the file is even read.
pub fn judge_band(typed: &SweepArgs) -> Result<(), Diagnostic> {
    let missing = match (&typed.at, &typed.from, &typed.to) {
        (Some(_), _, _) | (None, Some(_), Some(_)) => return Ok(()),
        (None, Some(_), None) => "`--from` needs a `--to`: where does the band end?",
        (None, None, Some(_)) => "`--to` needs a `--from`: where does the band begin?",
        (None, None, None) => "`sweep` has to know the frequencies",
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

fn frequencies(typed: &SweepArgs, common: &mut Common) -> Result<Vec<f64>, Stop> {
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
        (None, _) => Spacing::PerDecade(typed.per_decade.unwrap_or(USUAL_PER_DECADE)),
    };
    let option = match spacing {
        Spacing::PerDecade(n) => format!("--from {from} --to {to} --per-decade {n}"),
        Spacing::Linear(n) => format!("--from {from} --to {to} --points {n} --linear"),
        Spacing::Logarithmic(n) => format!("--from {from} --to {to} --points {n}"),
    };
    grid::band(from_hz, to_hz, spacing).map_err(|e| common.stop(grid_error(e, &option)))
}

fn vary(range: &TypedRange, common: &mut Common) -> Result<Vary, Stop> {
    let option = "--vary";
    let mut end = |text: &str| {
        let found = common.program.constant(option, text);
        found.map_err(|wrong| common.stop(wrong))
    };
    let ((from, dimension), (to, other)) = (end(&range.from)?, end(&range.to)?);
    if dimension != other {
        let words = format!(
            "`{option} {}`: `{}` and `{}` are not of one kind",
            range.name, range.from, range.to
        );
        let help = "give both ends with their unit, as in `L=200uH..300uH:11`";
        return Err(common.stop(Diagnostic::error(words).help(help)));
    }
    Ok(Vary { name: range.name.clone(), from, to, count: range.count, dimension })
}

/// What to sweep, in plain numbers.
pub fn plan(typed: &SweepArgs, common: &mut Common) -> Result<Plan, Stop> {
    for (i, range) in typed.vary.iter().enumerate() {
        let name = &range.name;
        let twice = typed.vary[..i].iter().any(|other| other.name == *name);
        if twice || common.set_names.contains(name) {
            let with = if twice { "twice by `--vary`" } else { "by `--set` and by `--vary`" };
            return Err(common.stop(Diagnostic::error(format!("`{name}` is given {with}"))));
        }
    }
    let frequencies_hz = frequencies(typed, common)?;
    let counts = typed.vary.iter().map(|range| range.count);
    let rows = counts.fold(frequencies_hz.len(), usize::saturating_mul);
    if rows > MOST_POINTS {
        let words = format!("this sweep would have more than {MOST_POINTS} rows");
        let help = "ask for fewer frequencies or fewer values to vary";
        return Err(common.stop(Diagnostic::error(words).help(help)));
    }
    let vary: Result<_, _> = typed.vary.iter().map(|range| vary(range, common)).collect();
    Ok(Plan { frequencies_hz, vary: vary? })
}

#[cfg(test)]
mod tests {
    use crate::cli::sweep::plan::{items, typed_range};

    #[test]
    fn a_list_is_split_at_commas_outside_brackets() {
        assert_eq!(items("50Hz, max(1kHz, 2kHz) ,3kHz"), ["50Hz", "max(1kHz, 2kHz)", "3kHz"]);
        assert_eq!(items("50Hz,"), ["50Hz", ""]);
    }

    #[test]
    fn a_range_has_a_name_two_ends_and_a_count() {
        let range = typed_range("L = 200uH .. 300uH : 11").unwrap();
        assert_eq!((range.name.as_str(), range.count), ("L", 11));
        assert_eq!((range.from.as_str(), range.to.as_str()), ("200uH", "300uH"));
        for wrong in ["", "L", "L=1..2", "L=1:3", "L=..2:3", "L=1..:3", "=1..2:3", "L=1..2:x"] {
            assert!(typed_range(wrong).unwrap_err().contains("first..last:count"), "{wrong}");
        }
        assert!(typed_range("L=1..2:0").unwrap_err().contains("at least one"));
    }
}
