//! The solver against exact rational arithmetic, and against what must be refused.

use crate::number::{ComplexTwofold, Twofold};
use crate::solve::lu::{Lu, Order};
use crate::solve::{Pattern, SolveError, Solver, Trust};
use num_bigint::BigInt;
use num_complex::{Complex, Complex64};
use num_rational::BigRational;
use num_traits::{One, Zero};

type Exact = Complex<BigRational>;

/// A small system as entries (row, column, value).
struct Problem {
    pattern: Pattern,
    values: Vec<ComplexTwofold>,
}

impl Problem {
    fn new(n: usize, mut entries: Vec<(usize, usize, ComplexTwofold)>) -> Self {
        entries.sort_by_key(|&(i, j, _)| (j, i));
        let mut column_start = vec![0; n + 1];
        entries.iter().for_each(|&(_, j, _)| column_start[j + 1] += 1);
        (0..n).for_each(|j| column_start[j + 1] += column_start[j]);
        let row = entries.iter().map(|&(i, _, _)| i).collect();
        let values = entries.iter().map(|&(_, _, value)| value).collect();
        Problem { pattern: Pattern { n, column_start, row }, values }
    }

    /// All entries of a dense matrix, zeros included.
    fn dense<const N: usize>(rows: [[f64; N]; N]) -> Self {
        let at = |k: usize| (k / N, k % N, rows[k / N][k % N].into());
        Self::new(N, (0..N * N).map(at).collect())
    }

    fn doubles(&self) -> Vec<Complex64> {
        self.values.iter().map(|value| value.to_complex()).collect()
    }

    fn solver(&self) -> Solver {
        Solver::new(self.pattern.clone()).expect("no empty row or column")
    }

    fn entries(&self) -> impl Iterator<Item = (usize, usize, ComplexTwofold)> + '_ {
        (0..self.pattern.n).flat_map(move |j| {
            let range = self.pattern.column_start[j]..self.pattern.column_start[j + 1];
            range.map(move |at| (self.pattern.row[at], j, self.values[at]))
        })
    }

    /// Factors and solves with refinement.
    fn refine(
        &self,
        rhs: &[ComplexTwofold],
    ) -> Result<(Vec<ComplexTwofold>, Vec<f64>, Trust), SolveError> {
        let mut solver = self.solver();
        solver.factor(&self.doubles())?;
        let n = self.pattern.n;
        let (mut x, mut error) = (vec![ComplexTwofold::ZERO; n], vec![0.0; n]);
        let trust = solver.solve_refined(&self.values, rhs, &mut x, &mut error)?;
        Ok((x, error, trust))
    }

    /// Gaussian elimination in rational arithmetic.
    fn exact_solution(&self, rhs: &[ComplexTwofold]) -> Vec<Exact> {
        let n = self.pattern.n;
        let mut rows: Vec<Vec<Exact>> = vec![vec![Exact::zero(); n + 1]; n];
        self.entries().for_each(|(i, j, value)| rows[i][j] = exact(value));
        rhs.iter().enumerate().for_each(|(i, &value)| rows[i][n] = exact(value));
        for step in 0..n {
            let pivot = (step..n).find(|&i| !rows[i][step].is_zero()).expect("regular");
            rows.swap(step, pivot);
            let pivot_row = rows[step].clone();
            for (i, row) in rows.iter_mut().enumerate() {
                if i == step || row[step].is_zero() {
                    continue;
                }
                let factor = row[step].clone() / pivot_row[step].clone();
                for k in step..=n {
                    row[k] = row[k].clone() - factor.clone() * pivot_row[k].clone();
                }
            }
        }
        (0..n).map(|i| rows[i][n].clone() / rows[i][i].clone()).collect()
    }

    /// Solves and checks each bound; returns the largest bound relative to its component.
    #[track_caller]
    fn assert_bounds_hold(&self, rhs: &[ComplexTwofold]) -> (f64, Trust) {
        let (x, error, trust) = self.refine(rhs).expect("solvable");
        let mut worst = 0.0;
        for (i, wanted) in self.exact_solution(rhs).into_iter().enumerate() {
            let off = exact(x[i]) - wanted;
            let bound = BigRational::from_float(error[i]).expect("finite bound");
            let off_squared = off.re.clone() * off.re + off.im.clone() * off.im;
            assert!(off_squared <= bound.clone() * bound, "component {i}: {trust:?}");
            worst = f64::max(worst, error[i] / x[i].norm());
        }
        (worst, trust)
    }
}

fn exact(value: ComplexTwofold) -> Exact {
    let part = |part: f64| BigRational::from_float(part).expect("finite");
    let whole = |value: Twofold| part(value.hi) + part(value.lo);
    Complex::new(whole(value.re), whole(value.im))
}

fn random(dice: &mut fastrand::Rng) -> ComplexTwofold {
    let mut part = || {
        let hi = dice.f64() - 0.5;
        Twofold::sum(hi, hi * dice.f64() * 2f64.powi(-54))
    };
    ComplexTwofold { re: part(), im: part() }
}

/// A full diagonal and a few entries a column elsewhere.
fn random_problem(n: usize, dice: &mut fastrand::Rng) -> Problem {
    let mut entries = Vec::new();
    for j in 0..n {
        for i in 0..n {
            if i == j || dice.usize(..n) < 3 {
                entries.push((i, j, random(dice)));
            }
        }
    }
    Problem::new(n, entries)
}

fn random_vector(n: usize, dice: &mut fastrand::Rng) -> Vec<ComplexTwofold> {
    (0..n).map(|_| random(dice)).collect()
}

/// Conductances along random branches between `n` nodes, short binary fractions so that sums are
/// exact; nothing leads to the reference.
fn floating_network(n: usize, dice: &mut fastrand::Rng) -> Problem {
    let mut dense = vec![vec![0.0; n]; n];
    for a in 1..n {
        for b in [a - 1, dice.usize(..a)] {
            let conductance = f64::from(dice.u32(1..1 << 20)) / 1024.0;
            dense[a][a] += conductance;
            dense[b][b] += conductance;
            dense[a][b] -= conductance;
            dense[b][a] -= conductance;
        }
    }
    let all = (0..n * n).map(|k| (k / n, k % n, dense[k / n][k % n]));
    Problem::new(n, all.filter(|e| e.2 != 0.0).map(|(i, j, v)| (i, j, v.into())).collect())
}

#[test]
fn residuals_are_small_at_every_size_plain_and_transposed() {
    let mut dice = fastrand::Rng::with_seed(11);
    for n in [1, 2, 3, 20, 257] {
        let problem = random_problem(n, &mut dice);
        let mut solver = problem.solver();
        // Twice: the second factorisation reuses everything of the first.
        for _ in 0..2 {
            let health = solver.factor(&problem.doubles()).expect("regular");
            assert!(health.pivot_ratio > 0.0 && health.growth < 1e6 && health.fill >= n);
        }
        let rhs: Vec<Complex64> =
            random_vector(n, &mut dice).iter().map(|value| value.to_complex()).collect();
        for transpose in [false, true] {
            let mut x = rhs.clone();
            let mut residual = rhs.clone();
            if transpose {
                solver.solve_transpose_in_place(&mut x);
            } else {
                solver.solve_in_place(&mut x);
            }
            for (i, j, value) in problem.entries() {
                let (to, from) = if transpose { (j, i) } else { (i, j) };
                residual[to] -= value.to_complex() * x[from];
            }
            let size = x.iter().map(|value| value.norm()).fold(1.0, f64::max);
            assert!(residual.iter().all(|r| r.norm() <= 1e-12 * size), "n = {n}");
        }
    }
}

#[test]
fn an_empty_system_is_solved() {
    let problem = Problem::new(0, Vec::new());
    assert!(problem.refine(&[]).is_ok());
}

#[test]
fn error_bounds_hold_on_small_random_systems() {
    let mut dice = fastrand::Rng::with_seed(12);
    for round in 0..48 {
        let n = 1 + round % 8;
        let problem = random_problem(n, &mut dice);
        let (worst, trust) = problem.assert_bounds_hold(&random_vector(n, &mut dice));
        assert!(worst < 1e-19, "n = {n}: {worst:e} {trust:?}");
    }
}

#[test]
fn error_bounds_hold_on_badly_scaled_systems() {
    let mut dice = fastrand::Rng::with_seed(13);
    for round in 0..40 {
        let n = 2 + round % 6;
        let mut problem = random_problem(n, &mut dice);
        let mut spread = || 10f64.powi(dice.i32(-15..=15)).log2().round().exp2();
        let (rows, columns): (Vec<_>, Vec<_>) = (0..n).map(|_| (spread(), spread())).unzip();
        let scales: Vec<f64> = problem.entries().map(|(i, j, _)| rows[i] * columns[j]).collect();
        for (value, scale) in problem.values.iter_mut().zip(scales) {
            *value = value.scale(scale);
        }
        let (worst, trust) = problem.assert_bounds_hold(&random_vector(n, &mut dice));
        assert!(worst < 1e-12, "n = {n}: {worst:e} {trust:?}");
    }
}

#[test]
fn unit_rows_beside_tiny_conductances_are_no_trouble() {
    // A source fixes node 0; node 1 hangs on it by 1e-12 S, node 2 on node 1 by 1e-15 S.
    let (g, h) = (1e-12, 1e-15);
    let problem = Problem::dense([
        [g, -g, 0.0, 1.0],
        [-g, g + h, -h, 0.0],
        [0.0, -h, 2.0 * h, 0.0],
        [1.0, 0.0, 0.0, 0.0],
    ]);
    let rhs = [0.0, 0.0, 0.0, 230.0].map(ComplexTwofold::from);
    let (worst, trust) = problem.assert_bounds_hold(&rhs);
    assert!(worst < 1e-18, "{worst:e} {trust:?}");
    assert!(trust.condition < 1e4, "{trust:?}");
}

fn hilbert(n: usize) -> Problem {
    let entry = |k: usize| {
        let (i, j) = (k / n, k % n);
        let value = Twofold::ONE / Twofold::new((i + j + 1) as f64);
        (i, j, ComplexTwofold::real(value))
    };
    Problem::new(n, (0..n * n).map(entry).collect())
}

#[test]
fn ill_conditioned_systems_pass_with_honest_bounds() {
    for n in [4, 6, 8, 9, 10] {
        let rhs: Vec<ComplexTwofold> = (0..n).map(|i| (i as f64 - 2.5).into()).collect();
        let (worst, trust) = hilbert(n).assert_bounds_hold(&rhs);
        assert!(worst < 1e-10, "n = {n}: {worst:e} {trust:?}");
    }
}

#[test]
fn hopelessly_conditioned_systems_are_refused() {
    for n in [14, 20, 40] {
        let rhs = vec![ComplexTwofold::ONE; n];
        let result = hilbert(n).refine(&rhs);
        assert!(
            matches!(result, Err(SolveError::Singular { .. } | SolveError::NotAccurate { .. })),
            "n = {n}: {:?}",
            result.map(|(_, _, trust)| trust)
        );
    }
}

#[test]
fn a_weak_path_to_the_reference_is_enough() {
    let mut dice = fastrand::Rng::with_seed(14);
    for exponent in [-6, -9, -10] {
        for n in [3, 6] {
            let mut problem = floating_network(n, &mut dice);
            problem.values[0] += ComplexTwofold::from(10f64.powi(exponent));
            let rhs: Vec<ComplexTwofold> = (0..n).map(|i| (i as f64).into()).collect();
            let (worst, trust) = problem.assert_bounds_hold(&rhs);
            assert!(worst < 1e-10, "1e{exponent} S, n = {n}: {worst:e} {trust:?}");
        }
    }
}

#[test]
fn singular_matrices_are_refused_with_their_column() {
    let factor = |problem: &Problem| problem.solver().factor(&problem.doubles());
    let twice = Problem::dense([[1.0, 2.0], [2.0, 4.0]]);
    assert!(matches!(factor(&twice), Err(SolveError::Singular { .. })));
    let zero_column = Problem::dense([[1.0, 0.0, 2.0], [3.0, 0.0, 5.0], [1.0, 0.0, 1.0]]);
    assert_eq!(factor(&zero_column), Err(SolveError::Singular { column: 1 }));
    let zero_row = Problem::dense([[1.0, 2.0], [0.0, 0.0]]);
    assert!(matches!(factor(&zero_row), Err(SolveError::Singular { .. })));
    let not_a_number = Problem::dense([[1.0, 2.0], [3.0, f64::NAN]]);
    assert_eq!(factor(&not_a_number), Err(SolveError::NotFinite { column: 1 }));
    let infinite = Problem::dense([[f64::INFINITY, 2.0], [3.0, 4.0]]);
    assert_eq!(factor(&infinite), Err(SolveError::NotFinite { column: 0 }));
    // Two columns that share one row leave no pivot for the second.
    let one = ComplexTwofold::ONE;
    let narrow = Problem::new(3, vec![(0, 0, one), (0, 1, one), (1, 2, one), (2, 2, one)]);
    assert!(matches!(factor(&narrow), Err(SolveError::Singular { column: 0 | 1 })));
}

#[test]
fn an_empty_row_or_column_is_noticed_before_any_value() {
    let one = ComplexTwofold::ONE;
    let new = |entries| Solver::new(Problem::new(2, entries).pattern).err();
    let expected = Some(SolveError::StructurallySingular { column: 1 });
    assert_eq!(new(vec![(0, 0, one), (1, 0, one)]), expected);
    assert_eq!(new(vec![(0, 0, one), (0, 1, one)]), expected);
}

#[test]
fn singular_systems_are_refused_although_the_right_hand_side_is_consistent() {
    let mut dice = fastrand::Rng::with_seed(15);
    for round in 0..200 {
        let n = 2 + round % 40;
        let problem = floating_network(n, &mut dice);
        let mut rhs = vec![ComplexTwofold::ZERO; n];
        rhs[0] = ComplexTwofold::ONE;
        rhs[n - 1] = -ComplexTwofold::ONE;
        let result = problem.refine(&rhs);
        assert!(
            matches!(result, Err(SolveError::Singular { .. })),
            "n = {n}: {:?}",
            result.map(|(_, _, trust)| trust)
        );
    }
}

/// ‖A·v‖∞ or ‖vᵀ·A‖∞
fn product_size(problem: &Problem, v: &[Complex64], transpose: bool) -> f64 {
    let mut product = vec![Complex64::ZERO; v.len()];
    for (i, j, value) in problem.entries() {
        let (to, from) = if transpose { (j, i) } else { (i, j) };
        product[to] += value.to_complex() * v[from];
    }
    product.iter().map(|value| value.norm()).fold(0.0, f64::max)
}

#[track_caller]
fn assert_null_vectors(problem: &Problem, right: Option<&[f64]>, left: Option<&[f64]>) {
    let mut solver = problem.solver();
    assert!(solver.factor(&problem.doubles()).is_err());
    for (found, wanted, transpose) in
        [(solver.null_vector(), right, false), (solver.left_null_vector(), left, true)]
    {
        let largest = found.iter().map(|value| value.norm()).fold(0.0, f64::max);
        assert!((largest - 1.0).abs() < 1e-12, "{found:?}");
        let size = problem.values.iter().map(|value| value.norm()).fold(0.0, f64::max);
        assert!(product_size(problem, &found, transpose) <= 1e-10 * size, "{found:?}");
        let Some(wanted) = wanted else { continue };
        let lead = wanted.iter().position(|value| *value == 1.0).expect("normalised");
        for (value, wanted) in found.iter().zip(wanted) {
            let off = value / found[lead] - wanted;
            assert!(off.norm() < 1e-10, "{found:?}");
        }
    }
}

#[test]
fn null_vectors_tell_what_is_not_determined() {
    assert_null_vectors(
        &Problem::dense([[1.0, 2.0], [2.0, 4.0]]),
        Some(&[1.0, -0.5]),
        Some(&[1.0, -0.5]),
    );
    // Two sources in parallel across one conductance: a current in their loop.
    assert_null_vectors(
        &Problem::dense([[0.5, 1.0, 1.0], [1.0, 0.0, 0.0], [1.0, 0.0, 0.0]]),
        Some(&[0.0, 1.0, -1.0]),
        Some(&[0.0, 1.0, -1.0]),
    );
    let zero_column = Problem::dense([[1.0, 0.0, 2.0], [3.0, 0.0, 5.0], [1.0, 0.0, 1.0]]);
    assert_null_vectors(&zero_column, Some(&[0.0, 1.0, 0.0]), None);
    // The two null vectors share no component.
    assert_null_vectors(
        &Problem::dense([[0.0, 1.0], [0.0, 0.0]]),
        Some(&[1.0, 0.0]),
        Some(&[0.0, 1.0]),
    );
    // Two directions are free: either is an answer.
    assert_null_vectors(
        &Problem::dense([[1.0, 1.0, 1.0], [2.0, 2.0, 2.0], [3.0, 3.0, 3.0]]),
        None,
        None,
    );
}

#[test]
fn null_vectors_of_floating_networks_are_constant() {
    let mut dice = fastrand::Rng::with_seed(16);
    for n in [2, 5, 30, 150] {
        let problem = floating_network(n, &mut dice);
        let mut solver = problem.solver();
        // The last pivot may be zero or rounding noise: both must work.
        let _ = solver.factor(&problem.doubles());
        for vector in [solver.null_vector(), solver.left_null_vector()] {
            assert!(vector.iter().all(|value| (value - vector[0]).norm() < 1e-9), "{vector:?}");
        }
    }
}

#[test]
fn null_vectors_survive_bad_scaling() {
    // Two identical sources behind conductances of very different size.
    let (g, big) = (1e-12, 1e6);
    let problem = Problem::dense([
        [g + big, -big, 0.0, 0.0],
        [-big, big, 1.0, 1.0],
        [0.0, 1.0, 0.0, 0.0],
        [0.0, 1.0, 0.0, 0.0],
    ]);
    assert_null_vectors(&problem, Some(&[0.0, 0.0, 1.0, -1.0]), Some(&[0.0, 0.0, 1.0, -1.0]));
}

#[test]
fn the_same_factors_serve_many_right_hand_sides() {
    let mut dice = fastrand::Rng::with_seed(17);
    let n = 20;
    let problem = random_problem(n, &mut dice);
    let mut solver = problem.solver();
    solver.factor(&problem.doubles()).expect("regular");
    for _ in 0..3 {
        let rhs = random_vector(n, &mut dice);
        let (mut x, mut error) = (vec![ComplexTwofold::ZERO; n], vec![0.0; n]);
        solver.solve_refined(&problem.values, &rhs, &mut x, &mut error).expect("accurate");
        let (again, _, _) = problem.refine(&rhs).expect("accurate");
        assert_eq!(x, again);
    }
    let zero = vec![ComplexTwofold::ZERO; n];
    let (mut x, mut error) = (zero.clone(), vec![1.0; n]);
    solver.solve_refined(&problem.values, &zero, &mut x, &mut error).expect("accurate");
    assert!(x == zero && error.iter().all(|bound| *bound == 0.0), "no sources, no answer, exactly");
}

#[test]
fn rational_reference_solves_what_is_known() {
    let problem = Problem::dense([[2.0, 1.0], [1.0, 3.0]]);
    let x = problem.exact_solution(&[ComplexTwofold::from(3.0), ComplexTwofold::from(5.0)]);
    let fraction = |above: i32, below: i32| {
        Complex::new(
            BigRational::new(BigInt::from(above), BigInt::from(below)),
            BigRational::zero(),
        )
    };
    assert_eq!(x, [fraction(4, 5), fraction(7, 5)]);
    assert_eq!(Exact::one() * x[0].clone(), x[0]);
}

/// Admittances of a square grid of nodes, each with a path to the reference; on request a source
/// with its current as a further unknown at every third node.
fn grid(edge: usize, with_sources: bool) -> Problem {
    let nodes = edge * edge;
    let mut entries = Vec::new();
    let mut unknowns = nodes;
    for a in 0..nodes {
        let (x, y) = (a % edge, a / edge);
        entries.push((a, a, 5.0.into()));
        let neighbours = [(x + 1 < edge, a + 1), (y + 1 < edge, a + edge)];
        for (_, b) in neighbours.into_iter().filter(|(there, _)| *there) {
            entries.push((a, b, (-1.0).into()));
            entries.push((b, a, (-1.0).into()));
        }
        if with_sources && a % 3 == 0 {
            entries.push((a, unknowns, ComplexTwofold::ONE));
            entries.push((unknowns, a, ComplexTwofold::ONE));
            unknowns += 1;
        }
    }
    Problem::new(unknowns, entries)
}

#[test]
fn the_sparser_column_order_is_kept() {
    for (edge, with_sources) in [(10, false), (10, true), (42, false), (42, true)] {
        let problem = grid(edge, with_sources);
        let pattern = &problem.pattern;
        let fills = [Order::Column, Order::Symmetric].map(|order| {
            let mut lu = Lu::new(&pattern.column_start, &pattern.row, order).expect("memory");
            lu.factor(&pattern.column_start, &pattern.row, &problem.doubles()).expect("regular");
            lu.fill()
        });
        let mut solver = problem.solver();
        let health = solver.factor(&problem.doubles()).expect("regular");
        let best = fills[0].min(fills[1]) as f64;
        assert!(health.fill as f64 <= 1.1 * best, "{edge} {with_sources}: {health:?} {fills:?}");
    }
}
