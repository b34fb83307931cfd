//! Two circuits across a band: where they differ most, and in which bands they agree.

use crate::circuit::Circuit;
use crate::quantity::Dimension;
use crate::study::pair::{Apart, Matched, Pair, Reading, Unsolved};
use crate::study::prove::Proof;
use crate::study::{StudyError, Value};

/// Edges of bands are found to this ratio of their frequencies.
const EDGE: f64 = 1e-6;

/// Steps of the search for a peak between two points of the list.
const PEAK_STEPS: usize = 24;

/// A peak is looked for where a listed difference comes this close to the limit.
const NEAR: f64 = 30.0;

/// One over the golden ratio.
const GOLDEN: f64 = 0.618_033_988_749_894_9;

/// What to compare.
#[derive(Clone, Debug, PartialEq)]
pub struct Plan {
    /// Frequencies in hertz; ascending where they stand for a band.
    pub frequencies_hz: Vec<f64>,
    /// They stand for the band from the first to the last: look between them too.
    pub band: bool,
    /// The largest relative difference allowed.
    pub within: f64,
}

/// The worst of one quantity.
#[derive(Clone, Debug, PartialEq)]
pub struct Worst {
    /// Its name.
    pub quantity: String,
    /// Its dimension.
    pub dimension: Dimension,
    /// Where, in hertz.
    pub frequency_hz: f64,
    /// |first − second| over the larger of both, or over the floor.
    pub relative: f64,
    /// In the first circuit.
    pub first: Value,
    /// In the second circuit.
    pub second: Value,
    /// It holds at every frequency looked at.
    pub pass: bool,
}

/// A band over which the comparison passes or fails throughout; one frequency in a list.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Band {
    /// Where it begins, in hertz.
    pub from_hz: f64,
    /// Where it ends, in hertz.
    pub to_hz: f64,
    /// All quantities are within the limit.
    pub pass: bool,
}

/// The result of a comparison.
#[derive(Clone, Debug, PartialEq)]
pub struct Comparison {
    /// The largest relative difference allowed.
    pub within: f64,
    /// Everything holds everywhere it was looked.
    pub pass: bool,
    /// The worst of each quantity that has a value, in the order matched.
    pub quantities: Vec<Worst>,
    /// Index of the quantity that is furthest apart.
    pub worst: Option<usize>,
    /// The bands, ascending, without gaps where the frequencies stand for a band.
    pub bands: Vec<Band>,
    /// What only one circuit has, in words.
    pub unmatched: Vec<String>,
    /// What the reader should know.
    pub notes: Vec<String>,
    /// The verdict for all frequencies, if one was asked for.
    pub proof: Option<Proof>,
}

struct Work<'c> {
    pair: Pair<'c>,
    matched: &'c [Matched],
    within: f64,
    worst: Vec<Option<(f64, Apart)>>,
    failed: Vec<bool>,
    /// Frequencies at which one of the circuits has no solution: the second, if true.
    unsolved: Vec<(f64, bool)>,
    neither: Vec<f64>,
    uncertain: bool,
}

/// Compares two circuits. Fails where a value does not exist, or neither can be solved anywhere.
pub fn run(
    first: &Circuit,
    second: &Circuit,
    matched: &[Matched],
    plan: &Plan,
) -> Result<Comparison, StudyError> {
    let mut work = Work {
        pair: Pair::new(first, second, matched),
        matched,
        within: plan.within,
        worst: vec![None; matched.len()],
        failed: vec![false; matched.len()],
        unsolved: Vec::new(),
        neither: Vec::new(),
        uncertain: false,
    };
    let mut sizes = Vec::with_capacity(plan.frequencies_hz.len());
    let mut no_solution = None;
    for &f in &plan.frequencies_hz {
        match work.size(f) {
            Ok(size) => sizes.push((f, size)),
            Err(error @ StudyError::Refused(_)) => return Err(error),
            Err(error) => no_solution = Some(error),
        }
    }
    if let (true, Some(error)) = (sizes.is_empty(), no_solution) {
        return Err(error);
    }
    let bands = match plan.band {
        true => work.bands(&sizes)?,
        false => {
            sizes.iter().map(|&(f, s)| Band { from_hz: f, to_hz: f, pass: s <= 1.0 }).collect()
        }
    };
    Ok(work.finish(bands))
}

impl Work<'_> {
    /// The largest difference at a frequency over the limit, as far as it is certain; more than 1
    /// fails. Infinite where only one circuit has a solution; an error where neither has.
    fn size(&mut self, f: f64) -> Result<f64, StudyError> {
        match self.pair.at(f) {
            Ok(reading) => Ok(self.take(f, &reading)),
            Err(Unsolved { first, second }) => {
                for error in [&first, &second].into_iter().flatten() {
                    if matches!(error, StudyError::Refused(_)) {
                        return Err(error.clone());
                    }
                }
                match (first, second) {
                    (Some(error), Some(_)) => {
                        self.neither.push(f);
                        Err(error)
                    }
                    (first, _) => {
                        self.unsolved.push((f, first.is_none()));
                        Ok(f64::INFINITY)
                    }
                }
            }
        }
    }

    /// As [`Work::size`]; frequencies at which neither circuit has a solution do not count.
    fn size_or_none(&mut self, f: f64) -> Result<f64, StudyError> {
        match self.size(f) {
            Err(StudyError::NoSolution(_)) => Ok(0.0),
            found => found,
        }
    }

    fn take(&mut self, f: f64, reading: &Reading) -> f64 {
        let mut largest = 0.0f64;
        for (i, apart) in reading.apart.iter().enumerate() {
            let Some(apart) = apart else { continue };
            let fails = apart.beyond(self.within);
            self.failed[i] |= fails;
            self.uncertain |= !fails && apart.relative + apart.uncertain > self.within;
            if self.worst[i].is_none_or(|(_, worst)| apart.relative > worst.relative) {
                self.worst[i] = Some((f, *apart));
            }
            largest = largest.max((apart.relative - apart.uncertain).max(0.0));
        }
        // A limit of zero still passes what is equal.
        if largest <= self.within {
            (largest / self.within).min(1.0)
        } else {
            largest / self.within
        }
    }

    /// The bands between the frequencies listed: each change from pass to fail is closed in, and
    /// so are peaks and dips that a list can step over.
    fn bands(&mut self, listed: &[(f64, f64)]) -> Result<Vec<Band>, StudyError> {
        let mut points: Vec<(f64, f64)> = Vec::with_capacity(listed.len());
        for i in 0..listed.len() {
            points.push(listed[i]);
            if i == 0 || i + 1 >= listed.len() {
                continue;
            }
            let [left, here, right] = [listed[i - 1], listed[i], listed[i + 1]];
            let pass = here.1 <= 1.0;
            let peak = pass && here.1 >= left.1.max(right.1) && here.1 * NEAR > 1.0;
            let dip = !pass && here.1 <= left.1.min(right.1) && here.1 < NEAR;
            if here.0 > 0.0 && left.0 > 0.0 && (peak || dip) {
                let found = self.extreme(left.0, right.0, peak)?;
                if (found.1 <= 1.0) != pass {
                    points.push(found);
                }
            }
        }
        points.sort_by(|a, b| a.0.total_cmp(&b.0));
        self.sharpen_worst(listed)?;
        let Some(&(start, size)) = points.first() else { return Ok(Vec::new()) };
        let mut bands = vec![Band { from_hz: start, to_hz: start, pass: size <= 1.0 }];
        for pair in points.windows(2) {
            let (low, high) = (pair[0], pair[1]);
            let last = bands.len() - 1;
            if (low.1 <= 1.0) != (high.1 <= 1.0) {
                let edge = self.edge(low.0, high.0, low.1 <= 1.0)?;
                bands[last].to_hz = edge;
                bands.push(Band { from_hz: edge, to_hz: high.0, pass: high.1 <= 1.0 });
            } else {
                bands[last].to_hz = high.0;
            }
        }
        Ok(bands)
    }

    /// Bisection between a frequency that passes and one that fails.
    fn edge(&mut self, mut low: f64, mut high: f64, low_passes: bool) -> Result<f64, StudyError> {
        while high - low > EDGE * high {
            let middle = if low > 0.0 { (low * high).sqrt() } else { 0.5 * high };
            if middle <= low || middle >= high || middle < f64::MIN_POSITIVE {
                break;
            }
            match (self.size_or_none(middle)? <= 1.0) == low_passes {
                true => low = middle,
                false => high = middle,
            }
        }
        Ok(if low > 0.0 { (low * high).sqrt() } else { high })
    }

    /// Golden-section search for the largest (or smallest) difference between two frequencies.
    fn extreme(&mut self, low: f64, high: f64, largest: bool) -> Result<(f64, f64), StudyError> {
        let (mut low, mut high) = (low.ln(), high.ln());
        let sign = if largest { 1.0 } else { -1.0 };
        let mut best = (0.0, -f64::INFINITY);
        let mut at = |work: &mut Self, x: f64| -> Result<f64, StudyError> {
            let size = sign * work.size_or_none(x.exp())?;
            if size > best.1 {
                best = (x.exp(), size);
            }
            Ok(size)
        };
        let (mut a, mut b) = (high - GOLDEN * (high - low), low + GOLDEN * (high - low));
        let (mut at_a, mut at_b) = (at(self, a)?, at(self, b)?);
        for _ in 0..PEAK_STEPS {
            if at_a > at_b {
                (high, b, at_b) = (b, a, at_a);
                a = high - GOLDEN * (high - low);
                at_a = at(self, a)?;
            } else {
                (low, a, at_a) = (a, b, at_b);
                b = low + GOLDEN * (high - low);
                at_b = at(self, b)?;
            }
        }
        Ok((best.0, sign * best.1))
    }

    /// The worst listed difference is rarely the top of its peak.
    fn sharpen_worst(&mut self, listed: &[(f64, f64)]) -> Result<(), StudyError> {
        let finite = |size: f64| if size.is_finite() { size } else { -1.0 };
        let top = (1..listed.len().max(2) - 1)
            .max_by(|&a, &b| finite(listed[a].1).total_cmp(&finite(listed[b].1)));
        if let Some(i) = top
            && listed[i - 1].0 > 0.0
            && finite(listed[i].1) > 0.0
        {
            self.extreme(listed[i - 1].0, listed[i + 1].0, true)?;
        }
        Ok(())
    }

    fn finish(self, bands: Vec<Band>) -> Comparison {
        let mut notes = self.notes();
        let mut quantities = Vec::new();
        for ((matched, worst), failed) in self.matched.iter().zip(&self.worst).zip(&self.failed) {
            let Some((frequency_hz, apart)) = *worst else {
                notes.push(format!("`{}` has no value in one of the circuits", matched.name));
                continue;
            };
            quantities.push(Worst {
                quantity: matched.name.clone(),
                dimension: matched.dimension,
                frequency_hz,
                relative: apart.relative,
                first: apart.first,
                second: apart.second,
                pass: !failed,
            });
        }
        let order = |&a: &usize, &b: &usize| {
            let (a, b): (&Worst, &Worst) = (&quantities[a], &quantities[b]);
            a.relative.total_cmp(&b.relative)
        };
        let worst = (0..quantities.len()).max_by(order);
        let compared = !quantities.is_empty();
        if !compared {
            notes.push("the circuits share no quantity that has a value".into());
        }
        Comparison {
            within: self.within,
            pass: compared
                && bands.iter().all(|band| band.pass)
                && quantities.iter().all(|quantity| quantity.pass),
            quantities,
            worst,
            bands,
            unmatched: Vec::new(),
            notes,
            proof: None,
        }
    }

    fn notes(&self) -> Vec<String> {
        let mut notes = Vec::new();
        for second in [false, true] {
            let at: Vec<f64> =
                self.unsolved.iter().filter(|(_, s)| *s == second).map(|(f, _)| *f).collect();
            if let Some(f) = at.first() {
                let which = if second { "second" } else { "first" };
                notes.push(format!("the {which} circuit alone has no solution at {f} Hz"));
            }
        }
        if let Some(f) = self.neither.first() {
            notes.push(format!(
                "neither circuit has a solution at {f} Hz: nothing is compared there"
            ));
        }
        if self.uncertain {
            notes.push(
                "some differences are smaller than the accuracy of the solutions, which is coarser \
                 than the limit there; they count as within it"
                    .into(),
            );
        }
        notes
    }
}
