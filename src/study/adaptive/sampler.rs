//! True solutions, each taken once and kept.

use crate::circuit::Circuit;
use crate::circuit::island::Regime;
use crate::diag::Diagnostic;
use crate::study::adaptive::model::{Known, Model};
use crate::study::engine::Engine;
use crate::study::engine::predict::Probe;
use crate::study::point::{missed, regime_of};
use crate::study::{StudyError, Value};
use num_complex::Complex64;
use std::collections::BTreeMap;

/// A reading without a value.
pub const UNDETERMINED: Value =
    Value { value: Complex64::new(f64::NAN, f64::NAN), error: f64::INFINITY };

/// One frequency that was solved, or found to have no solution.
#[derive(Clone, Debug)]
pub struct Sample {
    /// In hertz.
    pub frequency_hz: f64,
    /// The readings.
    pub values: Vec<Value>,
    /// Which readings missed a limit.
    pub missed: Vec<bool>,
    /// What the readings are made of; empty where the model has no use for it.
    pub phasors: Vec<Complex64>,
    /// Why there is no solution.
    pub unsolved: Option<Vec<Diagnostic>>,
    /// The highest voltage anywhere.
    pub highest_volts: f64,
}

/// Solves a circuit where asked and keeps what was found.
pub struct Sampler<'c> {
    circuit: &'c Circuit,
    engine: Engine<'c>,
    probe: Probe,
    direct: Option<Engine<'c>>,
    samples: Vec<Sample>,
    /// Samples by frequency: the bits of positive numbers ascend with them.
    order: BTreeMap<u64, usize>,
    most: usize,
    /// Largest magnitude of each reading so far.
    pub largest: Vec<f64>,
    /// True where a sample was refused because there are `most` already.
    pub full: bool,
}

impl<'c> Sampler<'c> {
    /// A sampler that solves at most `most` frequencies.
    pub fn new(circuit: &'c Circuit, most: usize) -> Result<Self, StudyError> {
        let engine = Engine::new(circuit, Regime::Alternating)?;
        Ok(Sampler {
            probe: engine.probe(),
            engine,
            direct: None,
            samples: Vec::new(),
            order: BTreeMap::new(),
            most,
            largest: vec![0.0; circuit.reads.len()],
            full: false,
            circuit,
        })
    }

    /// True where the readings depend on voltages or currents.
    pub fn has_phasors(&self) -> bool {
        !self.probe.is_empty()
    }

    /// Solves at a frequency, unless that was done or there are too many; its number.
    pub fn take(&mut self, frequency_hz: f64) -> Result<Option<usize>, StudyError> {
        if let Some(&known) = self.order.get(&frequency_hz.to_bits()) {
            return Ok(Some(known));
        }
        if self.samples.len() >= self.most {
            self.full = true;
            return Ok(None);
        }
        let direct = regime_of(frequency_hz) == Regime::Direct;
        let engine = match (direct, &mut self.direct) {
            (false, _) => &mut self.engine,
            (true, Some(engine)) => engine,
            (true, slot) => slot.insert(Engine::new(self.circuit, Regime::Direct)?),
        };
        let reads = &self.circuit.reads;
        let mut sample = Sample {
            frequency_hz,
            values: vec![UNDETERMINED; reads.len()],
            missed: vec![false; reads.len()],
            phasors: Vec::new(),
            unsolved: None,
            highest_volts: 0.0,
        };
        match engine.solve(frequency_hz) {
            Ok(()) => {
                sample.highest_volts = engine.highest_volts();
                for (i, read) in reads.iter().enumerate() {
                    let value = engine.value(read.value).map_or(UNDETERMINED, Value::from);
                    sample.values[i] = value;
                    sample.missed[i] =
                        !read.limits.is_empty() && !missed(engine, read, value).is_empty();
                    let size = value.value.norm();
                    if size.is_finite() {
                        self.largest[i] = self.largest[i].max(size);
                    }
                }
                if !direct {
                    sample.phasors = self.engine.phasors(&self.probe);
                }
            }
            Err(StudyError::NoSolution(found)) => sample.unsolved = Some(found),
            Err(refused) => return Err(refused),
        }
        self.order.insert(frequency_hz.to_bits(), self.samples.len());
        self.samples.push(sample);
        Ok(Some(self.samples.len() - 1))
    }

    /// A sample.
    pub fn get(&self, number: usize) -> &Sample {
        &self.samples[number]
    }

    /// How many there are.
    pub fn count(&self) -> usize {
        self.samples.len()
    }

    /// Numbers of all samples from one frequency to another, ascending.
    pub fn between(&self, from_hz: f64, to_hz: f64) -> Vec<usize> {
        self.order.range(from_hz.to_bits()..=to_hz.to_bits()).map(|(_, &number)| number).collect()
    }

    /// The sample nearest below or above, whichever is closer, in hertz away.
    pub fn distance_hz(&self, frequency_hz: f64) -> f64 {
        let bits = frequency_hz.to_bits();
        let below = self.order.range(..=bits).next_back().map(|(bits, _)| f64::from_bits(*bits));
        let above = self.order.range(bits..).next().map(|(bits, _)| f64::from_bits(*bits));
        let away = |f: Option<f64>| f.map_or(f64::INFINITY, |f| (f - frequency_hz).abs());
        away(below).min(away(above))
    }

    /// True between the lowest and the highest frequency solved.
    pub fn surrounds(&self, frequency_hz: f64) -> bool {
        let bits = frequency_hz.to_bits();
        self.order.range(..=bits).next_back().is_some() && self.order.range(bits..).next().is_some()
    }

    /// The samples a model can be fitted to, ascending.
    pub fn known(&self, from_hz: f64, to_hz: f64) -> Vec<Known<'_>> {
        let usable = |number: usize| {
            let Sample { frequency_hz, phasors, .. } = &self.samples[number];
            let sound = !phasors.is_empty() && phasors.iter().all(|p| p.is_finite());
            sound.then_some(Known { frequency_hz: *frequency_hz, phasors })
        };
        self.between(from_hz, to_hz).into_iter().filter_map(usable).collect()
    }

    /// The readings as a model sees them at a frequency.
    pub fn predict(&mut self, model: Option<&Model>, frequency_hz: f64) -> Vec<Complex64> {
        let phasors = model.map_or(Vec::new(), |model| model.at(frequency_hz));
        self.engine.predict(&self.probe, frequency_hz, &phasors);
        let value = |read: &crate::circuit::Read| {
            let value = self.engine.value(read.value).map(|ball| ball.centre.to_complex());
            value.unwrap_or(UNDETERMINED.value)
        };
        self.circuit.reads.iter().map(value).collect()
    }
}
