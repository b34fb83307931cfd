//! Many frequencies at once: one plan for all, one lane of a vector for each.
//!
//! Every frequency of a sweep has the same pattern and can share one order of elimination. A
//! [`Plan`] is found once, at a representative frequency; a [`Workspace`] then solves as many
//! frequencies at once as there are lanes, and judges each lane. A lane whose own pivots would
//! have been others shows in its judgement, disturbs no other lane, and is left to the caller.
//!
//! Every lane sees the same operations whatever stands in the others, so results do not depend on
//! how frequencies are grouped.

// Loops that count are the plainest way to say what every lane does, and are what the compiler
// turns into vector instructions.
#![allow(clippy::needless_range_loop, clippy::manual_memcpy)]

mod dense;
mod dispatch;
mod eliminate;
mod exact;
mod fronts;
mod judge;
mod lane;
mod multifrontal;
mod pivots;
mod rows;
#[cfg(test)]
mod tests;
mod values;
mod work;

pub use crate::solve::lanes::dispatch::Instructions;
pub use crate::solve::lanes::lane::Lane;
pub use crate::solve::lanes::values::Equations;

use crate::solve::Pattern;
use crate::solve::lanes::dispatch::dispatch;
use crate::solve::lanes::exact::ExactValues;
use crate::solve::lanes::fronts::{Columns, FrontPlan};
use crate::solve::lanes::rows::RowPlan;
use crate::solve::lanes::values::{Driven, Entries, Listing};
use crate::solve::lanes::work::Job;
use num_complex::Complex64;
use thiserror::Error;

/// Backward error up to which a lane is good: hundreds of rounding errors, as a healthy
/// elimination leaves them; pivots that do not suit a frequency leave orders of magnitude more.
pub const GOOD_BACKWARD_ERROR: f64 = 1e-13;

/// Bytes of factors up to which sixteen lanes pay; beyond, they crowd the cache.
const SIXTEEN_LANES_BYTES: usize = 4 << 20;

/// Multiply-adds for each unknown from which fronts pay; below, their upkeep outweighs them.
const FRONTS_PAY: u64 = 40;

/// Share of the work of the general plan up to which fronts pay: they move more memory.
const FRONTS_SHARE: f64 = 0.6;

/// Backward error at the sample up to which pivots along the diagonal do: what one refinement
/// with a residual in twice the precision makes good.
const SUITABLE_BACKWARD_ERROR: f64 = 1e-10;

/// Why there is no plan.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum PlanError {
    /// The sample has no pivot left.
    #[error("the sample matrix is singular at column {column}")]
    Singular {
        /// A column that nothing is left in.
        column: usize,
    },
    /// The numbers of the parts do not fit together.
    #[error("the equations do not fit the pattern")]
    Mismatch,
}

/// What a plan is made for.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Uses {
    /// Further right-hand sides, or transposed ones, will be solved on the same factors.
    pub further_solves: bool,
    /// [`Plan::refine`] will be used.
    pub refine: bool,
    /// Number of lanes, 8 or 16, if it is not to be chosen.
    pub lanes: Option<usize>,
    /// Instructions, if they are not to be chosen.
    pub instructions: Option<Instructions>,
}

/// The order of elimination of one pattern, compiled.
#[derive(Clone, Debug)]
pub struct Plan {
    n: usize,
    shape: Shape,
    lanes: usize,
    instructions: Instructions,
}

#[derive(Clone, Debug)]
enum Shape {
    Rows(RowPlan),
    Fronts(FrontPlan),
}

impl Shape {
    fn listing(&self) -> &Listing {
        match self {
            Shape::Rows(rows) => &rows.listing,
            Shape::Fronts(fronts) => &fronts.listing,
        }
    }

    /// Whether further right-hand sides can be solved on the factors.
    fn keeps_factors(&self) -> bool {
        match self {
            Shape::Rows(rows) => rows.keeps_lower,
            Shape::Fronts(_) => true,
        }
    }

    fn work(&self) -> u64 {
        match self {
            Shape::Rows(rows) => rows.work,
            Shape::Fronts(fronts) => fronts.work,
        }
    }
}

/// What one lane's solution is worth.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Verdict {
    /// Largest componentwise backward error; infinite where the solution is not a number.
    pub backward_error: f64,
}

impl Verdict {
    /// The lane may be used.
    pub fn is_good(&self) -> bool {
        self.backward_error <= GOOD_BACKWARD_ERROR
    }
}

/// Everything of one width that is kept from one batch to the next.
#[derive(Clone, Debug)]
struct Buffers<const W: usize> {
    entries: Entries,
    /// Entries in the order in which fronts take them up.
    front_entries: Entries,
    driven: Driven,
    frequency: [f64; W],
    extras: Vec<Lane<W>>,
    /// What was rounded off the further values.
    extras_low: Vec<Lane<W>>,
    exact: ExactValues,
    factors: Vec<Lane<W>>,
    /// The block at work.
    dense: Vec<Lane<W>>,
    /// Contributions of fronts to their parents.
    waiting: Vec<Lane<W>>,
    /// Right-hand sides in the order of elimination.
    carried: Vec<Lane<W>>,
    /// Right-hand sides of one row.
    right: Vec<Lane<W>>,
    /// Solutions in the order of the unknowns.
    solution: Vec<Lane<W>>,
    /// Solutions before a correction.
    before: Vec<Lane<W>>,
    backward: [f64; W],
    /// What the first correction added to `before`, and the second.
    low: Vec<Lane<W>>,
    /// Largest first correction relative to its unknown, and what the last one leaves of it.
    correction: [f64; W],
    left: [f64; W],
}

#[derive(Clone, Debug)]
enum Width {
    Eight(Box<Buffers<8>>),
    Sixteen(Box<Buffers<16>>),
}

/// Does the same to the buffers of either width.
macro_rules! either {
    ($width:expr, $buffers:ident => $body:expr) => {
        match $width {
            Width::Eight($buffers) => $body,
            Width::Sixteen($buffers) => $body,
        }
    };
}

/// Room for one batch of frequencies, and the values of one set of equations.
#[derive(Clone, Debug)]
pub struct Workspace {
    width: Width,
    n: usize,
    sides: usize,
    verdicts: Vec<Verdict>,
}

impl Plan {
    /// Finds the order of elimination at `frequency_hz`, which should stand for all (the middle
    /// of the band, by ratio). `extras` are the further values there.
    pub fn new(
        pattern: &Pattern,
        equations: &Equations,
        frequency_hz: f64,
        extras: &[Complex64],
        uses: Uses,
    ) -> Result<Self, PlanError> {
        let Pattern { n, column_start, row } = pattern;
        let fits = equations.entries.len() == row.len()
            && equations.right.len().is_multiple_of((*n).max(1))
            && extras.len() == equations.extras()
            && equations.extra_entries.iter().all(|&e| (e as usize) < row.len())
            && equations.extra_right.iter().all(|&e| (e as usize) < equations.right.len());
        if !fits {
            return Err(PlanError::Mismatch);
        }
        let mut values: Vec<Complex64> =
            equations.entries.iter().map(|a| a.at(frequency_hz).to_complex()).collect();
        for (&entry, extra) in equations.extra_entries.iter().zip(extras) {
            values[entry as usize] += extra;
        }
        let found = pivots::find(*n, column_start, row, &values)
            .map_err(|none| PlanError::Singular { column: none.column })?;
        // Beside a dense block the multipliers of the sparse rows cost next to nothing.
        let keeps = uses.refine || uses.further_solves || !found.dense_rows.is_empty();
        let rows = RowPlan::new(*n, column_start, row, &found, keeps);
        let small = rows.storage * size_of::<Lane<16>>() <= SIXTEEN_LANES_BYTES;
        let lanes = match uses.lanes {
            Some(lanes) => lanes,
            None if small && rows.dense.size == 0 => 16,
            None => 8,
        };
        let instructions = uses.instructions.unwrap_or_else(Instructions::widest);
        let heavy = rows.work > FRONTS_PAY * *n as u64 && !uses.further_solves;
        let plan = Plan { n: *n, shape: Shape::Rows(rows), lanes, instructions };
        if heavy {
            let columns = Columns { n: *n, start: column_start, row };
            let sides = equations.right.len() / *n;
            if let Some(fronts) = FrontPlan::new(columns, equations, sides)
                && (fronts.work as f64) < FRONTS_SHARE * plan.work() as f64
            {
                let plan = Plan { n: *n, shape: Shape::Fronts(fronts), lanes, instructions };
                if plan.suits(equations, frequency_hz, extras) {
                    return Ok(plan);
                }
            }
        }
        Ok(plan)
    }

    /// Whether pivots along the diagonal do for the sample.
    fn suits(&self, equations: &Equations, frequency_hz: f64, extras: &[Complex64]) -> bool {
        let mut workspace = self.workspace(equations);
        for (which, &value) in extras.iter().enumerate() {
            (0..self.lanes).for_each(|lane| workspace.set_extra(which, lane, value));
        }
        let verdicts = self.run(&mut workspace, &[frequency_hz]);
        verdicts.iter().all(|v| v.backward_error < SUITABLE_BACKWARD_ERROR)
    }

    /// Frequencies solved at once.
    pub fn lanes(&self) -> usize {
        self.lanes
    }

    /// Complex multiply-adds of one factorisation and one solve at one frequency.
    pub fn work(&self) -> u64 {
        self.shape.work()
    }

    /// The matrix equals its transpose, and half of the work is spared.
    pub fn is_symmetric(&self) -> bool {
        matches!(self.shape, Shape::Fronts(_))
    }

    /// Makes room, and takes over the values of the equations.
    pub fn workspace(&self, equations: &Equations) -> Workspace {
        let listing = self.shape.listing();
        let driven = Driven::new(&listing.rows, equations);
        let sides = driven.sides;
        let entries = Entries::new(&listing.slots, equations);
        let width = match self.lanes {
            16 => Width::Sixteen(Box::new(self.buffers(equations, entries, driven))),
            _ => Width::Eight(Box::new(self.buffers(equations, entries, driven))),
        };
        let verdicts = vec![Verdict::default(); self.lanes];
        Workspace { width, n: self.n, sides, verdicts }
    }

    /// One right-hand side, and factors that stay.
    fn can_refine(&self) -> bool {
        self.shape.keeps_factors()
    }

    fn buffers<const W: usize>(
        &self,
        equations: &Equations,
        entries: Entries,
        driven: Driven,
    ) -> Buffers<W> {
        let listing = self.shape.listing();
        let (factors, block, waiting, front_slots): (_, _, _, &[u32]) = match &self.shape {
            Shape::Rows(rows) => (rows.storage, rows.dense.area(), 0, &[]),
            Shape::Fronts(fronts) => {
                (fronts.storage, fronts.largest, fronts.waiting, &fronts.slots)
            }
        };
        let room = |lanes: usize| vec![Lane::ZERO; lanes];
        Buffers {
            frequency: [0.0; W],
            extras: room(equations.extras()),
            extras_low: room(equations.extras()),
            exact: if self.can_refine() {
                ExactValues::new(listing, equations)
            } else {
                ExactValues::default()
            },
            factors: room(factors),
            dense: room(block),
            waiting: room(waiting),
            front_entries: Entries::new(front_slots, equations),
            right: room(driven.sides),
            carried: room(self.n * driven.sides),
            solution: room(self.n * driven.sides),
            before: room(if self.shape.keeps_factors() { self.n * driven.sides } else { 0 }),
            backward: [f64::INFINITY; W],
            low: room(if self.shape.keeps_factors() { self.n * driven.sides } else { 0 }),
            correction: [f64::INFINITY; W],
            left: [f64::INFINITY; W],
            entries,
            driven,
        }
    }

    /// Solves at up to as many frequencies as there are lanes, and judges each. Further values
    /// must have been set for all of them.
    pub fn run<'w>(&self, workspace: &'w mut Workspace, frequencies_hz: &[f64]) -> &'w [Verdict] {
        let used = frequencies_hz.len().min(self.lanes);
        let Some(last) = used.checked_sub(1) else { return &[] };
        either!(&mut workspace.width, buffers => {
            for (lane, frequency) in buffers.frequency.iter_mut().enumerate() {
                *frequency = frequencies_hz[lane.min(last)];
            }
            dispatch(self.instructions, self, buffers, Job::Run);
            for (lane, verdict) in workspace.verdicts.iter_mut().enumerate() {
                *verdict = Verdict { backward_error: buffers.backward[lane] };
            }
        });
        &workspace.verdicts[..used]
    }

    /// After [`Plan::run`]: corrects every lane once with a residual in twice the working
    /// precision (Demmel and others, 2006). The solution is then [`Workspace::refined`]. The plan
    /// must have been made for further solves and have one right-hand side.
    pub fn refine(&self, workspace: &mut Workspace) {
        assert!(self.can_refine() && workspace.sides == 1, "a plan whose factors stay");
        either!(&mut workspace.width, buffers => {
            dispatch(self.instructions, self, buffers, Job::Refine);
        });
    }

    /// Solves further right-hand sides, set by [`Workspace::set_right`], on the factors of the
    /// last run. The plan must have been made for further solves.
    pub fn solve(&self, workspace: &mut Workspace) {
        let listing = self.listing_for_further_solves();
        either!(&mut workspace.width, buffers => {
            // They were set in the order of the equations.
            for (order, &row) in listing.rows.iter().enumerate() {
                for side in 0..workspace.sides {
                    buffers.carried[order * workspace.sides + side] =
                        buffers.solution[row as usize * workspace.sides + side];
                }
            }
            dispatch(self.instructions, self, buffers, Job::Solve);
        });
    }

    fn listing_for_further_solves(&self) -> &Listing {
        match &self.shape {
            Shape::Rows(rows) if rows.keeps_lower => &rows.listing,
            _ => panic!("the plan was made without further solves"),
        }
    }

    /// As [`Plan::solve`], with the matrix transposed.
    pub fn solve_transposed(&self, workspace: &mut Workspace) {
        let listing = self.listing_for_further_solves();
        either!(&mut workspace.width, buffers => {
            dispatch(self.instructions, self, buffers, Job::SolveTransposed);
            for (order, &row) in listing.rows.iter().enumerate() {
                for side in 0..workspace.sides {
                    buffers.solution[row as usize * workspace.sides + side] =
                        buffers.carried[order * workspace.sides + side];
                }
            }
        });
    }
}

impl Workspace {
    /// Frequencies solved at once.
    pub fn lanes(&self) -> usize {
        self.verdicts.len()
    }

    /// Number of right-hand sides.
    pub fn sides(&self) -> usize {
        self.sides
    }

    /// Sets a further value of one lane, numbered as [`Equations::extras`] says.
    pub fn set_extra(&mut self, which: usize, lane: usize, value: Complex64) {
        either!(&mut self.width, buffers => buffers.extras[which].set(lane, value));
    }

    /// The rounded-off part of a further value of one lane.
    pub fn set_extra_low(&mut self, which: usize, lane: usize, value: Complex64) {
        either!(&mut self.width, buffers => buffers.extras_low[which].set(lane, value));
    }

    /// After [`Plan::refine`], for one lane: the largest first correction of an unknown relative to
    /// it, c, and a factor r. An unknown x with the correction d is off by about
    /// r·(|d| + c·|x|).
    pub fn left(&self, lane: usize) -> (f64, f64) {
        either!(&self.width, buffers => (buffers.correction[lane], buffers.left[lane]))
    }

    /// After [`Plan::refine`]: |re| + |im| of one unknown in one lane.
    pub fn size(&self, unknown: usize, lane: usize) -> f64 {
        let x = either!(&self.width, buffers => buffers.before[unknown].get(lane));
        x.re.abs() + x.im.abs()
    }

    /// After [`Plan::refine`]: the solution of one unknown in one lane, and its correction.
    pub fn refined(&self, unknown: usize, lane: usize) -> (Complex64, Complex64) {
        either!(&self.width, buffers => {
            (buffers.before[unknown].get(lane), buffers.low[unknown].get(lane))
        })
    }

    /// The solution of one unknown in one lane for the first right-hand side.
    pub fn solution(&self, unknown: usize, lane: usize) -> Complex64 {
        self.solution_of(0, unknown, lane)
    }

    /// The solution of one unknown in one lane for any right-hand side.
    pub fn solution_of(&self, side: usize, unknown: usize, lane: usize) -> Complex64 {
        either!(&self.width, buffers => buffers.solution[unknown * self.sides + side].get(lane))
    }

    /// Sets a value of a right-hand side for [`Plan::solve`] or [`Plan::solve_transposed`]. It
    /// takes the place of the solution.
    pub fn set_right(&mut self, side: usize, row: usize, lane: usize, value: Complex64) {
        debug_assert!(row < self.n, "a row of the equations");
        either!(&mut self.width, buffers => {
            buffers.solution[row * self.sides + side].set(lane, value);
        });
    }
}
