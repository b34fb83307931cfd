//! Sparse LU factors, by the simplicial (Gilbert-Peierls) kernel of faer.
//!
//! The kernel reports neither singular nor non-finite input: [`Lu::pivots`] is for that. It
//! allocates only while the factors grow, so a second matrix of the same kind costs nothing.

use faer::dyn_stack::{MemBuffer, MemStack};
use faer::perm::PermRef;
use faer::sparse::linalg::lu::simplicial;
use faer::sparse::linalg::{LuError, amd, colamd};
use faer::sparse::{SparseColMatRef, SymbolicSparseColMatRef};
use faer::{Conj, MatMut, Par};
use num_complex::Complex64;

/// How columns are ordered to keep the factors sparse.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Order {
    /// Approximate minimum degree on A + Aᵀ: best where pivots stay near the diagonal.
    Symmetric,
    /// Column approximate minimum degree: bounds the fill whatever pivots are taken.
    Column,
}

/// The factorisation could not be carried through.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Failure {
    /// No entry is left to pivot on in this column.
    NoPivot(usize),
    /// No memory for the factors.
    OutOfMemory,
}

/// What the diagonal of U tells.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Pivots {
    /// Magnitude of the smallest pivot; not finite if any pivot is not.
    pub smallest: f64,
    /// Column of the matrix with that pivot (the first one that is zero or not finite).
    pub column: usize,
    /// Magnitude of the largest pivot.
    pub largest: f64,
    /// Largest magnitude in U.
    pub largest_in_u: f64,
}

/// Factors of a square sparse matrix, with all they need to be computed again.
pub(crate) struct Lu {
    size: usize,
    column_order: Vec<usize>,
    column_order_inverse: Vec<usize>,
    row_order: Vec<usize>,
    row_order_inverse: Vec<usize>,
    factors: simplicial::SimplicialLu<usize, Complex64>,
    memory: MemBuffer,
}

impl Lu {
    /// Orders the columns of a pattern (compressed columns, rows sorted in each).
    pub fn new(column_start: &[usize], row: &[usize], order: Order) -> Result<Lu, Failure> {
        let size = column_start.len() - 1;
        let pattern = SymbolicSparseColMatRef::new_checked(size, size, column_start, None, row);
        let mut forward = vec![0; size];
        let mut inverse = vec![0; size];
        let requirement = match order {
            Order::Symmetric => amd::order_maybe_unsorted_scratch::<usize>(size, row.len()),
            Order::Column => colamd::order_scratch::<usize>(size, size, row.len()),
        };
        let mut memory = MemBuffer::try_new(requirement).map_err(|_| Failure::OutOfMemory)?;
        let stack = MemStack::new(&mut memory);
        match order {
            Order::Symmetric => {
                let control = amd::Control::default();
                amd::order_maybe_unsorted(&mut forward, &mut inverse, pattern, control, stack)
                    .map_err(|_| Failure::OutOfMemory)?;
            }
            Order::Column => {
                let control = colamd::Control::default();
                colamd::order(&mut forward, &mut inverse, pattern, control, stack)
                    .map_err(|_| Failure::OutOfMemory)?;
            }
        }
        let factor_scratch =
            simplicial::factorize_simplicial_numeric_lu_scratch::<usize, Complex64>(size, size);
        let solve_scratch =
            simplicial::solve_in_place_scratch::<usize, Complex64>(size, 1, Par::Seq);
        let memory = MemBuffer::try_new(factor_scratch.or(solve_scratch))
            .map_err(|_| Failure::OutOfMemory)?;
        Ok(Lu {
            size,
            column_order: forward,
            column_order_inverse: inverse,
            row_order: vec![0; size],
            row_order_inverse: vec![0; size],
            factors: simplicial::SimplicialLu::new(),
            memory,
        })
    }

    /// Factors the matrix with these values; the pattern must be the one given to `new`.
    pub fn factor(
        &mut self,
        column_start: &[usize],
        row: &[usize],
        values: &[Complex64],
    ) -> Result<(), Failure> {
        let size = self.size;
        let pattern = SymbolicSparseColMatRef::new_checked(size, size, column_start, None, row);
        let order = PermRef::new_checked(&self.column_order, &self.column_order_inverse, size);
        simplicial::factorize_simplicial_numeric_lu(
            &mut self.row_order,
            &mut self.row_order_inverse,
            &mut self.factors,
            SparseColMatRef::new(pattern, values),
            order,
            MemStack::new(&mut self.memory),
        )
        .map_err(|error| match error {
            LuError::SymbolicSingular { index } => Failure::NoPivot(self.column_order[index]),
            LuError::Generic(_) => Failure::OutOfMemory,
        })
    }

    /// Entries in both factors.
    pub fn fill(&self) -> usize {
        let size = self.size;
        let lower = self.factors.l_factor_unsorted();
        let upper = self.factors.u_factor_unsorted();
        lower.symbolic().col_ptr()[size] + upper.symbolic().col_ptr()[size]
    }

    /// Reads the pivots off the diagonal of U, which is the last entry of each column.
    pub fn pivots(&self) -> Pivots {
        let upper = self.factors.u_factor_unsorted();
        let mut pivots =
            Pivots { smallest: f64::INFINITY, column: 0, largest: 0.0, largest_in_u: 0.0 };
        for step in 0..self.size {
            let column = upper.val_of_col(step);
            let magnitude = column.last().map_or(0.0, |pivot| pivot.norm());
            let in_column = column.iter().map(|value| value.norm()).fold(0.0, f64::max);
            pivots.largest_in_u = pivots.largest_in_u.max(in_column);
            pivots.largest = pivots.largest.max(magnitude);
            if !magnitude.is_finite() || magnitude < pivots.smallest {
                pivots.smallest = magnitude;
                pivots.column = self.column_order[step];
            }
            // All later columns are polluted by the division.
            if !magnitude.is_finite() || magnitude == 0.0 {
                break;
            }
        }
        pivots
    }

    /// x = A⁻¹ x
    pub fn solve(&mut self, x: &mut [Complex64]) {
        self.solve_either(x, false);
    }

    /// x = A⁻ᵀ x (the transpose, not the adjoint)
    pub fn solve_transpose(&mut self, x: &mut [Complex64]) {
        self.solve_either(x, true);
    }

    fn solve_either(&mut self, x: &mut [Complex64], transpose: bool) {
        assert_eq!(x.len(), self.size, "one entry a row");
        if self.size == 0 {
            return;
        }
        let size = self.size;
        let rows = PermRef::new_checked(&self.row_order, &self.row_order_inverse, size);
        let columns = PermRef::new_checked(&self.column_order, &self.column_order_inverse, size);
        let x = MatMut::from_column_major_slice_mut(x, size, 1);
        let stack = MemStack::new(&mut self.memory);
        let factors = &self.factors;
        if transpose {
            factors.solve_transpose_in_place_with_conj(rows, columns, Conj::No, x, Par::Seq, stack);
        } else {
            factors.solve_in_place_with_conj(rows, columns, Conj::No, x, Par::Seq, stack);
        }
    }
}
