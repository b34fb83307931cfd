//! Lanes against a dense solver that pivots completely at each frequency by itself.

use crate::number::{Affine, ComplexTwofold, Twofold};
use crate::solve::Pattern;
use crate::solve::lanes::{Equations, Instructions, Plan, PlanError, Uses};
use num_complex::Complex64;
use std::collections::BTreeMap;
use std::f64::consts::TAU;

/// A random network: nodal equations with branches, and one or two right-hand sides.
#[derive(Default)]
struct Drawn {
    n: usize,
    entries: BTreeMap<(usize, usize), (f64, f64)>,
    right: Vec<Affine>,
    extra_entries: Vec<u32>,
    extra_right: Vec<u32>,
}

impl Drawn {
    fn add(&mut self, row: usize, column: usize, constant: f64, reactive: f64) {
        let entry = self.entries.entry((column, row)).or_default();
        entry.0 += constant;
        entry.1 += reactive;
    }

    fn admittance(&mut self, a: usize, b: usize, g: f64, c: f64) {
        self.add(a, a, g, c);
        if a != b {
            self.add(b, b, g, c);
            self.add(a, b, -g, -c);
            self.add(b, a, -g, -c);
        }
    }

    fn branch(&mut self, current: usize, a: usize, b: usize, r: f64, l: f64) {
        self.add(a, current, 1.0, 0.0);
        self.add(current, a, 1.0, 0.0);
        if a != b {
            self.add(b, current, -1.0, 0.0);
            self.add(current, b, -1.0, 0.0);
        }
        self.add(current, current, -r, -l);
    }

    fn done(self) -> (Pattern, Equations) {
        let mut column_start = vec![0; self.n + 1];
        self.entries.keys().for_each(|&(column, _)| column_start[column + 1] += 1);
        (0..self.n).for_each(|j| column_start[j + 1] += column_start[j]);
        let row = self.entries.keys().map(|&(_, row)| row).collect();
        let entries = self.entries.values().map(|&(g, b)| affine(g, b)).collect();
        let Drawn { n, right, extra_entries, extra_right, .. } = self;
        let equations = Equations { entries, right, extra_entries, extra_right };
        (Pattern { n, column_start, row }, equations)
    }
}

fn affine(constant: f64, reactive: f64) -> Affine {
    let slope = ComplexTwofold { re: Twofold::ZERO, im: Twofold::new(TAU * reactive) };
    Affine { constant: constant.into(), slope }
}

/// A network of about `size` unknowns: a chain of nodes with cross links, coupled windings,
/// grounded sources, and controlled sources if wanted.
fn draw(seed: u64, size: usize, controlled: bool, sides: usize) -> (Pattern, Equations) {
    let mut rng = fastrand::Rng::with_seed(seed);
    let nodes = (size * 2 / 3).max(1);
    let branches = size - nodes;
    let mut drawn = Drawn { n: size, ..Drawn::default() };
    let spread = |rng: &mut fastrand::Rng, middle: f64| middle * 10f64.powf(rng.f64() * 2.0 - 1.0);
    for node in 0..nodes {
        let (g, c) = (spread(&mut rng, 1e-2), spread(&mut rng, 1e-9));
        drawn.admittance(node, node, g, c);
        let other = if rng.bool() { node.saturating_sub(1) } else { rng.usize(0..nodes) };
        let g = spread(&mut rng, 1e-1);
        drawn.admittance(node, other, g, 0.0);
    }
    let windings: Vec<usize> = (nodes..nodes + branches).collect();
    for &current in &windings {
        let (a, b) = (rng.usize(0..nodes), rng.usize(0..nodes));
        if rng.u8(0..10) == 0 {
            // A grounded source: its node may only have one.
            let free = (0..nodes)
                .find(|&v| !windings.iter().any(|&w| drawn.entries.contains_key(&(v, w))));
            if let Some(node) = free {
                drawn.add(node, current, 1.0, 0.0);
                drawn.add(current, node, 1.0, 0.0);
                continue;
            }
        }
        let (r, l) = (spread(&mut rng, 1.0), spread(&mut rng, 1e-5));
        drawn.branch(current, a, b, r, l);
    }
    for pair in windings.windows(2) {
        let own = |w: usize| drawn.entries.get(&(w, w)).map_or(0.0, |e| e.1);
        let m = 0.4 * (own(pair[0]) * own(pair[1])).sqrt();
        if m > 0.0 {
            drawn.add(pair[0], pair[1], 0.0, -m);
            drawn.add(pair[1], pair[0], 0.0, -m);
        }
    }
    if controlled {
        for _ in 0..1 + size / 8 {
            let (row, column) = (rng.usize(0..nodes), rng.usize(0..nodes));
            let gm = spread(&mut rng, 1e-2);
            drawn.add(row, column, gm, 0.0);
        }
    }
    drawn.right = vec![Affine::default(); size * sides];
    for side in 0..sides {
        for row in [rng.usize(0..size), size - 1] {
            drawn.right[side * size + row] = affine(1.0 + rng.f64(), 1e-9);
        }
    }
    drawn.done()
}

/// Matrix and right-hand sides in full at one frequency, in twice the precision.
fn full(
    pattern: &Pattern,
    equations: &Equations,
    f: f64,
) -> (Vec<Vec<ComplexTwofold>>, Vec<ComplexTwofold>) {
    let n = pattern.n;
    let at = |a: &Affine| a.at(f);
    let mut matrix = vec![vec![ComplexTwofold::ZERO; n]; n];
    for j in 0..n {
        for slot in pattern.column_start[j]..pattern.column_start[j + 1] {
            matrix[pattern.row[slot]][j] += at(&equations.entries[slot]);
        }
    }
    (matrix, equations.right.iter().map(at).collect())
}

/// Gauss with partial pivoting, in twice the precision, for the first right-hand side.
fn reference(pattern: &Pattern, equations: &Equations, f: f64) -> Vec<Complex64> {
    let n = pattern.n;
    let (mut a, b) = full(pattern, equations, f);
    a.iter_mut().zip(&b).for_each(|(row, &b)| row.push(b));
    for k in 0..n {
        let best = (k..n).max_by(|&p, &q| a[p][k].norm().total_cmp(&a[q][k].norm())).unwrap();
        a.swap(k, best);
        let (done, rest) = a.split_at_mut(k + 1);
        for row in rest.iter_mut().filter(|row| !row[k].is_zero()) {
            let factor = row[k] / done[k][k];
            for j in k..=n {
                row[j] -= factor * done[k][j];
            }
        }
    }
    let mut x = vec![ComplexTwofold::ZERO; n];
    for k in (0..n).rev() {
        let mut sum = a[k][n];
        for j in k + 1..n {
            sum -= a[k][j] * x[j];
        }
        x[k] = sum / a[k][k];
    }
    x.into_iter().map(ComplexTwofold::to_complex).collect()
}

/// Largest |b − A·x| / (|A|·|x| + |b|) over rows, by direct sums in twice the precision.
fn backward_error(pattern: &Pattern, equations: &Equations, f: f64, x: &[Complex64]) -> f64 {
    let (a, b) = full(pattern, equations, f);
    let of_row = |(row, &b): (&Vec<ComplexTwofold>, &ComplexTwofold)| {
        let (mut rest, mut scale) = (b, b.norm());
        for (value, x) in row.iter().zip(x) {
            rest -= *value * ComplexTwofold::from(*x);
            scale += value.norm() * x.norm();
        }
        rest.norm() / scale.max(f64::MIN_POSITIVE)
    };
    a.iter().zip(&b).map(of_row).fold(0.0, f64::max)
}

const BAND: (f64, f64) = (1e0, 1e8);

fn frequencies(count: usize) -> Vec<f64> {
    let step = (BAND.1 / BAND.0).powf(1.0 / (count - 1) as f64);
    (0..count).map(|i| BAND.0 * step.powi(i as i32)).collect()
}

fn solutions(plan: &Plan, equations: &Equations, n: usize, f: &[f64]) -> Vec<Vec<Complex64>> {
    let mut workspace = plan.workspace(equations);
    let mut out = Vec::new();
    for batch in f.chunks(plan.lanes()) {
        let used = plan.run(&mut workspace, batch).len();
        for lane in 0..used {
            out.push((0..n).map(|i| workspace.solution(i, lane)).collect());
        }
    }
    out
}

#[test]
fn good_lanes_have_the_backward_error_they_claim_and_nearly_all_are_good() {
    let (mut good, mut all, mut symmetric) = (0, 0, 0);
    for seed in 0..60 {
        let size = [1, 2, 3, 5, 9, 17, 40, 90, 150, 300][seed as usize % 10];
        let (pattern, equations) = draw(seed, size, seed % 20 >= 10, 1);
        let uses = Uses { further_solves: seed % 2 == 0, ..Uses::default() };
        let plan = Plan::new(&pattern, &equations, 1e4, &[], uses).unwrap();
        symmetric += usize::from(plan.is_symmetric());
        let mut workspace = plan.workspace(&equations);
        for batch in frequencies(9).chunks(plan.lanes()) {
            let verdicts = plan.run(&mut workspace, batch).to_vec();
            for (lane, verdict) in verdicts.iter().enumerate() {
                let x: Vec<_> = (0..size).map(|i| workspace.solution(i, lane)).collect();
                let truth = backward_error(&pattern, &equations, batch[lane], &x);
                let told = verdict.backward_error;
                assert!(truth <= 2.0 * told + 1e-15, "{seed}: claimed {told}, is {truth}");
                all += 1;
                good += usize::from(verdict.is_good());
            }
        }
    }
    assert!(good * 100 >= all * 90, "{good} of {all} lanes are good");
    assert!(symmetric > 0, "no network took the symmetric plan");
}

#[test]
fn lanes_agree_with_gaussian_elimination_in_twice_the_precision() {
    for seed in 0..20 {
        let size = [4, 11, 30, 60][seed as usize % 4];
        let (pattern, equations) = draw(100 + seed, size, seed % 2 == 1, 1);
        let plan = Plan::new(&pattern, &equations, 1e4, &[], Uses::default()).unwrap();
        let f = [1e3, 1e4, 1e5];
        for (x, f) in solutions(&plan, &equations, size, &f).iter().zip(f) {
            let truth = reference(&pattern, &equations, f);
            let largest = truth.iter().map(|x| x.norm()).fold(0.0, f64::max);
            for (x, truth) in x.iter().zip(&truth) {
                assert!((x - truth).norm() <= 1e-9 * largest, "{seed} at {f} Hz: {x} and {truth}");
            }
        }
    }
}

#[test]
fn results_are_the_same_bits_however_frequencies_are_grouped_and_plans_reused() {
    for (seed, size) in [(1, 12), (2, 80), (3, 300)] {
        let (pattern, equations) = draw(seed, size, false, 1);
        let plan = Plan::new(&pattern, &equations, 1e4, &[], Uses::default()).unwrap();
        let f = frequencies(21);
        let together = solutions(&plan, &equations, size, &f);
        assert_eq!(together, solutions(&plan, &equations, size, &f), "the plan used again");
        for (f, expected) in f.iter().zip(&together) {
            assert_eq!(&solutions(&plan, &equations, size, &[*f])[0], expected, "alone at {f} Hz");
        }
        let again = Plan::new(&pattern, &equations, 1e4, &[], Uses::default()).unwrap();
        assert_eq!(together, solutions(&again, &equations, size, &f), "the plan made again");
    }
}

#[test]
fn eight_and_sixteen_lanes_give_the_same_bits() {
    for size in [20, 200] {
        let (pattern, equations) = draw(9, size, true, 1);
        let of = |lanes| {
            let uses = Uses { lanes: Some(lanes), ..Uses::default() };
            let plan = Plan::new(&pattern, &equations, 1e4, &[], uses).unwrap();
            assert_eq!(plan.lanes(), lanes);
            solutions(&plan, &equations, size, &frequencies(16))
        };
        assert_eq!(of(8), of(16));
    }
}

#[test]
fn every_instruction_set_of_the_machine_solves_as_well() {
    for instructions in [Instructions::Baseline, Instructions::Avx2, Instructions::Avx512] {
        let uses = Uses { instructions: Some(instructions), ..Uses::default() };
        for (seed, size) in [(5, 15), (6, 300)] {
            let (pattern, equations) = draw(seed, size, false, 1);
            let plan = Plan::new(&pattern, &equations, 1e4, &[], uses).unwrap();
            let x = solutions(&plan, &equations, size, &[1e4]);
            assert!(backward_error(&pattern, &equations, 1e4, &x[0]) < 1e-13);
        }
    }
}

/// An undamped L-C loop with a source: singular exactly at one frequency in hertz.
fn tank() -> (Pattern, Equations) {
    let mut drawn = Drawn { n: 2, ..Drawn::default() };
    // (j·f)·v + i = 1 and v − (j·f)·i = 0, so that 1 − f² = 0 at 1 Hz.
    drawn.admittance(0, 0, 0.0, 1.0 / TAU);
    drawn.branch(1, 0, 0, 0.0, 1.0 / TAU);
    drawn.right = vec![affine(1.0, 0.0), affine(0.0, 0.0)];
    drawn.done()
}

#[test]
fn a_singular_lane_is_flagged_and_does_not_disturb_its_neighbours() {
    let (pattern, mut equations) = tank();
    let one = ComplexTwofold { re: Twofold::ZERO, im: Twofold::ONE };
    for entry in &mut equations.entries {
        if !entry.slope.is_zero() {
            entry.slope = if entry.slope.im.hi > 0.0 { one } else { -one };
        }
    }
    let plan = Plan::new(&pattern, &equations, 3.0, &[], Uses::default()).unwrap();
    let mut workspace = plan.workspace(&equations);
    let f: Vec<f64> = (1..=plan.lanes()).map(|step| step as f64 * 0.25).collect();
    let verdicts = plan.run(&mut workspace, &f).to_vec();
    for (lane, verdict) in verdicts.iter().enumerate() {
        assert_eq!(verdict.is_good(), f[lane] != 1.0, "{} Hz: {verdict:?}", f[lane]);
        if f[lane] != 1.0 {
            let alone = solutions(&plan, &equations, 2, &[f[lane]]);
            assert_eq!(alone[0][0], workspace.solution(0, lane));
        }
    }
}

#[test]
fn a_sample_without_pivots_is_refused() {
    let mut drawn = Drawn { n: 2, ..Drawn::default() };
    drawn.add(0, 0, 1.0, 0.0);
    drawn.add(1, 0, 1.0, 0.0);
    drawn.right = vec![Affine::default(); 2];
    let (pattern, equations) = drawn.done();
    let plan = Plan::new(&pattern, &equations, 1.0, &[], Uses::default());
    assert!(matches!(plan, Err(PlanError::Singular { .. })));
}

#[test]
fn further_and_transposed_right_hand_sides_use_the_same_factors() {
    for size in [1, 7, 50, 200] {
        let (pattern, equations) = draw(40 + size as u64, size, true, 2);
        let uses = Uses { further_solves: true, ..Uses::default() };
        let plan = Plan::new(&pattern, &equations, 1e4, &[], uses).unwrap();
        let f = frequencies(plan.lanes());
        let mut workspace = plan.workspace(&equations);
        plan.run(&mut workspace, &f);
        let mut rng = fastrand::Rng::with_seed(7);
        let right: Vec<Complex64> =
            (0..2 * size).map(|_| Complex64::new(rng.f64() - 0.5, rng.f64())).collect();
        for transposed in [false, true] {
            for lane in 0..plan.lanes() {
                for (at, &value) in right.iter().enumerate() {
                    workspace.set_right(at / size, at % size, lane, value);
                }
            }
            if transposed {
                plan.solve_transposed(&mut workspace);
            } else {
                plan.solve(&mut workspace);
            }
            let lane = plan.lanes() / 2;
            let (a, _) = full(&pattern, &equations, f[lane]);
            for side in 0..2 {
                let x: Vec<_> = (0..size).map(|i| workspace.solution_of(side, i, lane)).collect();
                for i in 0..size {
                    let mut rest = right[side * size + i];
                    let mut scale = rest.norm();
                    for j in 0..size {
                        let value = if transposed { a[j][i] } else { a[i][j] }.to_complex();
                        rest -= value * x[j];
                        scale += value.norm() * x[j].norm();
                    }
                    assert!(rest.norm() <= 1e-9 * scale, "{size}, transposed {transposed}");
                }
            }
        }
    }
}

#[test]
fn values_given_frequency_by_frequency_are_added() {
    for (size, controlled) in [(9, true), (300, false)] {
        let (pattern, mut equations) = draw(77, size, controlled, 1);
        // A diagonal entry of a node and the right-hand side of the first row.
        let slot = (pattern.column_start[0]..pattern.column_start[1])
            .find(|&slot| pattern.row[slot] == 0)
            .unwrap();
        equations.extra_entries = vec![slot as u32];
        equations.extra_right = vec![0];
        let extra = |f: f64| [Complex64::new(f.sqrt() * 1e-4, 1e-3), Complex64::new(0.5, f * 1e-8)];
        let plan = Plan::new(&pattern, &equations, 1e4, &extra(1e4), Uses::default()).unwrap();
        let f = frequencies(plan.lanes());
        let mut workspace = plan.workspace(&equations);
        for (lane, &f) in f.iter().enumerate() {
            extra(f).into_iter().enumerate().for_each(|(w, v)| workspace.set_extra(w, lane, v));
        }
        plan.run(&mut workspace, &f);
        for (lane, &f) in f.iter().enumerate() {
            let mut fixed = equations.clone();
            fixed.entries[slot].constant += ComplexTwofold::from(extra(f)[0]);
            fixed.right[0].constant += ComplexTwofold::from(extra(f)[1]);
            let x: Vec<_> = (0..size).map(|i| workspace.solution(i, lane)).collect();
            assert!(backward_error(&pattern, &fixed, f, &x) < 1e-10, "{size} at {f} Hz");
        }
    }
}
