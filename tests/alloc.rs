//! A sweep must not allocate per frequency: counted with an allocator of our own.

// An allocator cannot be written without it; each call is handed on unchanged.
#![allow(unsafe_code)]

use bifilar::number::{Affine, ComplexTwofold};
use bifilar::solve::lanes::{Equations, Plan, Uses};
use bifilar::solve::{Pattern, Solver};
use num_complex::Complex64;
use std::alloc::{GlobalAlloc, Layout, System};
use std::cell::Cell;

thread_local! {
    static ALLOCATIONS: Cell<usize> = const { Cell::new(0) };
}

struct Counting;

fn count() {
    // The test harness allocates in other threads, and late in this one: neither is ours.
    let _ = ALLOCATIONS.try_with(|count| count.set(count.get() + 1));
}

unsafe impl GlobalAlloc for Counting {
    unsafe fn alloc(&self, layout: Layout) -> *mut u8 {
        count();
        unsafe { System.alloc(layout) }
    }

    unsafe fn dealloc(&self, at: *mut u8, layout: Layout) {
        unsafe { System.dealloc(at, layout) }
    }

    unsafe fn realloc(&self, at: *mut u8, layout: Layout, size: usize) -> *mut u8 {
        count();
        unsafe { System.realloc(at, layout, size) }
    }
}

#[global_allocator]
static COUNTING: Counting = Counting;

/// Nodes along each edge of the square grid.
const EDGE: usize = 20;

/// Couplings of each node with its neighbours in a square grid, itself included.
fn grid() -> Pattern {
    let n = EDGE * EDGE;
    let mut pattern = Pattern { n, column_start: vec![0], row: Vec::new() };
    for j in 0..n {
        let (x, y) = (j % EDGE, j / EDGE);
        let neighbours = [
            (y > 0, j.wrapping_sub(EDGE)),
            (x > 0, j.wrapping_sub(1)),
            (true, j),
            (x + 1 < EDGE, j + 1),
            (y + 1 < EDGE, j + EDGE),
        ];
        pattern.row.extend(neighbours.iter().filter(|(there, _)| *there).map(|(_, i)| i));
        pattern.column_start.push(pattern.row.len());
    }
    pattern
}

/// Admittances between nodes: a conductance and a susceptance that grows with frequency.
fn fill_values(pattern: &Pattern, omega: f64, values: &mut [ComplexTwofold]) {
    for j in 0..pattern.n {
        let entries = pattern.column_start[j]..pattern.column_start[j + 1];
        for (value, &i) in values[entries.clone()].iter_mut().zip(&pattern.row[entries]) {
            let size = 1.0 + ((i + j) % 7) as f64;
            let admittance = Complex64::new(-size, -omega * size * 0.3);
            *value = if i == j { admittance * -6.0 } else { admittance }.into();
        }
    }
}

#[test]
fn points_after_the_first_two_allocate_nothing() {
    let pattern = grid();
    let mut solver = Solver::new(pattern.clone()).expect("no empty row or column");
    let entries = pattern.row.len();
    let (mut exact, mut values) = (vec![ComplexTwofold::ZERO; entries], vec![]);
    let rhs: Vec<ComplexTwofold> = (0..pattern.n).map(|i| (i as f64).into()).collect();
    let mut x = vec![ComplexTwofold::ZERO; pattern.n];
    let mut plain = vec![Complex64::ZERO; pattern.n];
    let mut error = vec![0.0; pattern.n];
    let mut per_point = Vec::with_capacity(12);
    values.reserve(entries);
    for point in 0..12 {
        let before = ALLOCATIONS.get();
        fill_values(&pattern, 10f64.powi(point - 6), &mut exact);
        values.clear();
        values.extend(exact.iter().map(|value| value.to_complex()));
        solver.factor(&values).expect("regular");
        plain.fill(Complex64::ONE);
        solver.solve_in_place(&mut plain);
        solver.solve_transpose_in_place(&mut plain);
        solver.solve_refined(&exact, &rhs, &mut x, &mut error).expect("accurate");
        per_point.push(ALLOCATIONS.get() - before);
    }
    assert!(per_point[0] > 0, "the counter counts");
    assert_eq!(per_point[2..], [0; 10], "{per_point:?}");
}

#[test]
fn batches_of_frequencies_in_lanes_allocate_nothing() {
    let pattern = grid();
    let line = |i: usize, j: usize| {
        let size = 1.0 + ((i + j) % 7) as f64;
        let sign = if i == j { -6.0 } else { 1.0 };
        Affine {
            constant: Complex64::new(-size * sign, 0.0).into(),
            slope: Complex64::new(0.0, -size * sign * 0.3).into(),
        }
    };
    let columns = (0..pattern.n).flat_map(|j| {
        let entries = pattern.column_start[j]..pattern.column_start[j + 1];
        pattern.row[entries].iter().map(move |&i| line(i, j))
    });
    let equations = Equations {
        entries: columns.collect(),
        right: (0..pattern.n).map(|i| Affine::constant((i as f64).into())).collect(),
        ..Equations::default()
    };
    let uses = Uses { refine: true, ..Uses::default() };
    let plan = Plan::new(&pattern, &equations, 1.0, &[], uses).expect("a plan");
    let mut workspace = plan.workspace(&equations);
    let before = ALLOCATIONS.get();
    for batch in 0..6 {
        let frequencies: [f64; 16] = std::array::from_fn(|lane| (1 + batch * 16 + lane) as f64);
        let good = plan.run(&mut workspace, &frequencies[..plan.lanes()]).iter();
        assert!(good.clone().all(|verdict| verdict.is_good()));
        plan.refine(&mut workspace);
        assert!(workspace.left(0).0 < 1e-10);
    }
    assert_eq!(ALLOCATIONS.get() - before, 0);
}
