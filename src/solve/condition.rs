//! How near the matrix is to a singular one.

use crate::solve::limits;
use crate::solve::lu::Lu;
use num_complex::Complex64;

/// Estimates ‖diag(w)⁻¹·|A⁻¹|·g‖∞ for the factored A, weights g ≥ 0 and sizes w > 0, by the 1-norm
/// estimator of Hager (1984) in the form of Higham (1988), applied to diag(g)·A⁻ᴴ·diag(w)⁻¹. With g
/// the row sums of |A| and w = 1 that is the condition of Skeel (1979).
///
/// `near_null` receives the vector diag(w)⁻¹·A⁻¹·diag(g)·ξ, |ξ| = 1, that the estimate was found
/// on; `work` is overwritten.
pub(crate) fn estimate(
    lu: &mut Lu,
    g: &[f64],
    w: &[f64],
    near_null: &mut [Complex64],
    work: &mut [Complex64],
) -> f64 {
    let size = g.len();
    let mut best = 0.0;
    let mut unit = None;
    for round in 0..limits::ESTIMATOR_ROUNDS {
        match unit {
            None => work.fill(Complex64::new(1.0 / size as f64, 0.0)),
            Some(at) => {
                work.fill(Complex64::ZERO);
                work[at] = Complex64::ONE;
            }
        }
        // work = diag(g)·A⁻ᴴ·diag(w)⁻¹·work; work is real: one conjugation is enough.
        divide(work, w);
        lu.solve_transpose(work);
        let mut estimate = 0.0;
        for (value, &weight) in work.iter_mut().zip(g) {
            let scaled = value.conj() * weight;
            let magnitude = scaled.norm();
            estimate += magnitude;
            let sign = if magnitude == 0.0 { Complex64::ONE } else { scaled / magnitude };
            *value = sign * weight;
        }
        if round > 0 && estimate <= best {
            break;
        }
        best = estimate;
        lu.solve(work);
        divide(work, w);
        near_null.copy_from_slice(work);
        let (at, largest) = largest_of(near_null);
        if unit == Some(at) || !largest.is_finite() {
            break;
        }
        unit = Some(at);
    }
    // Each vector tried gives a lower bound, the last one too.
    best.max(largest_of(near_null).1)
}

fn divide(vector: &mut [Complex64], by: &[f64]) {
    for (value, &size) in vector.iter_mut().zip(by) {
        *value /= size;
    }
}

/// Index and magnitude of the largest component; the magnitude is infinite if any is not finite.
pub(crate) fn largest_of(vector: &[Complex64]) -> (usize, f64) {
    let mut found = (0, 0.0);
    for (at, value) in vector.iter().enumerate() {
        let magnitude = value.norm();
        if !magnitude.is_finite() {
            return (at, f64::INFINITY);
        }
        if magnitude > found.1 {
            found = (at, magnitude);
        }
    }
    found
}
