//! Row and column scaling by powers of two, so that scaling rounds nothing.

use crate::number::complex::power_of_two_below;
use crate::solve::Pattern;
use crate::solve::limits;
use num_complex::Complex64;

/// Factors r and c that bring the entries of diag(r)·A·diag(c) near magnitude 1: first the mean
/// logarithm of every row and column to zero (least squares, Curtis and Reid 1972, by alternating
/// sweeps), then the largest of every row and column to 1 (Ruiz 2001). The first step undoes units
/// that were chosen badly, the second keeps pivots comparable.
pub(crate) struct Scaling {
    /// One power of two a row.
    pub row: Vec<f64>,
    /// One power of two a column.
    pub column: Vec<f64>,
    /// Magnitude of each entry, unscaled.
    magnitude: Vec<f64>,
    /// Its binary logarithm; not finite for entries that do not count.
    logarithm: Vec<f64>,
    largest_in_row: Vec<f64>,
    row_mean: Vec<Mean>,
    column_logarithm: Vec<f64>,
}

/// A mean being taken.
#[derive(Clone, Copy, Default)]
struct Mean {
    sum: f64,
    count: f64,
}

impl Mean {
    fn add(&mut self, value: f64) {
        self.sum += value;
        self.count += 1.0;
    }

    fn value(self) -> f64 {
        if self.count == 0.0 { 0.0 } else { self.sum / self.count }
    }
}

impl Scaling {
    pub fn new(pattern: &Pattern) -> Self {
        let (n, entries) = (pattern.n, pattern.row.len());
        Scaling {
            row: vec![1.0; n],
            column: vec![1.0; n],
            magnitude: vec![0.0; entries],
            logarithm: vec![0.0; entries],
            largest_in_row: vec![0.0; n],
            row_mean: vec![Mean::default(); n],
            column_logarithm: vec![0.0; n],
        }
    }

    /// Finds the factors for `values` and writes the scaled matrix to `scaled`.
    pub fn apply(&mut self, pattern: &Pattern, values: &[Complex64], scaled: &mut [Complex64]) {
        for (at, value) in values.iter().enumerate() {
            self.magnitude[at] = value.norm();
            self.logarithm[at] = self.magnitude[at].log2();
        }
        self.column_logarithm.fill(0.0);
        for _ in 0..limits::MEAN_PASSES {
            self.mean_pass(pattern);
        }
        for i in 0..pattern.n {
            self.row[i] = power_of_two(-self.row_mean[i].value());
            self.column[i] = power_of_two(-self.column_logarithm[i]);
        }
        for pass in 0..=limits::LARGEST_PASSES {
            // The last pass brings rows to 1 in full, so that pivots compare fairly.
            self.largest_pass(pattern, pass == limits::LARGEST_PASSES);
        }
        for j in 0..pattern.n {
            for at in pattern.column_start[j]..pattern.column_start[j + 1] {
                // One factor at a time: their product may leave the range.
                scaled[at] = values[at] * self.row[pattern.row[at]] * self.column[j];
            }
        }
    }

    /// Rows to mean logarithm zero, then columns.
    fn mean_pass(&mut self, pattern: &Pattern) {
        self.row_mean.fill(Mean::default());
        for j in 0..pattern.n {
            for at in pattern.column_start[j]..pattern.column_start[j + 1] {
                if self.logarithm[at].is_finite() {
                    let rest = self.logarithm[at] - self.column_logarithm[j];
                    self.row_mean[pattern.row[at]].add(rest);
                }
            }
        }
        for j in 0..pattern.n {
            let mut mean = Mean::default();
            for at in pattern.column_start[j]..pattern.column_start[j + 1] {
                if self.logarithm[at].is_finite() {
                    mean.add(self.logarithm[at] - self.row_mean[pattern.row[at]].value());
                }
            }
            self.column_logarithm[j] = mean.value();
        }
    }

    /// Halves the logarithm of every row's and column's largest entry; in the last pass takes it
    /// out of the rows.
    fn largest_pass(&mut self, pattern: &Pattern, last: bool) {
        self.largest_in_row.fill(0.0);
        for j in 0..pattern.n {
            let mut largest = 0.0;
            for at in pattern.column_start[j]..pattern.column_start[j + 1] {
                let i = pattern.row[at];
                let size = self.magnitude[at] * self.row[i] * self.column[j];
                largest = f64::max(largest, size);
                self.largest_in_row[i] = self.largest_in_row[i].max(size);
            }
            if !last {
                self.column[j] /= power_of_two_below(largest.sqrt());
            }
        }
        for (factor, &largest) in self.row.iter_mut().zip(&self.largest_in_row) {
            *factor /= power_of_two_below(if last { largest } else { largest.sqrt() });
        }
    }
}

/// The power of two nearest to 2^logarithm, kept well within range.
fn power_of_two(logarithm: f64) -> f64 {
    logarithm
        .clamp(-limits::LARGEST_SCALE_LOGARITHM, limits::LARGEST_SCALE_LOGARITHM)
        .round()
        .exp2()
}
