//! Learns the response: solves where models disagree, until they predict what is solved next.

use crate::study::StudyError;
use crate::study::adaptive::Axis;
use crate::study::adaptive::model::{Known, LOSSLESS_GAP, Model, Pole};
use crate::study::adaptive::sampler::Sampler;

/// Supports of one model; a response that needs more is modelled in parts.
const MOST_SUPPORTS: usize = 36;

/// Samples of one model before its part of the band is halved.
const MOST_SAMPLES: usize = 100;

/// Samples a model starts from.
const FIRST_SAMPLES: usize = 9;

/// How often a band may be halved.
const MOST_HALVINGS: usize = 7;

/// A model predicts when it is this close to what is solved next. A resonance of quality Q that
/// makes up the part p of a response shows off resonance as p/(2Q) of it, so this finds Q = 10⁵
/// wherever it makes up a few parts in ten thousand.
const PREDICTS: f64 = 1e-9;

/// A part of the band with its model.
pub struct Part {
    /// Where it begins, in hertz.
    pub low_hz: f64,
    /// Where it ends, in hertz.
    pub high_hz: f64,
    /// The model, if it is to be trusted.
    pub model: Option<Model>,
}

/// What was learned about a band.
pub struct Learned {
    /// Its parts, ascending.
    pub parts: Vec<Part>,
    /// The resonances found, ascending.
    pub poles: Vec<Pole>,
}

impl Learned {
    /// The trusted model of the part an interval lies in.
    pub fn model(&self, low_hz: f64, high_hz: f64) -> Option<&Model> {
        let at = self.parts.partition_point(|part| part.high_hz <= low_hz);
        let part = self.parts.get(at)?;
        (part.low_hz <= low_hz && high_hz <= part.high_hz).then_some(part.model.as_ref())?
    }

    /// True where nothing more is resolved: next to a resonance without loss.
    pub fn unbounded(&self, low_hz: f64, high_hz: f64) -> bool {
        self.poles.iter().filter(|pole| pole.is_lossless()).any(|pole| {
            let top = pole.frequency_hz();
            let gap = 1.01 * LOSSLESS_GAP * top;
            low_hz >= top - gap && high_hz <= top + gap
        })
    }

    /// A frequency that nothing is to be solved at, for the same reason.
    pub fn forbidden(&self, frequency_hz: f64) -> bool {
        self.unbounded(frequency_hz, frequency_hz)
    }
}

/// The frequencies where a resonance must be solved: its top and its flanks at half power.
fn places(pole: &Pole) -> Vec<f64> {
    let top = pole.frequency_hz();
    if pole.is_lossless() {
        return vec![top * (1.0 - LOSSLESS_GAP), top * (1.0 + LOSSLESS_GAP)];
    }
    let half = pole.half_width_hz();
    vec![top - half, top, top + half]
}

/// Learns the response from one frequency to another, both solved already.
pub fn learn(
    sampler: &mut Sampler,
    axis: Axis,
    band_hz: (f64, f64),
    tolerance: f64,
) -> Result<Learned, StudyError> {
    let mut learned = Learned { parts: Vec::new(), poles: Vec::new() };
    // The lowest part comes off first.
    let mut waiting = vec![(band_hz.0, band_hz.1, 0)];
    while let Some((low_hz, high_hz, halved)) = waiting.pop() {
        let model = match sampler.has_phasors() {
            true => settle(sampler, axis, (low_hz, high_hz), tolerance)?,
            false => None,
        };
        let splits = model.is_none() && sampler.has_phasors() && !sampler.full;
        let middle_hz = axis.between(low_hz, high_hz, 0.5);
        if splits && halved < MOST_HALVINGS && low_hz < middle_hz && middle_hz < high_hz {
            sampler.take(middle_hz)?;
            waiting.push((middle_hz, high_hz, halved + 1));
            waiting.push((low_hz, middle_hz, halved + 1));
            continue;
        }
        if let Some(model) = &model {
            // What was never looked at is made of rounding.
            let solved = |pole: &Pole| places(pole).iter().all(|f| is_near(sampler, pole, *f));
            let poles = model.poles(low_hz, high_hz, 0.5 * tolerance).into_iter().filter(solved);
            learned.poles.extend(poles.collect::<Vec<_>>());
        }
        learned.parts.push(Part { low_hz, high_hz, model });
    }
    Ok(learned)
}

/// Samples one part until its model predicts; `None` where it does not come to that.
fn settle(
    sampler: &mut Sampler,
    axis: Axis,
    (low_hz, high_hz): (f64, f64),
    tolerance: f64,
) -> Result<Option<Model>, StudyError> {
    loop {
        let have: Vec<f64> =
            sampler.known(low_hz, high_hz).iter().map(|k| k.frequency_hz).collect();
        if have.len() >= FIRST_SAMPLES {
            break;
        }
        let more = widest_gaps(sampler, axis, &have, FIRST_SAMPLES - have.len());
        if have.len() < 2 || more.is_empty() || !take_all(sampler, &more)? {
            return Ok(None);
        }
    }
    /// A last fit may show new resonances, real ones or made of rounding: this often they are
    /// looked at.
    const MOST_AFTER: usize = 4;
    let mut before: Option<Model> = None;
    let (mut settled, mut after) = (false, 0);
    loop {
        let known = sampler.known(low_hz, high_hz);
        let have: Vec<f64> = known.iter().map(|k| k.frequency_hz).collect();
        let begin = before.as_ref().filter(|model| model.misfit <= PREDICTS);
        let begin = begin.map_or(Vec::new(), |model| model.supports_hz().to_vec());
        let Some(model) = Model::fit(&known, &begin, MOST_SUPPORTS) else { return Ok(None) };
        if settled {
            let more = unsolved_places(sampler, &model, (low_hz, high_hz), tolerance);
            if more.is_empty() || after == MOST_AFTER || !take_all(sampler, &more)? {
                return Ok((model.misfit <= 0.01 * tolerance).then_some(model));
            }
            after += 1;
            continue;
        }
        if have.len() > MOST_SAMPLES {
            return Ok(None);
        }
        let fits = model.misfit <= PREDICTS;
        let peaks = match fits {
            true => unsolved_places(sampler, &model, (low_hz, high_hz), tolerance),
            false => Vec::new(),
        };
        let count = if fits { 2 } else { (have.len() / 3).max(3) };
        let gaps = doubtful(sampler, axis, &have, &model, before.as_ref(), count);
        if gaps.is_empty() {
            return Ok(fits.then_some(model));
        }
        let largest = largest(&known);
        settled = fits;
        for (list, allowed) in [(&gaps, PREDICTS), (&peaks, 0.01 * tolerance)] {
            for &frequency_hz in list {
                let Some(number) = sampler.take(frequency_hz)? else { return Ok(None) };
                let off = off(&model, sampler, number, &largest);
                settled &= off <= allowed;
            }
        }
        before = Some(model);
    }
}

fn largest(known: &[Known]) -> Vec<f64> {
    let count = known.first().map_or(0, |k| k.phasors.len());
    (0..count).map(|q| known.iter().map(|k| k.phasors[q].norm()).fold(0.0, f64::max)).collect()
}

/// How far off a model is at a sample it does not know, relative to the sample.
fn off(model: &Model, sampler: &Sampler, number: usize, largest: &[f64]) -> f64 {
    /// Parts of the largest magnitude of a phasor below which its own size is no measure.
    const SMALL: f64 = 1e-6;
    let sample = sampler.get(number);
    if sample.phasors.is_empty() {
        return 0.0;
    }
    let found = model.at(sample.frequency_hz);
    let pairs = found.iter().zip(&sample.phasors).zip(largest);
    let relative = pairs.map(|((found, truth), largest)| {
        let off = (found - truth).norm();
        let size = truth.norm().max(SMALL * largest);
        if off == 0.0 { 0.0 } else { off / size }
    });
    // Not a number is far off.
    relative.fold(0.0, |worst, off| if off > worst || off.is_nan() { off } else { worst })
}

/// Something was solved near a place of a resonance, or the place lies outside the band.
fn is_near(sampler: &Sampler, pole: &Pole, frequency_hz: f64) -> bool {
    let width = match pole.is_lossless() {
        true => LOSSLESS_GAP * pole.frequency_hz(),
        false => pole.half_width_hz(),
    };
    let inside = sampler.surrounds(frequency_hz);
    !inside || sampler.distance_hz(frequency_hz) <= 0.3 * width
}

/// Tops and flanks of resonances without a sample near them.
fn unsolved_places(
    sampler: &Sampler,
    model: &Model,
    (low_hz, high_hz): (f64, f64),
    tolerance: f64,
) -> Vec<f64> {
    let mut found = Vec::new();
    for pole in model.poles(low_hz, high_hz, 0.5 * tolerance) {
        let new = |f: &f64| (low_hz..=high_hz).contains(f) && !is_near(sampler, &pole, *f);
        found.extend(places(&pole).into_iter().filter(new));
    }
    found
}

/// Middles of the widest gaps.
fn widest_gaps(sampler: &Sampler, axis: Axis, have: &[f64], count: usize) -> Vec<f64> {
    let new = |f: &f64| sampler.distance_hz(*f) > 0.0;
    let mut gaps: Vec<(f64, f64)> = have
        .windows(2)
        .filter_map(|w| {
            // A frequency without a solution may stand in the middle.
            let tried = [0.5, 0.4].map(|part| axis.between(w[0], w[1], part));
            let middle = tried.into_iter().find(new)?;
            Some((axis.place(w[1]) - axis.place(w[0]), middle))
        })
        .collect();
    gaps.sort_by(|a, b| b.0.total_cmp(&a.0));
    gaps.into_iter().take(count).map(|(_, middle)| middle).collect()
}

/// Where two models disagree most, one place a gap between samples; without a second model, the
/// widest gaps. At least one widest gap is among them.
fn doubtful(
    sampler: &Sampler,
    axis: Axis,
    have: &[f64],
    model: &Model,
    before: Option<&Model>,
    count: usize,
) -> Vec<f64> {
    let Some(before) = before else { return widest_gaps(sampler, axis, have, count) };
    let mut gaps: Vec<(f64, f64)> = Vec::new();
    for pair in have.windows(2) {
        let tried = [0.25, 0.5, 0.75].map(|t| {
            let f = axis.between(pair[0], pair[1], t);
            let (a, b) = (model.at(f), before.at(f));
            let differ = a.iter().zip(&b).map(|(a, b)| {
                let size = a.norm() + b.norm();
                if size > 0.0 { (a - b).norm() / size } else { 0.0 }
            });
            (differ.fold(0.0, f64::max), f)
        });
        let worst = tried.into_iter().max_by(|a, b| a.0.total_cmp(&b.0));
        gaps.extend(worst.filter(|(_, f)| sampler.distance_hz(*f) > 0.0));
    }
    gaps.sort_by(|a, b| b.0.total_cmp(&a.0));
    let mut found: Vec<f64> = gaps.into_iter().take(count.max(2) - 1).map(|(_, f)| f).collect();
    let wide = widest_gaps(sampler, axis, have, 1);
    found.extend(wide.into_iter().filter(|f| !found.contains(f)).collect::<Vec<_>>());
    found
}

fn take_all(sampler: &mut Sampler, frequencies_hz: &[f64]) -> Result<bool, StudyError> {
    for &frequency_hz in frequencies_hz {
        if sampler.take(frequency_hz)?.is_none() {
            return Ok(false);
        }
    }
    Ok(true)
}
