//! Many frequencies at once: one plan for all, one lane of a vector for each.
//!
//! Every frequency of a sweep has the same pattern and can share one order of elimination. A
//! [`Plan`] is found once, at a representative frequency; a [`Workspace`] then solves as many
//! frequencies at once as there are lanes, and judges each lane. A lane whose own pivots would
//! have been others shows in its judgement, disturbs no other lane, and is left to the caller.
//!
//! Every lane sees the same operations whatever stands in the others, so results do not depend on
//! how frequencies are grouped.

mod dense;
mod dispatch;
mod eliminate;
mod judge;
mod lane;
mod pivots;
mod rows;
#[cfg(test)]
mod tests;
mod values;
mod work;

pub use crate::solve::lanes::dispatch::Instructions;
pub use crate::solve::lanes::lane::Lane;
pub use crate::solve::lanes::values::{Affine, Equations};

use crate::number::ComplexTwofold;
use crate::solve::Pattern;
use crate::solve::lanes::dispatch::dispatch;
use crate::solve::lanes::rows::RowPlan;
use crate::solve::lanes::values::{Driven, Entries};
use crate::solve::lanes::work::Job;
use num_complex::Complex64;
use thiserror::Error;

/// Backward error up to which a lane is good: hundreds of rounding errors, as a healthy
/// elimination leaves them; pivots that do not suit a frequency leave orders of magnitude more.
pub const GOOD_BACKWARD_ERROR: f64 = 1e-13;

/// Bytes of factors up to which sixteen lanes pay; beyond, they crowd the cache.
const SIXTEEN_LANES_BYTES: usize = 4 << 20;

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
    /// Number of lanes, 8 or 16, if it is not to be chosen.
    pub lanes: Option<usize>,
    /// Instructions, if they are not to be chosen.
    pub instructions: Option<Instructions>,
}

/// The order of elimination of one pattern, compiled.
#[derive(Clone, Debug)]
pub struct Plan {
    n: usize,
    rows: RowPlan,
    lanes: usize,
    instructions: Instructions,
}

/// What one lane's solution is worth.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Verdict {
    /// Largest componentwise backward error; infinite where the solution is not a number.
    pub backward_error: f64,
    /// Largest multiplier of the elimination: how much an earlier row could grow a later one.
    pub largest_multiplier: f64,
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
    driven: Driven,
    frequency: [f64; W],
    extras: Vec<Lane<W>>,
    factors: Vec<Lane<W>>,
    dense: Vec<Lane<W>>,
    /// Right-hand sides in the order of elimination.
    carried: Vec<Lane<W>>,
    /// Solutions in the order of the unknowns.
    solution: Vec<Lane<W>>,
    backward: [f64; W],
    /// Square of the largest multiplier.
    growth: [f64; W],
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
            && equations.right.len() % (*n).max(1) == 0
            && extras.len() == equations.extras()
            && equations.extra_entries.iter().all(|&e| (e as usize) < row.len())
            && equations.extra_right.iter().all(|&e| (e as usize) < equations.right.len());
        if !fits {
            return Err(PlanError::Mismatch);
        }
        let f = ComplexTwofold::from(frequency_hz);
        let at = |a: &Affine| (a.constant + a.slope * f).to_complex();
        let mut values: Vec<Complex64> = equations.entries.iter().map(at).collect();
        for (&entry, extra) in equations.extra_entries.iter().zip(extras) {
            values[entry as usize] += extra;
        }
        let found = pivots::find(*n, column_start, row, &values)
            .map_err(|none| PlanError::Singular { column: none.column })?;
        let rows = RowPlan::new(*n, column_start, row, &found, uses.further_solves);
        let small = rows.storage * size_of::<Lane<16>>() <= SIXTEEN_LANES_BYTES;
        let lanes = match uses.lanes {
            Some(lanes) => lanes,
            None if small && rows.dense.size == 0 => 16,
            None => 8,
        };
        let instructions = uses.instructions.unwrap_or_else(Instructions::widest);
        Ok(Plan { n: *n, rows, lanes, instructions })
    }

    /// Frequencies solved at once.
    pub fn lanes(&self) -> usize {
        self.lanes
    }

    /// Complex multiply-adds of one factorisation and one solve at one frequency.
    pub fn work(&self) -> u64 {
        self.rows.work
    }

    /// Makes room, and takes over the values of the equations.
    pub fn workspace(&self, equations: &Equations) -> Workspace {
        let driven = Driven::new(&self.rows.listing.rows, equations);
        let sides = driven.sides;
        let entries = Entries::new(&self.rows.listing.slots, equations);
        let extras = equations.extras();
        let width = match self.lanes {
            16 => Width::Sixteen(Box::new(self.buffers(entries, driven, extras))),
            _ => Width::Eight(Box::new(self.buffers(entries, driven, extras))),
        };
        let verdicts = vec![Verdict::default(); self.lanes];
        Workspace { width, n: self.n, sides, verdicts }
    }

    fn buffers<const W: usize>(
        &self,
        entries: Entries,
        driven: Driven,
        extras: usize,
    ) -> Buffers<W> {
        let room = |lanes: usize| vec![Lane::ZERO; lanes];
        Buffers {
            frequency: [0.0; W],
            extras: room(extras),
            factors: room(self.rows.storage),
            dense: room(self.rows.dense.area()),
            carried: room(self.n * driven.sides),
            solution: room(self.n * driven.sides),
            backward: [f64::INFINITY; W],
            growth: [0.0; W],
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
                *verdict = Verdict {
                    backward_error: buffers.backward[lane],
                    largest_multiplier: buffers.growth[lane].sqrt(),
                };
            }
        });
        &workspace.verdicts[..used]
    }

    /// Solves further right-hand sides, set by [`Workspace::set_right`], on the factors of the
    /// last run. The plan must have been made for further solves.
    pub fn solve(&self, workspace: &mut Workspace) {
        assert!(self.rows.keeps_lower, "the plan was made without further solves");
        either!(&mut workspace.width, buffers => {
            // They were set in the order of the equations.
            for (order, &row) in self.rows.listing.rows.iter().enumerate() {
                for side in 0..workspace.sides {
                    buffers.carried[order * workspace.sides + side] =
                        buffers.solution[row as usize * workspace.sides + side];
                }
            }
            dispatch(self.instructions, self, buffers, Job::Solve);
        });
    }

    /// As [`Plan::solve`], with the matrix transposed.
    pub fn solve_transposed(&self, workspace: &mut Workspace) {
        assert!(self.rows.keeps_lower, "the plan was made without further solves");
        either!(&mut workspace.width, buffers => {
            dispatch(self.instructions, self, buffers, Job::SolveTransposed);
            for (order, &row) in self.rows.listing.rows.iter().enumerate() {
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
