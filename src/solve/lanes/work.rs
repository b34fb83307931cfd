//! The jobs a plan does, each compiled once for every width of vectors.

use crate::solve::lanes::lane::Lane;
use crate::solve::lanes::{
    Buffers, GOOD_BACKWARD_ERROR, Plan, Shape, eliminate, exact, judge, multifrontal,
};

/// Corrections a lane may get. One makes an elimination with bearable pivots as good as a
/// backward stable one (Skeel, 1980); the second is for those that were hardly bearable.
const REFINEMENTS: usize = 2;

/// Corrections a refined lane gets at most.
const MOST_CORRECTIONS: i32 = 5;

/// Relative error left from which on no more corrections are made: far below what a double shows.
const ENOUGH: f64 = 1e-20;

/// Largest first correction, relative to its unknown, of factors that are of any use.
const LARGEST_CORRECTION: f64 = 1e-2;

/// What each further correction must shrink to.
const SHRINKS: f64 = 0.1;

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
        return refine::<W, V, FMA>(plan, buffers);
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

/// Corrects every lane once, and those that need it again. A lane that does not need it stays as
/// it is whatever its neighbours need.
#[inline(always)]
fn refine<const W: usize, const V: usize, const FMA: bool>(plan: &Plan, buffers: &mut Buffers<W>) {
    buffers.before.copy_from_slice(&buffers.solution);
    buffers.low.fill(Lane::ZERO);
    exact::residual(plan.shape.listing(), buffers);
    solve::<W, V, FMA>(plan, buffers, true);
    let first = judge::contraction(&buffers.before, &buffers.solution);
    buffers.low.copy_from_slice(&buffers.solution);
    buffers.correction = first;
    buffers.left = first;
    let mut shrunk = [1.0; W];
    for step in 1..MOST_CORRECTIONS {
        let mut again = [false; W];
        for w in 0..W {
            let done = buffers.left[w] * first[w] <= ENOUGH;
            again[w] = !done && first[w] <= LARGEST_CORRECTION && shrunk[w] <= 1.0;
        }
        if !again.contains(&true) {
            return;
        }
        exact::residual(plan.shape.listing(), buffers);
        solve::<W, V, FMA>(plan, buffers, true);
        let ratio = judge::contraction(&buffers.low, &buffers.solution);
        for w in (0..W).filter(|w| again[*w]) {
            // A correction that does not shrink shows that the factors are of no use here.
            if ratio[w] > SHRINKS * shrunk[w] {
                shrunk[w] = f64::INFINITY;
                continue;
            }
            shrunk[w] = ratio[w];
            buffers.left[w] = first[w] * ratio[w].max(first[w].powi(step));
            for (low, correction) in buffers.low.iter_mut().zip(&buffers.solution) {
                low.re[w] += correction.re[w];
                low.im[w] += correction.im[w];
            }
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
