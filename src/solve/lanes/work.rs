//! The jobs a plan does, each compiled once for every width of vectors.

use crate::solve::lanes::{Buffers, Plan, eliminate, judge};

/// What is to be done.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Job {
    /// Values, factors, solutions, judgement.
    Run,
    /// Other right-hand sides on the factors that stand.
    Solve,
    /// The same with the matrix transposed.
    SolveTransposed,
}

/// Does one.
#[inline(always)]
pub(super) fn work<const W: usize, const V: usize, const FMA: bool>(
    plan: &Plan,
    buffers: &mut Buffers<W>,
    job: Job,
) {
    let sides = buffers.driven.sides;
    match job {
        Job::Run => {
            eliminate::factor::<W, V, FMA>(&plan.rows, buffers);
            eliminate::back::<W, FMA>(&plan.rows, sides, buffers);
            judge::judge::<W, FMA>(&plan.rows.listing, buffers);
        }
        Job::Solve => {
            eliminate::carry::<W, FMA>(&plan.rows, sides, buffers);
            eliminate::back::<W, FMA>(&plan.rows, sides, buffers);
        }
        Job::SolveTransposed => eliminate::transposed::<W, FMA>(&plan.rows, sides, buffers),
    }
}
