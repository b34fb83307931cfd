//! Null vectors of singular matrices: which unknowns take part in what is not determined.

use crate::solve::Pattern;
use crate::solve::condition::largest_of;
use crate::solve::limits;
use crate::solve::lu::{Lu, Order};
use num_complex::Complex64;

/// The matrix with its diagonal perturbed, so that it can be factored however singular it is.
pub(crate) struct Perturbed<'a> {
    pattern: &'a Pattern,
    values: &'a [Complex64],
    perturbation: Vec<Complex64>,
    lu: Lu,
    transpose: bool,
}

impl<'a> Perturbed<'a> {
    /// Factors `values + D`, D a small diagonal of scattered phases; `None` where even that fails
    /// (values that are not finite).
    pub fn new(pattern: &'a Pattern, values: &'a [Complex64], transpose: bool) -> Option<Self> {
        // A fixed irrational step scatters the phases and repeats from run to run.
        let phase = |i: usize| (i as f64 * 2.399963229728653).rem_euclid(std::f64::consts::TAU);
        let perturbation: Vec<Complex64> = (0..pattern.n)
            .map(|i| Complex64::from_polar(limits::NULL_PERTURBATION, phase(i + 1)))
            .collect();
        let mut column_start = vec![0];
        let mut row = Vec::with_capacity(pattern.row.len() + pattern.n);
        let mut sums = Vec::with_capacity(pattern.row.len() + pattern.n);
        for (j, &added) in perturbation.iter().enumerate() {
            let entries = pattern.column_start[j]..pattern.column_start[j + 1];
            let below = entries.start + pattern.row[entries.clone()].partition_point(|&i| i < j);
            row.extend_from_slice(&pattern.row[entries.start..below]);
            sums.extend_from_slice(&values[entries.start..below]);
            let has_diagonal = below < entries.end && pattern.row[below] == j;
            row.push(j);
            sums.push(if has_diagonal { values[below] + added } else { added });
            let above = if has_diagonal { below + 1 } else { below };
            row.extend_from_slice(&pattern.row[above..entries.end]);
            sums.extend_from_slice(&values[above..entries.end]);
            column_start.push(row.len());
        }
        let mut lu = Lu::new(&column_start, &row, Order::Column).ok()?;
        lu.factor(&column_start, &row, &sums).ok()?;
        let pivots = lu.pivots();
        let usable = pivots.smallest > 0.0 && pivots.smallest.is_finite();
        usable.then_some(Perturbed { pattern, values, perturbation, lu, transpose })
    }

    /// The direction the matrix shrinks most, largest component 1, rounding noise set to zero.
    pub fn null_vector(&mut self) -> Vec<Complex64> {
        let size = self.pattern.n;
        let mut vector: Vec<Complex64> =
            (0..size).map(|i| Complex64::from_polar(1.0, (i * i) as f64 * 0.7)).collect();
        for _ in 0..limits::NULL_ROUNDS {
            self.solve_adjoint(&mut vector);
            normalise(&mut vector);
            self.solve(&mut vector);
            normalise(&mut vector);
        }
        self.polish(&mut vector);
        for value in &mut vector {
            if value.norm() < limits::NULL_NOISE {
                *value = Complex64::ZERO;
            }
        }
        vector
    }

    /// Takes the perturbation out again: A·v = 0 is (A + D)·v = D·v, so v = (A + D)⁻¹·D·v.
    fn polish(&mut self, vector: &mut Vec<Complex64>) {
        for _ in 0..limits::NULL_ROUNDS {
            let mut next: Vec<Complex64> =
                vector.iter().zip(&self.perturbation).map(|(v, d)| v * d).collect();
            self.solve(&mut next);
            normalise(&mut next);
            if self.residual(&next) > self.residual(vector) {
                return;
            }
            *vector = next;
        }
    }

    /// ‖A·v‖∞ (or ‖Aᵀ·v‖∞)
    fn residual(&self, vector: &[Complex64]) -> f64 {
        let pattern = self.pattern;
        let mut product = vec![Complex64::ZERO; pattern.n];
        for j in 0..pattern.n {
            for at in pattern.column_start[j]..pattern.column_start[j + 1] {
                let i = pattern.row[at];
                let (to, from) = if self.transpose { (j, i) } else { (i, j) };
                product[to] += self.values[at] * vector[from];
            }
        }
        largest_of(&product).1
    }

    fn solve(&mut self, x: &mut [Complex64]) {
        if self.transpose {
            self.lu.solve_transpose(x);
        } else {
            self.lu.solve(x);
        }
    }

    fn solve_adjoint(&mut self, x: &mut [Complex64]) {
        x.iter_mut().for_each(|value| *value = value.conj());
        if self.transpose {
            self.lu.solve(x);
        } else {
            self.lu.solve_transpose(x);
        }
        x.iter_mut().for_each(|value| *value = value.conj());
    }
}

/// Divides by the largest component, which becomes 1.
pub(crate) fn normalise(vector: &mut [Complex64]) {
    let (at, largest) = largest_of(vector);
    if largest > 0.0 && largest.is_finite() {
        let by = vector[at];
        vector.iter_mut().for_each(|value| *value /= by);
    }
}
