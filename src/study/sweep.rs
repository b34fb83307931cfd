//! Many frequencies, and values of parameters, one row each, delivered as they are computed.

use crate::circuit::island::Regime;
use crate::circuit::program::Program;
use crate::circuit::{Circuit, Read};
use crate::diag::Diagnostic;
use crate::quantity::Dimension;
use crate::study::adaptive::Resonance;
pub use crate::study::batch::Tally;
use crate::study::batch::{self, Batches};
use crate::study::engine::Engine;
use crate::study::point::regime_of;
use crate::study::{StudyError, SweepHead, SweepRow};
use std::ops::ControlFlow;

/// A parameter to vary: `count` values from `from` to `to`, evenly spaced, both included.
#[derive(Clone, Debug, PartialEq)]
pub struct Vary {
    /// The `let` to vary.
    pub name: String,
    /// First value, in SI units.
    pub from: f64,
    /// Last value, in SI units.
    pub to: f64,
    /// How many values.
    pub count: usize,
    /// Their dimension.
    pub dimension: Dimension,
}

impl Vary {
    fn value(&self, index: usize) -> f64 {
        match index {
            0 => self.from,
            i if i + 1 == self.count => self.to,
            i => self.from + (self.to - self.from) * i as f64 / (self.count - 1) as f64,
        }
    }
}

/// What to sweep.
#[derive(Clone, Debug, PartialEq)]
pub struct Plan {
    /// Frequencies in hertz, in the order wanted.
    pub frequencies_hz: Vec<f64>,
    /// Parameters to vary; the first is the outermost loop.
    pub vary: Vec<Vary>,
}

/// What a sweep delivers.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Event<'e> {
    /// Once, before all rows.
    Head(&'e SweepHead),
    /// One frequency.
    Row(&'e SweepRow),
    /// After the last row of a circuit: how its frequencies were solved, where it was in batches.
    Tally(&'e Tally),
    /// The row that follows has no values: there is no solution at its frequency.
    Unsolved {
        /// In hertz.
        frequency_hz: f64,
        /// Why, in circuit words.
        why: &'e [Diagnostic],
    },
    /// After the rows it shows in: a resonance that a refined sweep came upon.
    Resonance(&'e Resonance),
    /// A refined sweep ended at its limit of rows before every line was straight enough.
    Full {
        /// How many there are.
        rows: usize,
    },
}

/// Sweeps one circuit, with the values of its varied parameters.
pub(crate) type SweepOne<'s> = dyn FnMut(
        &Circuit,
        Vec<f64>,
        &mut dyn FnMut(Event) -> ControlFlow<()>,
    ) -> Result<ControlFlow<()>, StudyError>
    + 's;

/// Sweeps a circuit and hands each row to `sink`, which may stop the sweep. A frequency without a
/// solution does not end the sweep: its row has no values.
///
/// # Errors
/// What is wrong with the circuit at any frequency, and what keeps it from having a solution at
/// all of them.
pub fn run(
    program: &mut Program,
    plan: &Plan,
    sink: &mut dyn FnMut(Event) -> ControlFlow<()>,
) -> Result<(), StudyError> {
    let rows = plan.frequencies_hz.len();
    each_combination(program, plan, rows, sink, &mut |circuit, varied, sink| {
        sweep_one(circuit, plan, varied, sink)
    })
}

/// Calls `one` for every combination of varied parameters, after the head with `rows` for each.
pub(crate) fn each_combination(
    program: &mut Program,
    plan: &Plan,
    rows: usize,
    sink: &mut dyn FnMut(Event) -> ControlFlow<()>,
    one: &mut SweepOne,
) -> Result<(), StudyError> {
    let combinations = plan.vary.iter().map(|v| v.count).product::<usize>();
    // Delivered with the first row, so that a circuit without any solution delivers nothing.
    let mut heading = None;
    for combination in 0..combinations {
        let mut varied = vec![0.0; plan.vary.len()];
        let mut rest = combination;
        for (value, vary) in varied.iter_mut().zip(&plan.vary).rev() {
            *value = vary.value(rest % vary.count);
            rest /= vary.count;
        }
        for (value, vary) in varied.iter().zip(&plan.vary) {
            program.set(&vary.name, *value, vary.dimension);
        }
        let (circuit, found) = program.circuit();
        let circuit = circuit.ok_or(StudyError::Refused(found))?;
        if combination == 0 {
            heading = Some(head(&circuit, plan, combinations * rows));
        }
        let mut headed = |event: Event| {
            let first = matches!(event, Event::Row(_)).then(|| heading.take()).flatten();
            if first.is_some_and(|head| sink(Event::Head(&head)).is_break()) {
                return ControlFlow::Break(());
            }
            sink(event)
        };
        if one(&circuit, varied, &mut headed)?.is_break() {
            return Ok(());
        }
    }
    Ok(())
}

fn head(circuit: &Circuit, plan: &Plan, rows: usize) -> SweepHead {
    let read = |read: &Read| {
        let formula = circuit.tape.get(read.value);
        (read.name.clone(), formula.dimension, formula.real)
    };
    SweepHead {
        varied: plan.vary.iter().map(|v| (v.name.clone(), v.dimension)).collect(),
        readings: circuit.reads.iter().map(read).collect(),
        rows,
    }
}

fn sweep_one(
    circuit: &Circuit,
    plan: &Plan,
    varied: Vec<f64>,
    sink: &mut dyn FnMut(Event) -> ControlFlow<()>,
) -> Result<ControlFlow<()>, StudyError> {
    let mut batches = batches(circuit, &plan.frequencies_hz)?;
    let mut engines: [Option<Engine>; 2] = [None, None];
    let mut rest = &plan.frequencies_hz[..];
    while let Some(&frequency_hz) = rest.first() {
        let (now, outcomes) = match &mut batches {
            Some(batches) if frequency_hz > 0.0 => {
                let zero = rest.iter().position(|f| *f == 0.0).unwrap_or(rest.len());
                let (now, later) = rest.split_at(zero.min(batches.round()));
                rest = later;
                (now, batches.rows(now, &varied))
            }
            _ => {
                let (now, later) = rest.split_at(1);
                rest = later;
                let regime = regime_of(frequency_hz);
                let slot = &mut engines[usize::from(regime == Regime::Direct)];
                let engine = match slot {
                    Some(engine) => engine,
                    None => slot.insert(Engine::new(circuit, regime)?),
                };
                let solved = engine.solve(frequency_hz);
                let row = solved.map(|()| {
                    let highest = engine.highest_volts();
                    batch::row(circuit, engine, frequency_hz, &varied, highest)
                });
                (now, vec![row])
            }
        };
        for (&frequency_hz, outcome) in now.iter().zip(outcomes) {
            let row = match outcome {
                Ok(row) => row,
                Err(StudyError::NoSolution(why)) => {
                    if sink(Event::Unsolved { frequency_hz, why: &why }).is_break() {
                        return Ok(ControlFlow::Break(()));
                    }
                    batch::row_without_values(circuit, frequency_hz, &varied)
                }
                Err(refused) => return Err(refused),
            };
            if sink(Event::Row(&row)).is_break() {
                return Ok(ControlFlow::Break(()));
            }
        }
    }
    match &batches {
        Some(batches) => Ok(sink(Event::Tally(&batches.tally()))),
        None => Ok(ControlFlow::Continue(())),
    }
}

/// Sweeps of fewer frequencies above zero than this are solved one by one.
const FEWEST_FOR_LANES: usize = 4;

/// The batches of a sweep, planned at the middle of its band (by ratio); `None` where frequencies
/// are better solved one by one.
fn batches<'c>(
    circuit: &'c Circuit,
    frequencies_hz: &[f64],
) -> Result<Option<Batches<'c>>, StudyError> {
    let above = || frequencies_hz.iter().copied().filter(|f| *f > 0.0);
    if above().count() < FEWEST_FOR_LANES {
        return Ok(None);
    }
    let (low, high) = (above().fold(f64::INFINITY, f64::min), above().fold(0.0, f64::max));
    let middle_hz = low.sqrt() * high.sqrt();
    Batches::new(circuit, || Engine::new(circuit, Regime::Alternating), middle_hz)
}
