//! The sparse tableau of a network and its exact solution.
//!
//! Unknowns are all branch voltages, all branch currents and all node voltages. Equations are
//! Kirchhoff's current law at every node but the references, `v = e_left − e_right` for every
//! branch, and the branch laws. Most entries are ±1: they are eliminated first, without growth.
//! What remains is small and is solved by fraction-free elimination (Bareiss, 1968) over the
//! Gaussian integers, so that no common factors need to be looked for.

use crate::exact::network::{Law, Network, Sense};
use crate::exact::number::{Exact, least_common_multiple};
use num_bigint::BigInt;
use num_traits::{One, Zero};
use std::collections::BTreeMap;

/// The exact solution, by name.
#[derive(Clone, Debug)]
pub struct ExactSolution {
    /// Node voltages against the references of their islands.
    pub volts: BTreeMap<String, Exact>,
    /// Name of the reference of each node's island.
    pub references: BTreeMap<String, String>,
    /// Left minus right of each element.
    pub drops: BTreeMap<String, Exact>,
    /// Left to right through each element.
    pub amps: BTreeMap<String, Exact>,
    /// Absorbed power of each element.
    pub powers: BTreeMap<String, Exact>,
    /// Power all branches absorb, up to a positive factor: zero.
    pub imbalance: Exact,
}

/// A sparse equation; the known side stands in the column after the last unknown.
type Row = BTreeMap<usize, Exact>;

/// Solves a network; `None` where it is singular.
pub fn solve(network: &Network) -> Option<ExactSolution> {
    let references = network.references();
    let unknowns = Unknowns::new(network, &references);
    let rows = equations(network, &unknowns);
    let (values, scale) = solve_rows(rows.clone(), unknowns.count)?;
    for row in &rows {
        let sum = row.iter().fold(Exact::zero(), |sum, (column, factor)| {
            let known = *column == unknowns.count;
            let term = if known { -&(factor * &scale) } else { factor * &values[*column] };
            &sum + &term
        });
        assert!(sum.is_zero(), "the exact solution does not fulfil its own equations");
    }
    Some(collect(network, &references, &unknowns, &values, &scale))
}

/// Where each unknown stands.
struct Unknowns {
    branches: usize,
    /// Column of each node; `None` for references.
    nodes: Vec<Option<usize>>,
    count: usize,
}

impl Unknowns {
    fn new(network: &Network, references: &[usize]) -> Self {
        let branches = network.branches.len();
        let mut count = 2 * branches;
        let mut column = |node: usize| {
            (references[node] != node).then(|| {
                count += 1;
                count - 1
            })
        };
        let nodes = (0..network.nodes.len()).map(&mut column).collect();
        Unknowns { branches, nodes, count }
    }

    fn drop(&self, branch: usize) -> usize {
        branch
    }

    fn amps(&self, branch: usize) -> usize {
        self.branches + branch
    }
}

fn add(row: &mut Row, column: usize, factor: &Exact) {
    let entry = row.entry(column).or_insert_with(Exact::zero);
    *entry = (&*entry + factor).reduced();
    if entry.is_zero() {
        row.remove(&column);
    }
}

fn equations(network: &Network, unknowns: &Unknowns) -> Vec<Row> {
    let one = Exact::whole(1, 0);
    let mut rows = Vec::new();
    let mut balance = vec![Row::new(); network.nodes.len()];
    for (index, branch) in network.branches.iter().enumerate() {
        add(&mut balance[branch.left], unknowns.amps(index), &one);
        add(&mut balance[branch.right], unknowns.amps(index), &-&one);
        let mut row = Row::from([(unknowns.drop(index), one.clone())]);
        for (node, sign) in [(branch.left, -&one), (branch.right, one.clone())] {
            if let Some(column) = unknowns.nodes[node] {
                add(&mut row, column, &sign);
            }
        }
        rows.push(row);
        rows.extend(laws(network, unknowns, index));
    }
    let free = balance.into_iter().enumerate().filter(|(node, _)| unknowns.nodes[*node].is_some());
    rows.extend(free.map(|(_, row)| row));
    assert_eq!(rows.len(), unknowns.count, "as many equations as unknowns");
    rows
}

fn laws(network: &Network, unknowns: &Unknowns, index: usize) -> Vec<Row> {
    let one = Exact::whole(1, 0);
    let (drop, amps) = (unknowns.drop(index), unknowns.amps(index));
    let given = |column: usize, value: &Exact| {
        let mut row = Row::from([(column, one.clone())]);
        add(&mut row, unknowns.count, value);
        row
    };
    match &network.branches[index].law {
        Law::Impedance(z) => vec![Row::from([(drop, one), (amps, -z)])],
        Law::Admittance(y) => vec![Row::from([(amps, one), (drop, -y)])],
        Law::Voltage(value) => vec![given(drop, value)],
        Law::Current(value) => vec![given(amps, value)],
        Law::VoltageOf(terms) | Law::CurrentOf(terms) => {
            let voltage = matches!(network.branches[index].law, Law::VoltageOf(_));
            let mut row = Row::from([(if voltage { drop } else { amps }, one)]);
            for term in terms {
                sense(&mut row, unknowns, term.sense, &-&term.factor);
            }
            vec![row]
        }
        Law::Winding { own, dot_left } => {
            let mut row = Row::from([(drop, one), (amps, -own)]);
            for mutual in &network.mutuals {
                let other = match index {
                    _ if mutual.first == index => mutual.second,
                    _ if mutual.second == index => mutual.first,
                    _ => continue,
                };
                let Law::Winding { dot_left: dot, .. } = network.branches[other].law else {
                    panic!("a coupling to what is no winding");
                };
                let z = &mutual.impedance;
                let z = if dot == *dot_left { -z } else { z.clone() };
                add(&mut row, unknowns.amps(other), &z);
            }
            vec![row]
        }
        Law::Turns { .. } => vec![turns(network, unknowns, index)],
        Law::Wire => vec![Row::from([(drop, one)])],
        Law::AmplifierInput => {
            vec![Row::from([(drop, one.clone())]), Row::from([(amps, one)])]
        }
        Law::AmplifierOutput => vec![],
    }
}

/// The first winding of a transformer states that ampere-turns balance, every further one that
/// its volts per turn are those of the first.
fn turns(network: &Network, unknowns: &Unknowns, index: usize) -> Row {
    let Law::Turns { transformer, turns } = &network.branches[index].law else {
        panic!("no winding of an ideal transformer");
    };
    let same =
        network.branches.iter().enumerate().filter_map(|(other, branch)| match &branch.law {
            Law::Turns { transformer: t, turns } if t == transformer => Some((other, turns)),
            _ => None,
        });
    let all: Vec<_> = same.collect();
    let (first, first_turns) = all[0];
    if first == index {
        return all.iter().map(|(other, n)| (unknowns.amps(*other), (*n).clone())).collect();
    }
    Row::from([(unknowns.drop(index), first_turns.clone()), (unknowns.drop(first), -turns)])
}

fn sense(row: &mut Row, unknowns: &Unknowns, sense: Sense, factor: &Exact) {
    match sense {
        Sense::Drop(branch) => add(row, unknowns.drop(branch), factor),
        Sense::Amps(branch) => add(row, unknowns.amps(branch), factor),
        Sense::Volts(node, to) => {
            if let Some(column) = unknowns.nodes[node] {
                add(row, column, factor);
            }
            if let Some(column) = to.and_then(|to| unknowns.nodes[to]) {
                add(row, column, &-factor);
            }
        }
    }
}

/// The unknowns, all times the same scale, and that scale.
fn solve_rows(mut rows: Vec<Row>, count: usize) -> Option<(Vec<Exact>, Exact)> {
    let solved = eliminate_units(&mut rows, count);
    let (core, scale) = solve_core(&rows, count)?;
    let mut values = vec![Exact::zero(); count];
    for (column, value) in core {
        values[column] = value;
    }
    for (column, row) in solved.into_iter().rev() {
        let mut value = Exact::zero();
        for (other, factor) in &row {
            if *other == count {
                value = &value + &(factor * &scale);
            } else if *other != column {
                value = &value - &(factor * &values[*other]);
            }
        }
        values[column] = value;
    }
    Some((values, scale))
}

/// Eliminates with entries of ±1, those that fill in least first. What is left stays in `rows`.
fn eliminate_units(rows: &mut Vec<Row>, count: usize) -> Vec<(usize, Row)> {
    let mut solved = Vec::new();
    loop {
        let mut holders = vec![0; count + 1];
        for column in rows.iter().flat_map(|row| row.keys()) {
            holders[*column] += 1;
        }
        let entries = rows.iter().enumerate().flat_map(|(index, row)| {
            row.iter().map(move |(column, value)| (index, row.len(), *column, value))
        });
        let best = entries
            .filter(|(_, _, column, _)| *column != count)
            .filter_map(|(index, len, column, value)| Some((index, len, column, value.unit()?)))
            .min_by_key(|(_, len, column, _)| (len - 1) * (holders[*column] - 1));
        let Some((index, _, column, sign)) = best else { return solved };
        let mut pivot = rows.swap_remove(index);
        if sign < 0 {
            pivot.values_mut().for_each(|value| *value = -&*value);
        }
        for row in rows.iter_mut() {
            if let Some(factor) = row.get(&column).cloned() {
                for (other, value) in &pivot {
                    add(row, *other, &-&(&factor * value));
                }
            }
        }
        solved.push((column, pivot));
    }
}

/// A Gaussian integer.
type Gauss = (BigInt, BigInt);

fn times(a: &Gauss, b: &Gauss) -> Gauss {
    (&a.0 * &b.0 - &a.1 * &b.1, &a.0 * &b.1 + &a.1 * &b.0)
}

fn is_zero(a: &Gauss) -> bool {
    a.0.is_zero() && a.1.is_zero()
}

/// Solves the rest: each column with its value times the determinant, and the determinant.
fn solve_core(rows: &[Row], count: usize) -> Option<(Vec<(usize, Exact)>, Exact)> {
    let mut columns: Vec<usize> = rows.iter().flat_map(|row| row.keys().copied()).collect();
    columns.sort_unstable();
    columns.dedup();
    columns.retain(|column| *column != count);
    if columns.len() != rows.len() {
        return None;
    }
    let mut order = columns.clone();
    order.push(count);
    let mut matrix: Vec<Vec<Gauss>> = rows.iter().map(|row| integers(row, &order)).collect();
    let size = rows.len();
    let mut previous: Gauss = (BigInt::one(), BigInt::zero());
    for step in 0..size {
        let (row, column) = smallest(&matrix, step)?;
        matrix.swap(step, row);
        matrix.iter_mut().for_each(|row| row.swap(step, column));
        columns.swap(step, column);
        let pivot_row = matrix[step].clone();
        let pivot = &pivot_row[step];
        let conjugate = (previous.0.clone(), -&previous.1);
        let norm = &previous.0 * &previous.0 + &previous.1 * &previous.1;
        for (_, row) in matrix.iter_mut().enumerate().filter(|(index, _)| *index != step) {
            let factor = row[step].clone();
            for (entry, above) in row.iter_mut().zip(&pivot_row) {
                let (a, b) = (times(pivot, entry), times(&factor, above));
                let scaled = times(&(a.0 - b.0, a.1 - b.1), &conjugate);
                *entry = (scaled.0 / &norm, scaled.1 / &norm);
            }
        }
        previous = pivot_row[step].clone();
    }
    let value = |row: &Vec<Gauss>| Exact::integer(row[size].0.clone(), row[size].1.clone());
    let values = columns.iter().copied().zip(matrix.iter().map(value)).collect();
    Some((values, Exact::integer(previous.0, previous.1)))
}

/// A row times the least common denominator of its entries.
fn integers(row: &Row, order: &[usize]) -> Vec<Gauss> {
    let scale = row
        .values()
        .fold(BigInt::one(), |scale, value| least_common_multiple(&scale, value.denominator()));
    let entry = |column: &usize| match row.get(column) {
        Some(value) => value.scaled_to_integers(&scale),
        None => (BigInt::zero(), BigInt::zero()),
    };
    order.iter().map(entry).collect()
}

/// The non-zero entry with the fewest digits from row and column `step` on.
fn smallest(matrix: &[Vec<Gauss>], step: usize) -> Option<(usize, usize)> {
    let size = matrix.len();
    let places = (step..size).flat_map(|row| (step..size).map(move |column| (row, column)));
    places.filter(|(row, column)| !is_zero(&matrix[*row][*column])).min_by_key(|(row, column)| {
        let entry = &matrix[*row][*column];
        entry.0.bits().max(entry.1.bits())
    })
}

fn collect(
    network: &Network,
    references: &[usize],
    unknowns: &Unknowns,
    values: &[Exact],
    scale: &Exact,
) -> ExactSolution {
    let over = scale.inverse();
    let over_norm = (scale * &scale.conj()).inverse();
    let mut solution = ExactSolution {
        volts: BTreeMap::new(),
        references: BTreeMap::new(),
        drops: BTreeMap::new(),
        amps: BTreeMap::new(),
        powers: BTreeMap::new(),
        imbalance: Exact::zero(),
    };
    for (node, name) in network.nodes.iter().enumerate() {
        let volts = unknowns.nodes[node].map_or_else(Exact::zero, |column| &values[column] * &over);
        solution.volts.insert(name.clone(), volts);
        solution.references.insert(name.clone(), network.nodes[references[node]].clone());
    }
    for (index, branch) in network.branches.iter().enumerate() {
        let (drop, amps) = (&values[unknowns.drop(index)], &values[unknowns.amps(index)]);
        let power = drop * &amps.conj();
        solution.imbalance = &solution.imbalance + &power;
        if let Some(name) = &branch.name {
            solution.drops.insert(name.clone(), drop * &over);
            solution.amps.insert(name.clone(), amps * &over);
            solution.powers.insert(name.clone(), &power * &over_norm);
        }
    }
    solution
}
