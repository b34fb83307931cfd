//! The jobs a plan does, each compiled once for every width of vectors.

use crate::solve::lanes::{
    Buffers, GOOD_BACKWARD_ERROR, Plan, Shape, eliminate, exact, judge, multifrontal,
};

/// Corrections a lane may get. One makes an elimination with bearable pivots as good as a
/// backward stable one (Skeel, 1980); the second is for those that were hardly bearable.
const REFINEMENTS: usize = 2;

/// What is to be done.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Job {
    /// Values, factors, solutions, judgement.
    Run,
    /// One correction with a residual in twice the precision.
    Refine,
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
    if job == Job::Refine {
        buffers.before.copy_from_slice(&buffers.solution);
        exact::residual(plan.shape.listing(), buffers);
        solve::<W, V, FMA>(plan, buffers, true);
        return judge::contraction(buffers);
    }
    let again = job != Job::Run;
    if job == Job::SolveTransposed {
        if let Shape::Rows(rows) = &plan.shape {
            eliminate::transposed::<W, FMA>(rows, buffers.driven.sides, buffers);
        }
        return;
    }
    let may_refine = !again && plan.shape.keeps_factors();
    let rounds = if may_refine { 1 + REFINEMENTS } else { 1 };
    for round in 0..rounds {
        let refining = round > 0;
        if refining {
            if buffers.backward.iter().all(|&error| error <= GOOD_BACKWARD_ERROR) {
                break;
            }
            buffers.before.copy_from_slice(&buffers.solution);
        }
        solve::<W, V, FMA>(plan, buffers, again || refining);
        if refining {
            correct(buffers);
        }
        if !again {
            judge::judge::<W, FMA>(plan.shape.listing(), buffers, may_refine);
        }
    }
}

/// Solves for the right-hand sides of the equations, or again for those in `carried`.
#[inline(always)]
fn solve<const W: usize, const V: usize, const FMA: bool>(
    plan: &Plan,
    buffers: &mut Buffers<W>,
    again: bool,
) {
    let sides = buffers.driven.sides;
    match &plan.shape {
        Shape::Rows(rows) => {
            if again {
                eliminate::carry::<W, FMA>(rows, sides, buffers);
            } else {
                eliminate::factor::<W, V, FMA>(rows, buffers);
            }
            eliminate::back::<W, FMA>(rows, sides, buffers);
        }
        Shape::Fronts(fronts) => multifrontal::solve::<W, V, FMA>(fronts, buffers, again),
    }
}

/// Adds the correction in the lanes that need it; the others stay as they are, so that no lane
/// depends on its neighbours.
#[inline(always)]
fn correct<const W: usize>(buffers: &mut Buffers<W>) {
    let Buffers { before, solution, backward, .. } = buffers;
    for (old, new) in before.iter().zip(solution) {
        for w in 0..W {
            // The judge leaves infinity where there is no number.
            let add = backward[w] > GOOD_BACKWARD_ERROR;
            new.re[w] = if add { old.re[w] + new.re[w] } else { old.re[w] };
            new.im[w] = if add { old.im[w] + new.im[w] } else { old.im[w] };
        }
    }
}
