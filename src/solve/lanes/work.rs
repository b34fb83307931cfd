//! The jobs a plan does, each compiled once for every width of vectors.

use crate::solve::lanes::{Buffers, Plan, Shape, eliminate, judge, multifrontal};

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
    match (&plan.shape, job) {
        (Shape::Rows(rows), Job::Run) => {
            eliminate::factor::<W, V, FMA>(rows, buffers);
            eliminate::back::<W, FMA>(rows, sides, buffers);
        }
        (Shape::Rows(rows), Job::Solve) => {
            eliminate::carry::<W, FMA>(rows, sides, buffers);
            eliminate::back::<W, FMA>(rows, sides, buffers);
        }
        (Shape::Rows(rows), Job::SolveTransposed) => {
            eliminate::transposed::<W, FMA>(rows, sides, buffers);
        }
        (Shape::Fronts(fronts), _) => multifrontal::solve::<W, V, FMA>(fronts, buffers),
    }
    if job == Job::Run {
        judge::judge::<W, FMA, false>(plan.shape.listing(), buffers);
    }
}
