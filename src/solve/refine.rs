//! Extra-precise iterative refinement (Demmel, Hida, Kahan, Li, Mukherjee and Riedy 2006): the
//! solution and the residual in twofold precision, the corrections from the double factors.
//!
//! Bounds rest on e − d = (I − M⁻¹A)·e − M⁻¹·δ, where e is the error, M the factored matrix, d the
//! computed correction and δ the rounding of the residual. The norm of the first factor is the
//! largest of what the corrections show, what a vector close to the worst one shows, and what
//! rounding is expected to make of it.

use crate::number::ComplexTwofold;
use crate::solve::condition;
use crate::solve::limits;
use crate::solve::{Pattern, SolveError, Solver, State, Trust};
use num_complex::Complex64;

/// Work space, allocated once.
pub(crate) struct Work {
    residual: Vec<ComplexTwofold>,
    correction: Vec<Complex64>,
    near_null: Vec<Complex64>,
    row_sums: Vec<f64>,
    sizes: Vec<f64>,
    probe: Vec<ComplexTwofold>,
    /// Most entries in any row.
    longest_row: usize,
}

impl Work {
    pub fn new(pattern: &Pattern) -> Self {
        let size = pattern.n;
        let mut entries = vec![0; size];
        pattern.row.iter().for_each(|&i| entries[i] += 1);
        Work {
            residual: vec![ComplexTwofold::ZERO; size],
            correction: vec![Complex64::ZERO; size],
            near_null: vec![Complex64::ZERO; size],
            row_sums: vec![0.0; size],
            sizes: vec![1.0; size],
            probe: vec![ComplexTwofold::ZERO; size],
            longest_row: entries.into_iter().max().unwrap_or(0),
        }
    }
}

/// How the iteration ended, in scaled unknowns.
struct Ended {
    steps: usize,
    contraction: f64,
    solution_size: f64,
    correction_size: f64,
}

/// As documented at [`Solver::solve_refined`].
pub(crate) fn solve(
    solver: &mut Solver,
    exact_values: &[ComplexTwofold],
    exact_rhs: &[ComplexTwofold],
    x: &mut [ComplexTwofold],
    error: &mut [f64],
) -> Result<Trust, SolveError> {
    if solver.pattern.n == 0 {
        return Ok(Trust { steps: 0, contraction: 0.0, condition: 1.0, relative_error: 0.0 });
    }
    let (condition, probe_contraction) = judge_matrix(solver, exact_values)?;
    let step = limits::TWOFOLD_STEP * (solver.work.longest_row + 2) as f64;
    let rounding = step * limits::ESTIMATOR_SAFETY;
    let floor = 2.0 * rounding * condition;
    // One right-hand side may never meet the worst direction, so theory has a say too.
    let expected = (limits::EXPECTED_CONTRACTION * condition).min(limits::SLOWEST_CONTRACTION);
    let least_contraction = probe_contraction.max(expected);
    let ended = iterate(solver, exact_values, exact_rhs, x, (floor, least_contraction))?;
    let relative_error = bound(solver, exact_rhs, x, error, (rounding, floor), &ended);
    Ok(Trust { steps: ended.steps, contraction: ended.contraction, condition, relative_error })
}

/// Writes the bounds; returns the largest relative to the solution.
fn bound(
    solver: &mut Solver,
    exact_rhs: &[ComplexTwofold],
    x: &[ComplexTwofold],
    error: &mut [f64],
    (rounding, floor): (f64, f64),
    ended: &Ended,
) -> f64 {
    if ended.solution_size == 0.0 {
        error.fill(0.0);
        return 0.0;
    }
    for (i, size) in solver.work.sizes.iter_mut().enumerate() {
        *size = x[i].norm() / solver.scaling.column[i];
    }
    // What the last correction left, and what the rounding of residuals hides.
    let left = ended.contraction * ended.correction_size;
    let hidden = floor * ended.solution_size;
    let good = |size: f64| size == 0.0 || hidden <= limits::GOOD_BOUND * size;
    let weighted = if solver.work.sizes.iter().all(|&size| good(size)) {
        f64::INFINITY
    } else {
        rounding * weighted_condition(solver, exact_rhs, ended.solution_size)
    };
    let mut largest = 0.0;
    for (i, bound) in error.iter_mut().enumerate() {
        let scale = solver.scaling.column[i];
        let by_weight = weighted * solver.work.sizes[i];
        let scaled = (left + hidden.min(by_weight)) / (1.0 - ended.contraction);
        *bound = scaled * scale + x[i].norm() * limits::TWOFOLD_SUM + limits::UNDERFLOW;
        largest = f64::max(largest, scaled);
    }
    largest / ended.solution_size
}

/// How much the rounding of residuals can move any component relative to its own size:
/// ‖diag(w)⁻¹·|A⁻¹|·(|A|·|x| + |b|)‖∞ in scaled unknowns, w the sizes of the components (no less
/// than a negligible part of the whole, which `sizes` is raised to).
fn weighted_condition(
    solver: &mut Solver,
    exact_rhs: &[ComplexTwofold],
    solution_size: f64,
) -> f64 {
    let work = &mut solver.work;
    for (i, sum) in work.row_sums.iter_mut().enumerate() {
        *sum = exact_rhs[i].norm() * solver.scaling.row[i];
    }
    for j in 0..solver.pattern.n {
        for at in solver.pattern.column_start[j]..solver.pattern.column_start[j + 1] {
            work.row_sums[solver.pattern.row[at]] += solver.scaled[at].norm() * work.sizes[j];
        }
    }
    for size in &mut work.sizes {
        *size = size.max(limits::NEGLIGIBLE_COMPONENT * solution_size);
    }
    condition::estimate(
        &mut solver.lu,
        &work.row_sums,
        &work.sizes,
        &mut work.near_null,
        &mut work.correction,
    )
}

/// Condition, and how well the factors fit the exact matrix where they fit worst; once a matrix.
fn judge_matrix(
    solver: &mut Solver,
    exact_values: &[ComplexTwofold],
) -> Result<(f64, f64), SolveError> {
    let weakest_column = match solver.state {
        State::Probed { weakest_column, condition, contraction } => {
            return judge(weakest_column, condition, contraction, solver.pattern.n);
        }
        State::Factored { weakest_column } => weakest_column,
        State::NotFactored => unreachable!("checked at the door"),
    };
    let work = &mut solver.work;
    work.row_sums.fill(0.0);
    work.sizes.fill(1.0);
    for (&i, value) in solver.pattern.row.iter().zip(&solver.scaled) {
        work.row_sums[i] += value.norm();
    }
    let condition = condition::estimate(
        &mut solver.lu,
        &work.row_sums,
        &work.sizes,
        &mut work.near_null,
        &mut work.correction,
    );
    let contraction = probe(solver, exact_values);
    solver.state = State::Probed { weakest_column, condition, contraction };
    judge(weakest_column, condition, contraction, solver.pattern.n)
}

fn judge(
    column: usize,
    condition: f64,
    contraction: f64,
    size: usize,
) -> Result<(f64, f64), SolveError> {
    let largest = limits::LARGEST_CONDITION_PART / (f64::EPSILON * (size as f64).sqrt());
    // Written so that not-a-number is refused.
    if condition <= largest && contraction <= limits::LARGEST_PROBE_CONTRACTION {
        Ok((condition, contraction))
    } else {
        Err(SolveError::Singular { column })
    }
}

/// ‖v − M⁻¹·A·v‖ / ‖v‖ for the vector v that the factored matrix M shrinks most, A exact. For a
/// singular A the product says nothing about v, and the quotient is of order 1.
fn probe(solver: &mut Solver, exact_values: &[ComplexTwofold]) -> f64 {
    let mut probe = std::mem::take(&mut solver.work.probe);
    for (i, value) in probe.iter_mut().enumerate() {
        *value = ComplexTwofold::from(solver.work.near_null[i] * solver.scaling.column[i]);
    }
    solver.work.residual.fill(ComplexTwofold::ZERO);
    subtract_product(solver, exact_values, &probe);
    solver.work.probe = probe;
    correct(solver);
    let work = &mut solver.work;
    let size = condition::largest_of(&work.near_null).1;
    for (image, v) in work.correction.iter_mut().zip(&work.near_null) {
        *image += v;
    }
    condition::largest_of(&work.correction).1 / size
}

/// residual −= A·x
fn subtract_product(solver: &mut Solver, exact_values: &[ComplexTwofold], x: &[ComplexTwofold]) {
    let Pattern { n, column_start, row } = &solver.pattern;
    let residual = &mut solver.work.residual;
    for j in 0..*n {
        if x[j].is_zero() {
            continue;
        }
        for at in column_start[j]..column_start[j + 1] {
            residual[row[at]] -= exact_values[at] * x[j];
        }
    }
}

/// correction = M⁻¹·residual, in scaled unknowns.
fn correct(solver: &mut Solver) {
    let work = &mut solver.work;
    for (i, value) in work.correction.iter_mut().enumerate() {
        *value = work.residual[i].to_complex() * solver.scaling.row[i];
    }
    solver.lu.solve(&mut work.correction);
}

/// Refines until what the last correction leaves is small. `floor` is what rounding of the residual
/// can cause, relative to the solution; no contraction below `least_contraction` is believed.
fn iterate(
    solver: &mut Solver,
    exact_values: &[ComplexTwofold],
    exact_rhs: &[ComplexTwofold],
    x: &mut [ComplexTwofold],
    (floor, least_contraction): (f64, f64),
) -> Result<Ended, SolveError> {
    x.fill(ComplexTwofold::ZERO);
    let mut seen: f64 = 0.0;
    let mut previous_size = f64::INFINITY;
    let mut relative = f64::INFINITY;
    for steps in 1..=limits::REFINEMENT_STEPS {
        solver.work.residual.copy_from_slice(exact_rhs);
        subtract_product(solver, exact_values, x);
        correct(solver);
        let correction_size = condition::largest_of(&solver.work.correction).1;
        let solution_size = add_correction(solver, x);
        if !correction_size.is_finite() || !solution_size.is_finite() {
            return Err(SolveError::NotAccurate { relative_error: f64::INFINITY });
        }
        relative = if correction_size == 0.0 { 0.0 } else { correction_size / solution_size };
        let at_floor = relative <= floor;
        let ratio = correction_size / previous_size;
        if !at_floor {
            seen = seen.max(ratio);
        }
        let contraction = (seen * limits::CONTRACTION_SAFETY)
            .max(least_contraction)
            .clamp(limits::UNIT, limits::LARGEST_CONTRACTION);
        let ended = Ended { steps, contraction, solution_size, correction_size };
        let left = contraction / (1.0 - contraction) * correction_size;
        if correction_size == 0.0 || steps > 1 && (at_floor || is_small(solver, x, left)) {
            return Ok(ended);
        }
        let stalls = ratio >= limits::SLOWEST_CONTRACTION;
        if (stalls || steps == limits::REFINEMENT_STEPS) && relative < limits::ACCEPTABLE_CORRECTION
        {
            return Ok(ended);
        }
        if stalls {
            break;
        }
        previous_size = correction_size;
    }
    Err(SolveError::NotAccurate { relative_error: relative })
}

/// x += correction; returns the size of x in scaled unknowns.
fn add_correction(solver: &Solver, x: &mut [ComplexTwofold]) -> f64 {
    let mut size = 0.0;
    for (i, value) in x.iter_mut().enumerate() {
        let scale = solver.scaling.column[i];
        *value += ComplexTwofold::from(solver.work.correction[i] * scale);
        size = f64::max(size, value.norm() / scale);
    }
    size
}

/// An error of this size in scaled unknowns is small beside every component, or at least beside
/// the whole solution.
fn is_small(solver: &Solver, x: &[ComplexTwofold], left: f64) -> bool {
    let size = |(value, scale): (&ComplexTwofold, &f64)| value.norm() / scale;
    let sizes = || x.iter().zip(&solver.scaling.column).map(size);
    let negligible = limits::NEGLIGIBLE_COMPONENT * sizes().fold(0.0, f64::max);
    sizes().all(|size| left <= limits::SMALL_CORRECTION * size.max(negligible))
}
