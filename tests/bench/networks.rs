//! The four networks of the benchmark, as the equations a circuit's would be.

use bifilar::number::{Affine, ComplexTwofold, Twofold};
use bifilar::solve::Pattern;
use bifilar::solve::lanes::Equations;
use num_complex::Complex64;
use std::collections::BTreeMap;
use std::f64::consts::TAU;

/// A network and the band it is swept over.
pub struct Network {
    pub name: &'static str,
    pub pattern: Pattern,
    pub equations: Equations,
    pub from_hz: f64,
    pub to_hz: f64,
}

impl Network {
    /// Middle of the band by ratio.
    pub fn middle_hz(&self) -> f64 {
        (self.from_hz * self.to_hz).sqrt()
    }

    /// Frequencies over the band in equal ratios.
    pub fn frequencies(&self, count: usize) -> Vec<f64> {
        let ratio = self.to_hz / self.from_hz;
        let at = |i: usize| self.from_hz * ratio.powf(i as f64 / (count - 1).max(1) as f64);
        (0..count).map(at).collect()
    }
}

/// Builds modified nodal equations: G + jωB.
#[derive(Default)]
struct Builder {
    n: usize,
    entries: BTreeMap<(usize, usize), (f64, f64)>,
    right: BTreeMap<usize, f64>,
}

/// Reference node.
const GROUND: usize = usize::MAX;

impl Builder {
    fn unknown(&mut self) -> usize {
        self.n += 1;
        self.n - 1
    }

    /// Adds constant + jω·reactive to an entry.
    fn add(&mut self, row: usize, column: usize, constant: f64, reactive: f64) {
        if row != GROUND && column != GROUND {
            let entry = self.entries.entry((column, row)).or_default();
            entry.0 += constant;
            entry.1 += reactive;
        }
    }

    /// An admittance G + jωC between two nodes.
    fn admittance(&mut self, a: usize, b: usize, g: f64, c: f64) {
        self.add(a, a, g, c);
        self.add(b, b, g, c);
        self.add(a, b, -g, -c);
        self.add(b, a, -g, -c);
    }

    /// A branch with the current as an unknown: v_a − v_b − (R + jωL)·i = 0.
    fn branch(&mut self, a: usize, b: usize, r: f64, l: f64) -> usize {
        let i = self.unknown();
        for (node, sign) in [(a, 1.0), (b, -1.0)] {
            self.add(node, i, sign, 0.0);
            self.add(i, node, sign, 0.0);
        }
        self.add(i, i, -r, -l);
        i
    }

    /// A voltage source from a node to the reference.
    fn source(&mut self, node: usize, volts: f64) {
        let i = self.unknown();
        self.add(node, i, 1.0, 0.0);
        self.add(i, node, 1.0, 0.0);
        self.right.insert(i, volts);
    }

    fn done(self, name: &'static str, from_hz: f64, to_hz: f64) -> Network {
        let affine = |constant: f64, reactive: f64| Affine {
            constant: constant.into(),
            slope: ComplexTwofold { re: Twofold::ZERO, im: Twofold::new(TAU * reactive) },
        };
        let mut column_start = vec![0; self.n + 1];
        self.entries.keys().for_each(|&(column, _)| column_start[column + 1] += 1);
        (0..self.n).for_each(|j| column_start[j + 1] += column_start[j]);
        let row = self.entries.keys().map(|&(_, row)| row).collect();
        let entries = self.entries.values().map(|&(g, b)| affine(g, b)).collect();
        let mut right = vec![Affine::default(); self.n];
        self.right.iter().for_each(|(&row, &volts)| right[row] = affine(volts, 0.0));
        let equations = Equations { entries, right, ..Equations::default() };
        let pattern = Pattern { n: self.n, column_start, row };
        Network { name, pattern, equations, from_hz, to_hz }
    }
}

/// Values that differ from element to element as real ones do, the same in every run.
struct Spread(fastrand::Rng);

impl Spread {
    fn new(seed: u64) -> Self {
        Spread(fastrand::Rng::with_seed(seed))
    }

    fn around(&mut self, value: f64) -> f64 {
        value * (0.9 + 0.2 * self.0.f64())
    }
}

/// 1000 sections of R, L and C.
pub fn ladder() -> Network {
    let (mut b, mut spread) = (Builder::default(), Spread::new(1));
    let mut node = b.unknown();
    b.source(node, 1.0);
    for _ in 0..1000 {
        let middle = b.unknown();
        b.admittance(node, middle, 1.0 / spread.around(0.5), 0.0);
        let next = b.unknown();
        b.branch(middle, next, spread.around(0.02), spread.around(1e-6));
        b.admittance(next, GROUND, spread.around(1e-6), spread.around(1e-9));
        node = next;
    }
    b.admittance(node, GROUND, 1.0 / 50.0, 0.0);
    b.done("ladder", 1e4, 1e7)
}

/// A supply plane of 60 × 60 nodes with R-L branches and a load at every node, fed at its corners.
pub fn grid() -> Network {
    const SIDE: usize = 60;
    let (mut b, mut spread) = (Builder::default(), Spread::new(2));
    let nodes: Vec<usize> = (0..SIDE * SIDE).map(|_| b.unknown()).collect();
    let node = |x: usize, y: usize| nodes[y * SIDE + x];
    for y in 0..SIDE {
        for x in 0..SIDE {
            b.admittance(node(x, y), GROUND, spread.around(1e-3), spread.around(1e-9));
            if x + 1 < SIDE {
                b.branch(node(x, y), node(x + 1, y), spread.around(0.5), spread.around(1e-6));
            }
            if y + 1 < SIDE {
                b.branch(node(x, y), node(x, y + 1), spread.around(0.5), spread.around(1e-6));
            }
        }
    }
    for (x, y) in [(0, 0), (SIDE - 1, 0), (0, SIDE - 1), (SIDE - 1, SIDE - 1)] {
        b.source(node(x, y), 1.0);
    }
    b.done("grid", 1e4, 1e7)
}

/// 210 turns of one coil, every turn coupled to every other, with capacitance from turn to turn.
pub fn coil() -> Network {
    const TURNS: usize = 210;
    let (mut b, mut spread) = (Builder::default(), Spread::new(3));
    let mut node = b.unknown();
    b.source(node, 1.0);
    let mut turns = Vec::new();
    for _ in 0..TURNS - 1 {
        let next = b.unknown();
        turns.push(b.branch(node, next, spread.around(0.05), 0.0));
        b.admittance(node, next, 0.0, spread.around(20e-12));
        b.admittance(next, GROUND, 0.0, spread.around(2e-12));
        node = next;
    }
    turns.push(b.branch(node, GROUND, spread.around(0.05), 0.0));
    for (p, &row) in turns.iter().enumerate() {
        for (q, &column) in turns.iter().enumerate() {
            // Coupling that falls with the distance of the turns.
            let k = 0.98f64.powi((p as i32 - q as i32).abs());
            b.add(row, column, 0.0, -1e-6 * k);
        }
    }
    b.done("coil", 1e4, 1e7)
}

/// A double-tuned link of 20 unknowns.
pub fn tiny() -> Network {
    let (mut b, mut spread) = (Builder::default(), Spread::new(4));
    let mut node = b.unknown();
    b.source(node, 1.0);
    let mut windings = Vec::new();
    for _ in 0..6 {
        let middle = b.unknown();
        b.admittance(node, middle, 1.0 / spread.around(0.5), 0.0);
        let next = b.unknown();
        windings.push(b.branch(middle, next, spread.around(0.1), spread.around(1e-6)));
        b.admittance(next, GROUND, spread.around(1e-5), spread.around(1e-9));
        node = next;
    }
    for pair in windings.windows(2) {
        b.add(pair[0], pair[1], 0.0, -3e-7);
        b.add(pair[1], pair[0], 0.0, -3e-7);
    }
    b.admittance(node, GROUND, 1.0 / 50.0, 0.0);
    b.done("tiny", 1e4, 1e7)
}

/// Matrix values and right-hand side at one frequency, in plain doubles.
pub fn values(network: &Network, f: f64, entries: &mut [Complex64], right: &mut [Complex64]) {
    let at = |a: &Affine| a.constant.to_complex() + a.slope.to_complex() * f;
    entries.iter_mut().zip(&network.equations.entries).for_each(|(out, a)| *out = at(a));
    right.iter_mut().zip(&network.equations.right).for_each(|(out, a)| *out = at(a));
}
