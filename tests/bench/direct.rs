//! The general sparse solver of the program, one frequency after another, its analysis reused.

use crate::Engine;
use crate::networks::{Network, values};
use faer::Mat;
use faer::prelude::Solve;
use faer::sparse::linalg::solvers::{Lu, SymbolicLu};
use faer::sparse::{SparseColMat, SymbolicSparseColMat};
use num_complex::Complex64;

pub fn engine(network: &Network) -> Engine<'_> {
    let pattern = &network.pattern;
    let n = pattern.n;
    let symbolic = SymbolicSparseColMat::new_checked(
        n,
        n,
        pattern.column_start.clone(),
        None,
        pattern.row.clone(),
    );
    let analysis = SymbolicLu::try_new(symbolic.as_ref()).expect("an analysis");
    let mut entries = vec![Complex64::default(); pattern.row.len()];
    let mut right = vec![Complex64::default(); n];
    let sweep = Box::new(move |frequencies: &[f64]| {
        for &f in frequencies {
            values(network, f, &mut entries, &mut right);
            let matrix = SparseColMat::new(symbolic.clone(), entries.clone());
            let lu = Lu::try_new_with_symbolic(analysis.clone(), matrix.as_ref()).expect("factors");
            let mut x = Mat::from_fn(n, 1, |i, _| right[i]);
            lu.solve_in_place(&mut x);
            std::hint::black_box(x[(0, 0)]);
        }
    });
    Engine { name: "faer sparse LU, analysis reused".into(), sweep, best_seconds: f64::INFINITY }
}
