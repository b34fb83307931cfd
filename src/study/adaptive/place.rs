//! Places the points: between every two neighbours the readings may be drawn as straight lines.

use crate::circuit::Circuit;
use crate::study::adaptive::learn::Learned;
use crate::study::adaptive::sampler::Sampler;
use crate::study::adaptive::{Axis, Refine, march};
use crate::study::{StudyError, Value};
use num_complex::Complex64;
use std::cmp::Ordering;
use std::collections::BinaryHeap;

/// Readings below this part of their largest magnitude in the band need not be right in themselves.
const LEAST_PART: f64 = 1e-15;

/// Two rows closer than this part of their frequency are not parted further: what jumps, jumps
/// between them.
const CLOSEST: f64 = 1e-13;

/// The part of the tolerance that an interval may use.
const SHARE: f64 = 0.9;

/// The part of the tolerance that intervals are cut for.
const TARGET: f64 = 0.8;

/// The part of the tolerance that a model may be off before it is no longer asked.
const MODEL_SHARE: f64 = 0.1;

/// Where an interval is tested, as parts of its length.
const TESTED: [f64; 3] = [0.25, 0.5, 0.75];

/// An interval between two neighbouring samples that is not resolved yet.
struct Open {
    /// Its error over what is allowed; not known yet if infinite.
    error: f64,
    low: usize,
    high: usize,
    /// Judged by solving its middle instead of asking the model.
    by_truth: bool,
}

impl PartialEq for Open {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}

impl Eq for Open {}

impl PartialOrd for Open {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for Open {
    fn cmp(&self, other: &Self) -> Ordering {
        self.error.total_cmp(&other.error).then(other.low.cmp(&self.low))
    }
}

/// What every step needs.
struct Place<'p, 'c> {
    sampler: &'p mut Sampler<'c>,
    learned: &'p Learned,
    axis: Axis,
    tolerance: f64,
    /// Readings that can only be real.
    real: Vec<bool>,
    open: BinaryHeap<Open>,
}

/// Adds samples until every interval is resolved, the worst one first.
pub fn place(
    circuit: &Circuit,
    sampler: &mut Sampler,
    learned: &Learned,
    axis: Axis,
    refine: &Refine,
) -> Result<(), StudyError> {
    let real = circuit.reads.iter().map(|read| circuit.tape.get(read.value).real).collect();
    let tolerance = refine.tolerance;
    let numbers = sampler.between(0.0, f64::INFINITY);
    let mut place = Place { sampler, learned, axis, tolerance, real, open: BinaryHeap::new() };
    for pair in numbers.windows(2) {
        place.judge(pair[0], pair[1], false);
    }
    while let Some(interval) = place.open.pop() {
        let goes_on = match interval.by_truth {
            true => place.halve(&interval)?,
            false => place.divide(&interval)?,
        };
        if !goes_on {
            break;
        }
    }
    Ok(())
}

impl Place<'_, '_> {
    fn ends(&self, low: usize, high: usize) -> (f64, f64) {
        (self.sampler.get(low).frequency_hz, self.sampler.get(high).frequency_hz)
    }

    /// No point fits between, or none would help.
    fn closed(&self, low: usize, high: usize) -> bool {
        let (low_hz, high_hz) = self.ends(low, high);
        high_hz - low_hz <= CLOSEST * high_hz || self.learned.unbounded(low_hz, high_hz)
    }

    /// Opens an interval between neighbours if it is not resolved.
    fn judge(&mut self, low: usize, high: usize, by_truth: bool) {
        if self.closed(low, high) {
            return;
        }
        let (low_hz, high_hz) = self.ends(low, high);
        let asks_nobody = !self.sampler.has_phasors() && low_hz > 0.0;
        let by_truth = by_truth || !asks_nobody && self.learned.model(low_hz, high_hz).is_none();
        if by_truth {
            let error = f64::INFINITY;
            self.open.push(Open { error, low, high, by_truth });
            return;
        }
        let ends = [low, high].map(|number| self.sampler.get(number).values.clone());
        let error = self.tested((low_hz, high_hz), [0.0, 1.0], &ends);
        if error <= SHARE {
            return;
        }
        self.open.push(Open { error, low, high, by_truth });
    }

    fn predicted(&mut self, low_hz: f64, high_hz: f64, frequency_hz: f64) -> Vec<Complex64> {
        let learned = self.learned;
        self.sampler.predict(learned.model(low_hz, high_hz), frequency_hz)
    }

    /// What a model tells about the error of the line between two parts of an interval, with these
    /// readings at its ends.
    fn tested(
        &mut self,
        (low_hz, high_hz): (f64, f64),
        [from, to]: [f64; 2],
        ends: &[Vec<Value>; 2],
    ) -> f64 {
        let errors = TESTED.map(|part| {
            let frequency_hz = self.axis.between(low_hz, high_hz, from + part * (to - from));
            let found = self.predicted(low_hz, high_hz, frequency_hz);
            self.error(ends, part, &found, None)
        });
        errors.into_iter().fold(0.0, f64::max)
    }

    /// The worst error of the straight line at a part of the way, over what is allowed.
    fn error(
        &self,
        [low, high]: &[Vec<Value>; 2],
        part: f64,
        found: &[Complex64],
        bounds: Option<&[Value]>,
    ) -> f64 {
        let mut worst = 0.0f64;
        for (i, found) in found.iter().enumerate() {
            let (a, b) = (low[i], high[i]);
            let defined = [a.value, b.value, *found].map(|v| v.is_finite());
            match defined {
                [true, true, true] => {}
                [false, false, false] => continue,
                _ => return f64::INFINITY,
            }
            let line = a.value * (1.0 - part) + b.value * part;
            let mut off = (line - found).norm();
            if !self.real[i] {
                let sizes = a.value.norm() * (1.0 - part) + b.value.norm() * part;
                off = off.max((sizes - found.norm()).abs());
            }
            let size = a.value.norm().max(b.value.norm()).max(LEAST_PART * self.sampler.largest[i]);
            let own = bounds.map_or(0.0, |bounds| bounds[i].error);
            let allowed = self.tolerance * size + a.error + b.error + own;
            if off > 0.0 {
                worst = worst.max(off / allowed);
            }
        }
        worst
    }

    /// Where the model would cut an interval, as parts of its length.
    fn cuts(&mut self, interval: &Open) -> Vec<f64> {
        let (low_hz, high_hz) = self.ends(interval.low, interval.high);
        let mut known: [(f64, Vec<Value>); 2] = [
            (0.0, self.sampler.get(interval.low).values.clone()),
            (1.0, self.sampler.get(interval.high).values.clone()),
        ];
        let guess = (TARGET / interval.error).sqrt();
        march::cuts(guess, TARGET, &mut |from, to| {
            let ends = [from, to].map(|part| {
                if let Some((_, values)) = known.iter().find(|(known, _)| *known == part) {
                    return values.clone();
                }
                let frequency_hz = self.axis.between(low_hz, high_hz, part);
                let found = self.predicted(low_hz, high_hz, frequency_hz);
                found.into_iter().map(|value| Value { value, error: 0.0 }).collect()
            });
            // The low end is asked for again and again.
            if known[0].0 != from {
                known[0] = (from, ends[0].clone());
            }
            self.tested((low_hz, high_hz), [from, to], &ends)
        })
    }

    /// Solves between the pieces of an interval and compares with the model. False where no more
    /// can be solved.
    fn divide(&mut self, interval: &Open) -> Result<bool, StudyError> {
        let (low_hz, high_hz) = self.ends(interval.low, interval.high);
        let mut numbers = vec![interval.low];
        let mut by_truth = false;
        for part in self.cuts(interval) {
            let frequency_hz = self.axis.between(low_hz, high_hz, part);
            if !(low_hz < frequency_hz && frequency_hz < high_hz)
                || self.learned.forbidden(frequency_hz)
            {
                continue;
            }
            let predicted = self.predicted(low_hz, high_hz, frequency_hz);
            let Some(number) = self.sampler.take(frequency_hz)? else { return Ok(false) };
            by_truth |= self.off(number, &predicted) > MODEL_SHARE;
            numbers.push(number);
        }
        numbers.push(interval.high);
        if numbers.len() == 2 {
            // The model sees no place to cut, so the truth has to tell.
            by_truth = true;
        }
        numbers.windows(2).for_each(|pair| self.judge(pair[0], pair[1], by_truth));
        Ok(true)
    }

    /// How far the model is off at a sample, over what is allowed there.
    fn off(&self, number: usize, predicted: &[Complex64]) -> f64 {
        let sample = self.sampler.get(number);
        let mut worst = 0.0f64;
        for (i, predicted) in predicted.iter().enumerate() {
            let Value { value, error } = sample.values[i];
            match (value.is_finite(), predicted.is_finite()) {
                (true, true) => {}
                (false, false) => continue,
                _ => return f64::INFINITY,
            }
            let size = value.norm().max(LEAST_PART * self.sampler.largest[i]);
            let off = (value - predicted).norm();
            if off > 0.0 {
                worst = worst.max(off / (self.tolerance * size + error));
            }
        }
        worst
    }

    /// Solves the middle of an interval and judges the interval by it.
    fn halve(&mut self, interval: &Open) -> Result<bool, StudyError> {
        let (low_hz, high_hz) = self.ends(interval.low, interval.high);
        let middle_hz = self.axis.between(low_hz, high_hz, 0.5);
        if !(low_hz < middle_hz && middle_hz < high_hz) {
            return Ok(true);
        }
        let Some(middle) = self.sampler.take(middle_hz)? else { return Ok(false) };
        let truth = self.sampler.get(middle).values.clone();
        let found: Vec<Complex64> = truth.iter().map(|v| v.value).collect();
        let ends =
            [interval.low, interval.high].map(|number| self.sampler.get(number).values.clone());
        let error = self.error(&ends, 0.5, &found, Some(&truth));
        // One place may hide what the others would show, so the halves keep a wide margin.
        if error > 0.25 * SHARE {
            for (low, high) in [(interval.low, middle), (middle, interval.high)] {
                if !self.closed(low, high) {
                    self.open.push(Open { error, low, high, by_truth: true });
                }
            }
        }
        Ok(true)
    }
}
