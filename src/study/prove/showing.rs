//! The frequency at which a difference shows best, by the numeric path.

use crate::circuit::Circuit;
use crate::quantity::Dimension;
use crate::study::Value;
use crate::study::grid::{Spacing, band};
use crate::study::pair::{Matched, Pair};

/// Steps of the golden-section search between two points of the list.
const STEPS: usize = 30;

/// One over the golden ratio.
const GOLDEN: f64 = 0.618_033_988_749_894_9;

/// A difference at one frequency.
#[derive(Clone, Debug, PartialEq)]
pub struct Showing {
    /// The quantity that is furthest apart.
    pub quantity: String,
    /// Its dimension.
    pub dimension: Dimension,
    /// Where, in hertz.
    pub frequency_hz: f64,
    /// In the first circuit.
    pub first: Value,
    /// In the second circuit.
    pub second: Value,
    /// |first − second| over the larger of both, or over the floor.
    pub relative: f64,
    /// The difference is larger than the error bounds of both solutions.
    pub beyond_error: bool,
}

/// Looks for the largest difference: through the list, then around its largest.
pub(super) fn find(
    first: &Circuit,
    second: &Circuit,
    matched: &[Matched],
    frequencies_hz: &[f64],
) -> Option<Showing> {
    let wide = || band(1.0, 1e9, Spacing::PerDecade(20)).unwrap_or_default();
    let list = if frequencies_hz.is_empty() { wide() } else { frequencies_hz.to_vec() };
    let list: Vec<f64> = list.into_iter().filter(|&f| f > 0.0).collect();
    let mut pair = Pair::new(first, second, matched);
    let mut at = |f| largest(&mut pair, matched, f);
    let found: Vec<_> = list.iter().map(|&f| at(f)).collect();
    let size = |s: &Option<Showing>| s.as_ref().map_or(-1.0, |s| s.relative);
    let best = (0..found.len()).max_by(|&a, &b| size(&found[a]).total_cmp(&size(&found[b])))?;
    let (low, high) = (list[best.saturating_sub(1)], list[(best + 1).min(list.len() - 1)]);
    let mut top = found.into_iter().nth(best).flatten();
    if frequencies_hz.is_empty() || frequencies_hz.len() > 2 {
        let refined = climb(low, high, &mut at);
        if size(&refined) > size(&top) {
            top = refined;
        }
    }
    top.filter(|showing| showing.relative > 0.0)
}

/// Golden-section search for the largest difference between two frequencies.
fn climb(low: f64, high: f64, at: &mut impl FnMut(f64) -> Option<Showing>) -> Option<Showing> {
    let (mut low, mut high) = (low.ln(), high.ln());
    let mut best: Option<Showing> = None;
    let mut take = |x: f64| {
        let found = at(x.exp());
        let size = found.as_ref().map_or(-1.0, |s| s.relative);
        if best.as_ref().is_none_or(|b| size > b.relative) && found.is_some() {
            best = found;
        }
        size
    };
    let (mut a, mut b) = (high - GOLDEN * (high - low), low + GOLDEN * (high - low));
    let (mut at_a, mut at_b) = (take(a), take(b));
    for _ in 0..STEPS {
        if at_a > at_b {
            (high, b, at_b) = (b, a, at_a);
            a = high - GOLDEN * (high - low);
            at_a = take(a);
        } else {
            (low, a, at_a) = (a, b, at_b);
            b = low + GOLDEN * (high - low);
            at_b = take(b);
        }
    }
    best
}

/// The largest difference at one frequency; nothing where a circuit has no solution.
fn largest(pair: &mut Pair, matched: &[Matched], frequency_hz: f64) -> Option<Showing> {
    let reading = pair.at(frequency_hz).ok()?;
    let pairs = matched.iter().zip(&reading.apart);
    let known = pairs.filter_map(|(matched, apart)| Some((matched, (*apart)?)));
    let (matched, apart) = known.max_by(|a, b| a.1.relative.total_cmp(&b.1.relative))?;
    Some(Showing {
        quantity: matched.name.clone(),
        dimension: matched.dimension,
        frequency_hz,
        first: apart.first,
        second: apart.second,
        relative: apart.relative,
        beyond_error: apart.beyond(0.0),
    })
}
