//! Sweeps in batches: many frequencies at once in lanes, shared out to threads, each lane judged;
//! frequencies whose lane is not good enough are solved on their own.

use crate::circuit::{Circuit, FormulaId};
use crate::number::ComplexTwofold;
use crate::solve::Pattern;
use crate::solve::lanes::{Equations, Plan, Uses, Verdict, Workspace};
use crate::study::engine::Engine;
use crate::study::point::{EXTRA_LOW_VOLTS_AC, missed};
use crate::study::{StudyError, SweepRow, Value};
use crate::system::Quantity;
use crate::system::affine::AffineSystem;
use num_complex::Complex64;
use rayon::prelude::*;

/// Relative error that the corrections of a lane may leave: below what a double shows.
const MOST_LEFT: f64 = 1e-16;

/// Reserve on the bound of what a correction leaves, as it rests on an observed ratio.
const RESERVE: f64 = 8.0;

/// Rounding of the twofold operations after the last correction, relative.
const TWOFOLD_ROUNDING: f64 = 1e-29;

/// Batches each thread takes up in one round at most: enough to outweigh handing them out.
const MOST_BATCHES_A_ROUND: u64 = 16;

/// Complex multiply-adds of one thread in a round: some tens of milliseconds, so that rows of a
/// large circuit do not wait for long.
const WORK_A_ROUND: u64 = 50_000_000;

/// How the frequencies of a sweep were solved.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Tally {
    /// Frequencies at once.
    pub lanes: usize,
    /// Threads.
    pub threads: usize,
    /// Complex multiply-adds of one factorisation and solution.
    pub work: u64,
    /// The plan uses the symmetry of the matrix.
    pub symmetric: bool,
    /// Frequencies solved in lanes.
    pub in_lanes: usize,
    /// Frequencies solved on their own with fresh pivots.
    pub alone: usize,
}

/// What one thread works with.
struct State<'c> {
    engine: Engine<'c>,
    workspace: Workspace,
    alone: usize,
}

/// A circuit made ready for sweeps above f = 0.
pub(crate) struct Batches<'c> {
    circuit: &'c Circuit,
    plan: Plan,
    /// Formulas of the further values of the equations, true for those that are subtracted.
    extras: Vec<(bool, FormulaId)>,
    needed: Vec<FormulaId>,
    /// The unknowns that the readings rest on.
    unknowns: Vec<u32>,
    states: Vec<State<'c>>,
    in_lanes: usize,
}

/// One frequency: a row, or why there is none.
pub(crate) type Outcome = Result<SweepRow, StudyError>;

impl<'c> Batches<'c> {
    /// Finds the plan at `frequency_hz`, which should stand for all. `None` where frequencies are
    /// better solved one by one: nothing to solve, or no plan.
    pub fn new(
        circuit: &'c Circuit,
        mut make: impl FnMut() -> Result<Engine<'c>, StudyError>,
        frequency_hz: f64,
    ) -> Result<Option<Self>, StudyError> {
        let mut engine = make()?;
        let system = engine.system();
        if system.unknowns.is_empty() {
            return Ok(None);
        }
        let Ok(affine) = AffineSystem::new(system) else { return Ok(None) };
        let mut extras = Vec::new();
        let mut equations =
            Equations { entries: affine.entries, right: affine.right, ..Equations::default() };
        for stamp in &affine.bent_stamps {
            let Quantity::Formula(id) = stamp.quantity else { continue };
            equations.extra_entries.push(stamp.slot);
            extras.push((stamp.negative, id));
        }
        for drive in &affine.bent_drives {
            equations.extra_right.push(drive.row);
            extras.push((drive.negative, drive.formula));
        }
        let pattern = Pattern {
            n: system.unknowns.len(),
            column_start: system.column_start.clone(),
            row: system.row.clone(),
        };
        let bent: Vec<FormulaId> = extras.iter().map(|(_, id)| *id).collect();
        let needed = engine.needed_of_frequency(&bent);
        engine.evaluate_at(frequency_hz, &needed);
        let sample: Option<Vec<Complex64>> = extras
            .iter()
            .map(|&(negative, id)| {
                let value = engine.value(id).ok()?.centre.to_complex();
                Some(if negative { -value } else { value })
            })
            .collect();
        let Some(sample) = sample else { return Ok(None) };
        let uses = Uses { refine: true, ..Uses::default() };
        let Ok(plan) = Plan::new(&pattern, &equations, frequency_hz, &sample, uses) else {
            return Ok(None);
        };
        let unknowns = engine.needed_unknowns();
        let workspace = plan.workspace(&equations);
        let mut states = vec![State { engine, workspace: workspace.clone(), alone: 0 }];
        for _ in 1..rayon::current_num_threads() {
            states.push(State { engine: make()?, workspace: workspace.clone(), alone: 0 });
        }
        Ok(Some(Batches { circuit, plan, extras, needed, unknowns, states, in_lanes: 0 }))
    }

    /// Frequencies to hand over at once.
    pub fn round(&self) -> usize {
        let lanes = self.plan.lanes() as u64;
        let batches = WORK_A_ROUND / (self.plan.work() * lanes).max(1);
        (batches.clamp(1, MOST_BATCHES_A_ROUND) * lanes) as usize * self.states.len()
    }

    /// How it went so far.
    pub fn tally(&self) -> Tally {
        let alone = self.states.iter().map(|state| state.alone).sum();
        Tally {
            lanes: self.plan.lanes(),
            threads: self.states.len(),
            work: self.plan.work(),
            symmetric: self.plan.is_symmetric(),
            in_lanes: self.in_lanes - alone,
            alone,
        }
    }

    /// Solves frequencies above zero, in their order. Which thread and which lane a frequency
    /// falls to makes no difference to any bit of its row.
    pub fn rows(&mut self, frequencies_hz: &[f64], varied: &[f64]) -> Vec<Outcome> {
        self.in_lanes += frequencies_hz.len();
        let lanes = self.plan.lanes();
        let batches = frequencies_hz.len().div_ceil(lanes);
        let share = batches.div_ceil(self.states.len()).max(1) * lanes;
        let job = Job {
            circuit: self.circuit,
            plan: &self.plan,
            extras: &self.extras,
            needed: &self.needed,
            unknowns: &self.unknowns,
            varied,
        };
        let parts: Vec<Vec<Outcome>> = self
            .states
            .par_iter_mut()
            .zip(frequencies_hz.par_chunks(share))
            .map(|(state, part)| {
                let mut out = Vec::with_capacity(part.len());
                for batch in part.chunks(lanes) {
                    job.run(state, batch, &mut out);
                }
                out
            })
            .collect();
        parts.into_iter().flatten().collect()
    }
}

/// What all batches of a round share.
struct Job<'j> {
    circuit: &'j Circuit,
    plan: &'j Plan,
    extras: &'j [(bool, FormulaId)],
    needed: &'j [FormulaId],
    unknowns: &'j [u32],
    varied: &'j [f64],
}

impl Job<'_> {
    fn run(&self, state: &mut State, batch: &[f64], out: &mut Vec<Outcome>) {
        let State { engine, workspace, alone } = state;
        // Lanes beyond the batch repeat its last frequency.
        let mut valued = vec![true; batch.len()];
        for lane in 0..if self.extras.is_empty() { 0 } else { self.plan.lanes() } {
            let at = lane.min(batch.len() - 1);
            engine.evaluate_at(batch[at], self.needed);
            for (which, &(negative, id)) in self.extras.iter().enumerate() {
                let value = engine.value(id).map(|ball| ball.centre);
                valued[at] &= value.is_ok();
                let value = value.unwrap_or(ComplexTwofold::ZERO);
                let value = if negative { -value } else { value };
                let high = value.to_complex();
                let low = (value - ComplexTwofold::from(high)).to_complex();
                workspace.set_extra(which, lane, high);
                workspace.set_extra_low(which, lane, low);
            }
        }
        let mut good: Vec<bool> = {
            let verdicts = self.plan.run(workspace, batch);
            // A poor backward error shows in the corrections too, and may be made good by them.
            let solved = |v: &Verdict| v.backward_error.is_finite();
            verdicts.iter().zip(&valued).map(|(v, valued)| solved(v) && *valued).collect()
        };
        self.plan.refine(workspace);
        for (lane, good) in good.iter_mut().enumerate() {
            let (correction, left) = workspace.left(lane);
            *good &= RESERVE * left * correction <= MOST_LEFT;
        }
        for (lane, &frequency_hz) in batch.iter().enumerate() {
            if good[lane] {
                let (largest, left) = workspace.left(lane);
                engine.adopt(frequency_hz, self.needed, self.unknowns, |unknown| {
                    let (x, correction) = workspace.refined(unknown, lane);
                    let sum = ComplexTwofold::from(x) + ComplexTwofold::from(correction);
                    let off = RESERVE * left * (correction.norm() + largest * x.norm());
                    (sum, off + TWOFOLD_ROUNDING * x.norm())
                });
            } else {
                *alone += 1;
                if let Err(error) = engine.solve(frequency_hz) {
                    out.push(Err(error));
                    continue;
                }
            }
            let highest = match good[lane] {
                true => highest_volts(engine, workspace, lane),
                false => engine.highest_volts(),
            };
            let row = row(self.circuit, engine, frequency_hz, self.varied, highest);
            out.push(Ok(row));
        }
    }
}

/// The highest voltage in a lane: exact where it is of concern, else that of the highest node.
fn highest_volts(engine: &Engine, workspace: &Workspace, lane: usize) -> f64 {
    let nodes = engine.system().of_node.iter().flatten();
    let node = nodes.map(|&unknown| workspace.size(unknown as usize, lane)).fold(0.0, f64::max);
    // No drop is larger than twice the highest node.
    if 2.0 * node <= EXTRA_LOW_VOLTS_AC {
        return node;
    }
    engine.highest_volts_of(|unknown| workspace.refined(unknown as usize, lane).0)
}

/// The row of a frequency that has no solution.
pub(crate) fn row_without_values(circuit: &Circuit, frequency_hz: f64, varied: &[f64]) -> SweepRow {
    let reads = circuit.reads.len();
    SweepRow {
        varied: varied.to_vec(),
        frequency_hz,
        values: vec![undetermined(); reads],
        missed: vec![false; reads],
        highest_volts: 0.0,
    }
}

fn undetermined() -> Value {
    Value { value: Complex64::new(f64::NAN, f64::NAN), error: f64::INFINITY }
}

/// The row of a frequency that has been solved.
pub(crate) fn row(
    circuit: &Circuit,
    engine: &Engine,
    frequency_hz: f64,
    varied: &[f64],
    highest_volts: f64,
) -> SweepRow {
    let mut row = SweepRow {
        varied: varied.to_vec(),
        frequency_hz,
        values: Vec::with_capacity(circuit.reads.len()),
        missed: Vec::with_capacity(circuit.reads.len()),
        highest_volts,
    };
    for read in &circuit.reads {
        let value = engine.value(read.value).map_or_else(|_| undetermined(), Value::from);
        row.values.push(value);
        row.missed.push(!read.limits.is_empty() && !missed(engine, read, value).is_empty());
    }
    row
}
