//! Small dense problems that a rational model of a response comes down to.

use faer::Mat;
use num_complex::Complex64;

/// The right singular vector of the smallest singular value of a matrix with `rows` ≥ `columns`,
/// given by its entries; `None` where the decomposition fails.
pub fn weakest_direction(
    rows: usize,
    columns: usize,
    entry: impl FnMut(usize, usize) -> Complex64,
) -> Option<Vec<Complex64>> {
    if columns == 0 || rows < columns {
        return None;
    }
    let matrix = Mat::<Complex64>::from_fn(rows, columns, entry);
    let svd = matrix.thin_svd().ok()?;
    let v = svd.V();
    let direction: Vec<_> = (0..columns).map(|i| v[(i, columns - 1)]).collect();
    direction.iter().all(|value| value.is_finite()).then_some(direction)
}

/// The eigenvalues of a square matrix given by its entries; `None` where they cannot be had.
pub fn eigenvalues(
    size: usize,
    entry: impl FnMut(usize, usize) -> Complex64,
) -> Option<Vec<Complex64>> {
    if size == 0 {
        return Some(Vec::new());
    }
    Mat::<Complex64>::from_fn(size, size, entry).eigenvalues().ok()
}

#[cfg(test)]
mod tests {
    use crate::solve::dense::{eigenvalues, weakest_direction};
    use num_complex::Complex64;

    #[test]
    fn the_weakest_direction_is_what_the_matrix_sends_to_zero() {
        // Columns a, b and a + jb: (1, j, −1) is sent to zero.
        let entry = |i: usize, j: usize| {
            let a = Complex64::new(1.0 + i as f64, 0.5 * (i * i) as f64);
            let b = Complex64::new(2.0 - i as f64, 1.0);
            [a, b, a + Complex64::I * b][j]
        };
        let found = weakest_direction(5, 3, entry).unwrap();
        for (i, expected) in [Complex64::ONE, Complex64::I].into_iter().enumerate() {
            assert!((found[i] / -found[2] - expected).norm() < 1e-12, "{found:?}");
        }
    }

    #[test]
    fn eigenvalues_of_a_companion_matrix_are_the_roots() {
        // (x − 2)(x − 3j)
        let entry = |i: usize, j: usize| match (i, j) {
            (0, 0) => Complex64::new(2.0, 3.0),
            (0, 1) => Complex64::new(0.0, -6.0),
            (1, 0) => Complex64::ONE,
            _ => Complex64::ZERO,
        };
        let found = eigenvalues(2, entry).unwrap();
        for root in [Complex64::new(2.0, 0.0), Complex64::new(0.0, 3.0)] {
            assert!(found.iter().any(|value| (value - root).norm() < 1e-13), "{found:?}");
        }
    }
}
