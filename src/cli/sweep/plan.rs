//! What a sweep's options mean: values of parameters, over a band.

use crate::cli::band;
use crate::cli::options::{Common, assignment, typed_value};
use crate::cli::report::Stop;
use crate::cli::sweep::SweepArgs;
use crate::diag::Diagnostic;
use crate::quantity::Dimension;
use crate::study::adaptive::{self, Axis, Refine};
use crate::study::grid::MOST_POINTS;
use crate::study::sweep::{Plan, Vary};

/// Points in a decade that a refined sweep starts from.
const COARSE_PER_DECADE: usize = 2;

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

/// How finely to sweep, where `--refine` asks for it.
pub fn refine(typed: &SweepArgs, common: &mut Common) -> Result<Option<Refine>, Stop> {
    /// Below this, lines would have to be straighter than the results are known.
    const LEAST_TOLERANCE: f64 = 1e-8;
    const LARGEST_TOLERANCE: f64 = 0.5;
    if !typed.refine {
        return Ok(None);
    }
    let mut tolerance = adaptive::USUAL_TOLERANCE;
    if let Some(text) = &typed.tolerance {
        let option = "--tolerance";
        let (value, dimension) =
            common.program.constant(option, text).map_err(|wrong| common.stop(wrong))?;
        let plain = dimension == Dimension::NONE;
        if !plain || !(LEAST_TOLERANCE..=LARGEST_TOLERANCE).contains(&value) {
            let words = format!(
                "`{option} {text}`: a tolerance is a part of the reading, from 1e-8 to one half"
            );
            let help = "as in `--tolerance 0.1%`";
            return Err(common.stop(Diagnostic::error(words).help(help)));
        }
        tolerance = value;
    }
    let axis = if typed.band.linear { Axis::Linear } else { Axis::Logarithmic };
    let most = typed.most.map_or(adaptive::USUAL_MOST, |most| most as usize);
    Ok(Some(Refine { tolerance, most, axis }))
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
    let usual = if typed.refine { COARSE_PER_DECADE } else { band::USUAL_PER_DECADE };
    let frequencies_hz = band::frequencies(&typed.band, usual, common)?;
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
    use crate::cli::sweep::plan::typed_range;

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
