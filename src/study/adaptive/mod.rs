//! Frequencies chosen by the response: rows between which every reading is a straight line, as
//! near as wanted, at about as few frequencies as that takes.
//!
//! 1. `learn`: rational models of the voltages and currents behind the readings say where to solve
//!    next, until they predict what is solved; their poles are the resonances.
//! 2. `place`: intervals are cut where the model, or what was solved, shows a bend.
//! 3. `peaks`: a row on every extreme.
//!
//! Every frequency solved becomes a row.

mod learn;
mod march;
mod model;
mod peaks;
mod place;
mod sampler;

use crate::circuit::Circuit;
use crate::circuit::program::Program;
use crate::study::adaptive::sampler::{Sample, Sampler};
use crate::study::sweep::{self, Event, Plan};
use crate::study::{StudyError, SweepRow};
use std::ops::ControlFlow;

/// Tolerance where nothing else is said.
pub const USUAL_TOLERANCE: f64 = 1e-3;

/// Rows of one refined sweep where nothing else is said.
pub const USUAL_MOST: usize = 20_000;

/// What a reader may draw as a straight line: readings over the logarithm of the frequency, or
/// over the frequency itself.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Axis {
    /// Over log f.
    Logarithmic,
    /// Over f.
    Linear,
}

impl Axis {
    /// Where a frequency in hertz lies.
    fn place(self, frequency_hz: f64) -> f64 {
        match self {
            Axis::Logarithmic => frequency_hz.ln(),
            Axis::Linear => frequency_hz,
        }
    }

    /// The frequency at a part of the way from one to another.
    fn between(self, low_hz: f64, high_hz: f64, part: f64) -> f64 {
        match self {
            // The logarithm of the ratio keeps neighbours apart that differ in their last digits.
            Axis::Logarithmic if low_hz > 0.0 => {
                let ratio = ((high_hz - low_hz) / low_hz).ln_1p();
                low_hz + low_hz * (part * ratio).exp_m1()
            }
            _ => low_hz + part * (high_hz - low_hz),
        }
    }
}

/// How finely to sweep.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Refine {
    /// Largest error of the straight line, as a part of the larger reading at its two ends.
    pub tolerance: f64,
    /// Most rows for each combination of varied parameters.
    pub most: usize,
    /// What lines are straight over.
    pub axis: Axis,
}

/// A resonance that the readings show.
#[derive(Clone, Debug, PartialEq)]
pub struct Resonance {
    /// Values of the varied parameters, in SI units.
    pub varied: Vec<f64>,
    /// The natural frequency in hertz.
    pub frequency_hz: f64,
    /// The quality factor; infinite where no loss can be told.
    pub q: f64,
}

/// As [`sweep::run`], with rows added to the plan's frequencies where a reading bends. The rows of
/// each combination of parameters come in ascending order of frequency.
///
/// # Errors
/// As [`sweep::run`].
pub fn run(
    program: &mut Program,
    plan: &Plan,
    refine: &Refine,
    sink: &mut dyn FnMut(Event) -> ControlFlow<()>,
) -> Result<(), StudyError> {
    sweep::each_combination(program, plan, 0, sink, &mut |circuit, varied, sink| {
        refine_one(circuit, plan, refine, varied, sink)
    })
}

/// Frequencies closer than this part are the same resonance without loss.
const SAME_PART: f64 = 1e-9;

fn refine_one(
    circuit: &Circuit,
    plan: &Plan,
    refine: &Refine,
    varied: Vec<f64>,
    sink: &mut dyn FnMut(Event) -> ControlFlow<()>,
) -> Result<ControlFlow<()>, StudyError> {
    let mut sampler = Sampler::new(circuit, refine.most)?;
    let mut resonances = Vec::new();
    for &frequency_hz in &plan.frequencies_hz {
        sampler.take(frequency_hz)?;
    }
    let positive = plan.frequencies_hz.iter().copied().filter(|&f| f > 0.0);
    let (low_hz, high_hz) =
        positive.fold((f64::INFINITY, 0.0f64), |(low, high), f| (low.min(f), high.max(f)));
    if low_hz < high_hz {
        let learned = learn::learn(&mut sampler, refine.axis, (low_hz, high_hz), refine.tolerance)?;
        place::place(circuit, &mut sampler, &learned, refine.axis, refine)?;
        peaks::crown(circuit, &mut sampler, &learned)?;
        for pole in &learned.poles {
            let lossless = pole.is_lossless();
            let frequency_hz = pole.frequency_hz();
            // Say whether it is solvable there, unless a row did so already.
            if lossless && sampler.distance_hz(frequency_hz) > SAME_PART * frequency_hz {
                sampler.take(frequency_hz)?;
            }
            let q = if lossless { f64::INFINITY } else { pole.q() };
            resonances.push(Resonance { varied: varied.clone(), frequency_hz, q });
        }
    }
    deliver(&sampler, varied, &resonances, sink)
}

fn deliver(
    sampler: &Sampler,
    varied: Vec<f64>,
    resonances: &[Resonance],
    sink: &mut dyn FnMut(Event) -> ControlFlow<()>,
) -> Result<ControlFlow<()>, StudyError> {
    let mut row = SweepRow {
        varied,
        frequency_hz: 0.0,
        values: Vec::new(),
        missed: Vec::new(),
        highest_volts: 0.0,
    };
    for number in sampler.between(0.0, f64::INFINITY) {
        let Sample { frequency_hz, values, missed, unsolved, highest_volts, .. } =
            sampler.get(number);
        row.highest_volts = *highest_volts;
        row.frequency_hz = *frequency_hz;
        row.values.clone_from(values);
        row.missed.clone_from(missed);
        if let Some(why) = unsolved
            && sink(Event::Unsolved { frequency_hz: *frequency_hz, why }).is_break()
        {
            return Ok(ControlFlow::Break(()));
        }
        if sink(Event::Row(&row)).is_break() {
            return Ok(ControlFlow::Break(()));
        }
    }
    for resonance in resonances {
        if sink(Event::Resonance(resonance)).is_break() {
            return Ok(ControlFlow::Break(()));
        }
    }
    if sampler.full && sink(Event::Full { rows: sampler.count() }).is_break() {
        return Ok(ControlFlow::Break(()));
    }
    Ok(ControlFlow::Continue(()))
}
