//! Sparse linear systems with honest error bounds. Knows columns, rows and numbers only.
//!
//! [`Solver::new`] once a pattern, [`Solver::factor`] once a frequency, then any of the solves.
//! After the first couple of factorisations nothing is allocated.

mod condition;
pub mod dense;
pub mod lanes;
pub mod limits;
mod lu;
mod null;
mod refine;
mod scaling;
#[cfg(test)]
mod tests;

use crate::number::ComplexTwofold;
use crate::solve::lu::{Failure, Lu, Order};
use crate::solve::scaling::Scaling;
use num_complex::Complex64;
use thiserror::Error;

/// Where a square sparse matrix has entries: compressed columns.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Pattern {
    /// Rows, and columns.
    pub n: usize,
    /// Where each column starts in `row`; n + 1 numbers.
    pub column_start: Vec<usize>,
    /// Row of each entry, ascending within a column.
    pub row: Vec<usize>,
}

/// Why there is no trustworthy solution.
#[derive(Clone, Copy, Debug, PartialEq, Error)]
pub enum SolveError {
    /// A column, or the row of the same number, has no entry at all.
    #[error("column or row {column} has no entries")]
    StructurallySingular {
        /// The column (or row).
        column: usize,
    },
    /// Singular to working precision.
    #[error("the matrix is singular, first noticed in column {column}")]
    Singular {
        /// Column of the smallest pivot.
        column: usize,
    },
    /// An entry of the matrix is infinite or not a number.
    #[error("an entry of column {column} is not a finite number")]
    NotFinite {
        /// The entry's column.
        column: usize,
    },
    /// Refinement does not reach an accurate solution.
    #[error("no accurate solution: corrections stay at {relative_error:e} of it")]
    NotAccurate {
        /// Size of the last correction relative to the solution; infinite if that is not finite.
        relative_error: f64,
    },
    /// No memory for the factors.
    #[error("not enough memory for the factors")]
    OutOfMemory,
}

/// What the factors look like.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Health {
    /// Smallest over largest pivot of the scaled matrix.
    pub pivot_ratio: f64,
    /// Largest entry of U over the largest of the scaled matrix.
    pub growth: f64,
    /// Entries in both factors.
    pub fill: usize,
}

/// What the error bounds of a refined solution rest on.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Trust {
    /// Corrections computed.
    pub steps: usize,
    /// By how much a correction shrinks at worst, from one to the next.
    pub contraction: f64,
    /// Estimate of ‖|A⁻¹|·|A|‖∞ of the scaled matrix (Skeel's condition).
    pub condition: f64,
    /// Largest error bound over the largest component, in scaled unknowns.
    pub relative_error: f64,
}

/// One pattern's factors and work space.
pub struct Solver {
    pattern: Pattern,
    lu: Lu,
    /// The other column order, until the first factorisation has told which is better.
    rival: Option<Lu>,
    scaling: Scaling,
    scaled: Vec<Complex64>,
    state: State,
    work: refine::Work,
}

/// What is known about the current factors.
#[derive(Clone, Copy, Debug, PartialEq)]
enum State {
    /// None, or not usable.
    NotFactored,
    /// Factors of the current values; the column has their smallest pivot.
    Factored { weakest_column: usize },
    /// Their worst direction is known too.
    Probed { weakest_column: usize, condition: f64, contraction: f64 },
}

impl Solver {
    /// Prepares for matrices of one pattern.
    ///
    /// # Errors
    /// [`SolveError::StructurallySingular`] where a row or column is empty.
    pub fn new(pattern: Pattern) -> Result<Solver, SolveError> {
        check_shape(&pattern);
        check_structure(&pattern)?;
        let order =
            |order| Lu::new(&pattern.column_start, &pattern.row, order).map_err(SolveError::from);
        let lu = order(Order::Column)?;
        let rival = if pattern.n >= limits::LEAST_SIZE_FOR_ORDER_TRIAL {
            Some(order(Order::Symmetric)?)
        } else {
            None
        };
        Ok(Solver {
            lu,
            rival,
            scaling: Scaling::new(&pattern),
            scaled: vec![Complex64::ZERO; pattern.row.len()],
            state: State::NotFactored,
            work: refine::Work::new(&pattern),
            pattern,
        })
    }

    /// Scales and factors a matrix (one value an entry of the pattern) and judges the factors.
    ///
    /// # Errors
    /// [`SolveError::NotFinite`] and [`SolveError::Singular`], with the column.
    pub fn factor(&mut self, values: &[Complex64]) -> Result<Health, SolveError> {
        assert_eq!(values.len(), self.pattern.row.len(), "one value an entry of the pattern");
        self.state = State::NotFactored;
        self.scaling.apply(&self.pattern, values, &mut self.scaled);
        if let Some(at) = self.scaled.iter().position(|value| !value.is_finite()) {
            let column = self.pattern.column_start.partition_point(|&start| start <= at) - 1;
            return Err(SolveError::NotFinite { column });
        }
        if self.pattern.n == 0 {
            self.state = State::Factored { weakest_column: 0 };
            return Ok(Health { pivot_ratio: 1.0, growth: 1.0, fill: 0 });
        }
        self.lu.factor(&self.pattern.column_start, &self.pattern.row, &self.scaled)?;
        self.settle_order();
        let pivots = self.lu.pivots();
        let pivot_ratio = pivots.smallest / pivots.largest;
        // Not-a-number counts as unsound.
        let sound = pivot_ratio >= limits::LEAST_PIVOT_RATIO;
        if !sound {
            return Err(SolveError::Singular { column: pivots.column });
        }
        self.state = State::Factored { weakest_column: pivots.column };
        let largest = condition::largest_of(&self.scaled).1;
        Ok(Health { pivot_ratio, growth: pivots.largest_in_u / largest, fill: self.lu.fill() })
    }

    /// Keeps the column order with the sparser factors. The symmetric one gives far more fill once
    /// pivots leave the diagonal, so large systems try it only where they should not.
    fn settle_order(&mut self) {
        let Some(mut rival) = self.rival.take() else { return };
        if self.pattern.n > limits::LARGEST_SIZE_FOR_ORDER_TRIAL && !self.diagonal_leads() {
            return;
        }
        let factored = rival.factor(&self.pattern.column_start, &self.pattern.row, &self.scaled);
        if factored.is_ok() && rival.fill() < self.lu.fill() {
            self.lu = rival;
        }
    }

    /// The diagonal holds the largest entry of nearly every scaled column.
    fn diagonal_leads(&self) -> bool {
        let pattern = &self.pattern;
        let led = |j: usize| {
            let entries = pattern.column_start[j]..pattern.column_start[j + 1];
            let column = &self.scaled[entries.clone()];
            let diagonal = pattern.row[entries].binary_search(&j).map(|at| column[at].norm());
            diagonal.is_ok_and(|diagonal| condition::largest_of(column).1 <= diagonal)
        };
        let others = (0..pattern.n).filter(|&j| !led(j)).count();
        others as f64 <= limits::LARGEST_PART_OFF_DIAGONAL * pattern.n as f64
    }

    /// x = A⁻¹ x in double precision.
    pub fn solve_in_place(&mut self, x: &mut [Complex64]) {
        self.assert_factored(x.len());
        scale(x, &self.scaling.row);
        self.lu.solve(x);
        scale(x, &self.scaling.column);
    }

    /// x = A⁻ᵀ x in double precision (the transpose, not the adjoint).
    pub fn solve_transpose_in_place(&mut self, x: &mut [Complex64]) {
        self.assert_factored(x.len());
        scale(x, &self.scaling.column);
        self.lu.solve_transpose(x);
        scale(x, &self.scaling.row);
    }

    /// Solves A·x = b with refinement in twofold precision.
    ///
    /// `exact_values` are the entries that were rounded for [`Solver::factor`]. `error` receives
    /// bounds on |x − exact solution| for each component.
    ///
    /// # Errors
    /// [`SolveError::Singular`] where the matrix is singular to working precision, also when this
    /// right-hand side happens to be consistent; [`SolveError::NotAccurate`] where refinement
    /// stalls.
    pub fn solve_refined(
        &mut self,
        exact_values: &[ComplexTwofold],
        exact_rhs: &[ComplexTwofold],
        x: &mut [ComplexTwofold],
        error: &mut [f64],
    ) -> Result<Trust, SolveError> {
        self.assert_factored(x.len());
        assert_eq!(exact_values.len(), self.pattern.row.len(), "one value an entry");
        assert!(exact_rhs.len() == x.len() && error.len() == x.len(), "one number a row");
        refine::solve(self, exact_values, exact_rhs, x, error)
    }

    /// v ≠ 0 with A·v ≈ 0 for the matrix last given to [`Solver::factor`], singular or not: the
    /// unknowns that are not determined. Largest component 1; those that do not take part are 0.
    /// All zero where the matrix has entries that are not finite. Allocates.
    pub fn null_vector(&mut self) -> Vec<Complex64> {
        self.either_null_vector(false)
    }

    /// w ≠ 0 with wᵀ·A ≈ 0: the equations that depend on each other. As [`Solver::null_vector`].
    pub fn left_null_vector(&mut self) -> Vec<Complex64> {
        self.either_null_vector(true)
    }

    fn either_null_vector(&mut self, transpose: bool) -> Vec<Complex64> {
        let perturbed = null::Perturbed::new(&self.pattern, &self.scaled, transpose);
        let Some(mut perturbed) = perturbed else {
            return vec![Complex64::ZERO; self.pattern.n];
        };
        let mut vector = perturbed.null_vector();
        scale(&mut vector, if transpose { &self.scaling.row } else { &self.scaling.column });
        null::normalise(&mut vector);
        vector
    }

    #[track_caller]
    fn assert_factored(&self, length: usize) {
        assert_eq!(length, self.pattern.n, "one number a row");
        assert!(self.state != State::NotFactored, "factor must have succeeded");
    }
}

impl From<Failure> for SolveError {
    fn from(failure: Failure) -> Self {
        match failure {
            Failure::NoPivot(column) => SolveError::Singular { column },
            Failure::OutOfMemory => SolveError::OutOfMemory,
        }
    }
}

fn scale(x: &mut [Complex64], factors: &[f64]) {
    for (value, &factor) in x.iter_mut().zip(factors) {
        *value *= factor;
    }
}

/// Programmer faults: a pattern that is no pattern.
fn check_shape(pattern: &Pattern) {
    let Pattern { n, column_start, row } = pattern;
    assert_eq!(column_start.len(), n + 1, "one start a column and the end");
    assert_eq!(column_start.first(), Some(&0), "the first column starts at 0");
    assert_eq!(column_start.last(), Some(&row.len()), "the last column ends at the end");
    for bounds in column_start.windows(2) {
        let rows = &row[bounds[0]..bounds[1]];
        assert!(rows.windows(2).all(|pair| pair[0] < pair[1]), "rows ascend in each column");
        assert!(rows.last().is_none_or(|last| last < n), "rows are below n");
    }
}

/// Every row and column has an entry.
fn check_structure(pattern: &Pattern) -> Result<(), SolveError> {
    let mut row_used = vec![false; pattern.n];
    pattern.row.iter().for_each(|&i| row_used[i] = true);
    let empty_column = pattern.column_start.windows(2).position(|bounds| bounds[0] == bounds[1]);
    let empty = empty_column.or_else(|| row_used.iter().position(|used| !used));
    empty.map_or(Ok(()), |column| Err(SolveError::StructurallySingular { column }))
}
