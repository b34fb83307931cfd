//! Any number of windings as a mesh: a leg between every two terminals.
//!
//! The currents into the dots are Γ·v/s with Γ = L⁻¹, and the voltages of the windings are Aᵀ times
//! those of the terminals, A the signed incidence of the windings on the terminals. So the currents
//! into the terminals are B/s times their voltages, B = A·Γ·Aᵀ, whose rows add up to zero: exactly
//! what legs −1/B_pq between every two terminals do. Where B_pq is zero there is no leg. Windings
//! may share terminals or not; two free ones have six legs, two of them negative (fewer where the
//! tie makes two of their terminals one).
//!
//! Holds where L has an inverse (k < 1). The legs between two islands carry no net current (every
//! winding's current returns on its own side), so one tie fixes their potentials and changes
//! nothing. Mutual resistance stays outside as dependent sources. Loops of windings are singular at
//! f = 0. (Nodal inverse-inductance matrix, as in textbooks of circuit theory; from memory.)

use crate::circuit::{ElementId, End, FormulaId, Law, NodeId};
use crate::quantity::Dimension;
use crate::swap::algebra::{Algebra, Maybe};
use crate::swap::build::{Build, Laid, Role, joint};
use crate::swap::sets::CoupledSet;
use crate::swap::{Condition, Kind, SwapError, tie};
use std::collections::HashMap;

pub(crate) fn build(build: &mut Build, set: &CoupledSet) -> Result<Condition, SwapError> {
    let inverse = invert(build, set)?;
    // Islands that legs will be laid between are joined first: terminals that become one need no
    // legs between them.
    let mut ties = Vec::new();
    for i in 0..set.len() {
        for j in (i + 1..set.len()).filter(|&j| inverse.entries[i * set.len() + j].is_some()) {
            let nodes = [i, j].map(|i| set.windings[i].plain());
            ties.extend(tie::join_islands(build, &nodes));
        }
    }
    let terminals = terminals(build, set);
    // The current out of each terminal into the mesh.
    let mut into: Vec<Vec<(bool, ElementId)>> = vec![Vec::new(); terminals.nodes.len()];
    for p in 0..terminals.nodes.len() {
        for q in p + 1..terminals.nodes.len() {
            let Some(divisor) = inverse.between(&mut build.algebra, &terminals, p, q) else {
                continue;
            };
            let value = build.algebra.quotient(inverse.numerator, divisor);
            let ends = (terminals.nodes[p], terminals.nodes[q]);
            let [a, b] = [ends.0, ends.1].map(|node| build.node_name(node).replace('.', "_"));
            let laid = build.leg(&format!("mesh_{a}_{b}"), ends, (Some(value), None), Role::Shunt);
            if let Laid::Element(id) = laid {
                into[p].push((false, id));
                into[q].push((true, id));
            }
        }
    }
    for (i, winding) in set.windings.iter().enumerate() {
        // Into the dot, or out of the other end.
        let (terminal, out) = match terminals.private(i) {
            Some((terminal, dotted)) => (terminal, !dotted),
            None => continue,
        };
        let flip = (winding.dot == End::Right) != out;
        let terms = into[terminal].iter().map(|(negative, id)| (*negative != flip, *id));
        build.amps.entry(winding.id).or_insert_with(|| terms.collect());
    }
    Ok(if ties.is_empty() { Condition::Always } else { Condition::Tied(ties) })
}

/// The terminals of a set.
struct Terminals {
    nodes: Vec<NodeId>,
    /// The terminals of each winding's dot and of its other end.
    of: Vec<[usize; 2]>,
    /// How many ends of windings are at each.
    ends: Vec<usize>,
}

impl Terminals {
    /// A terminal where only this winding ends, and whether it is the dot's.
    fn private(&self, i: usize) -> Option<(usize, bool)> {
        let [dotted, plain] = self.of[i];
        let own = |terminal: usize| self.ends[terminal] == 1;
        match (own(dotted), own(plain)) {
            (true, _) => Some((dotted, true)),
            (_, true) => Some((plain, false)),
            _ => None,
        }
    }
}

/// Lays what stays outside, and finds the terminals behind it.
fn terminals(build: &mut Build, set: &CoupledSet) -> Terminals {
    let inner: Vec<[NodeId; 2]> = (0..set.len())
        .map(|i| {
            let winding = &set.windings[i];
            let laws = build.outside(set, i, true);
            [build.chain(winding, winding.dot, laws), winding.plain()]
        })
        .collect();
    let mut ends: HashMap<u32, usize> = HashMap::new();
    for node in inner.iter().flatten() {
        *ends.entry(build.node_key(*node)).or_default() += 1;
    }
    let mut of_key: HashMap<u32, usize> = HashMap::new();
    let mut terminals = Terminals { nodes: Vec::new(), of: Vec::new(), ends: Vec::new() };
    for (i, [mut dotted, plain]) in inner.into_iter().enumerate() {
        let winding = &set.windings[i];
        let shared = |node| ends[&build.node_key(node)] > 1;
        // A winding with nothing of its own needs a wire to read its current in.
        if !build.amps.contains_key(&winding.id) && shared(dotted) && shared(plain) {
            let resistance = build.algebra.number(0.0, Dimension::RESISTANCE);
            let law = (format!("{}_through", winding.name), Law::Resistor { resistance });
            dotted = build.chain(winding, winding.dot, vec![law]);
        }
        let mut place = |node: NodeId| {
            let at = *of_key.entry(build.node_key(node)).or_insert_with(|| {
                terminals.nodes.push(node);
                terminals.ends.push(0);
                terminals.nodes.len() - 1
            });
            terminals.ends[at] += 1;
            at
        };
        let both = [place(dotted), place(plain)];
        terminals.of.push(both);
    }
    terminals
}

/// Γ as numerators over one divisor.
struct Inverse {
    n: usize,
    /// Row-major; nothing where zero.
    entries: Vec<Maybe>,
    /// What a leg's divisor is under: D of a pair, else 1.
    numerator: FormulaId,
}

impl Inverse {
    /// −B_pq, from the incidence of the windings on the two terminals.
    fn between(&self, algebra: &mut Algebra, terminals: &Terminals, p: usize, q: usize) -> Maybe {
        let sign = |terminal: usize, winding: usize| {
            let [dotted, plain] = terminals.of[winding];
            i8::from(dotted == terminal) - i8::from(plain == terminal)
        };
        let mut sum = None;
        for a in (0..self.n).filter(|&a| sign(p, a) != 0) {
            for b in (0..self.n).filter(|&b| sign(q, b) != 0) {
                let Some(entry) = self.entries[a * self.n + b] else { continue };
                sum = match sign(p, a) == sign(q, b) {
                    true => algebra.difference(sum, Some(entry)),
                    false => algebra.sum(sum, Some(entry)),
                };
            }
        }
        sum
    }
}

fn invert(build: &mut Build, set: &CoupledSet) -> Result<Inverse, SwapError> {
    let refused = || {
        let (names, span) = (set.names(), set.span);
        SwapError::FullyCoupled { kind: Kind::Mesh, names, span }
    };
    let n = set.len();
    if n == 2 {
        let algebra = &mut build.algebra;
        let numerator = set.determinant(algebra).ok_or_else(refused)?;
        let minus = set.inductance(0, 1).map(|m| algebra.negative(m));
        let [a, b] = [0, 1].map(|i| Some(set.windings[i].inductance));
        let joint = joint(&set.windings[0].name, &set.windings[1].name);
        build.name_value(&format!("D_{joint}"), numerator);
        return Ok(Inverse { n, entries: vec![b, minus, minus, a], numerator });
    }
    // Sweeping every row of a symmetric matrix leaves its negative inverse, and the matrix stays
    // symmetric on the way (the sweep operator; Beaton 1964, from memory). Here the diagonal of
    // swept rows has its sign turned, so that what people see is positive.
    let mut a: Vec<Maybe> = (0..n * n).map(|at| set.inductance(at / n, at % n)).collect();
    let one = build.algebra.one();
    for k in 0..n {
        let pivot = a[k * n + k].ok_or_else(refused)?;
        if k > 0 {
            build.name_value(&format!("left_{}", set.windings[k].name), pivot);
        }
        let algebra = &mut build.algebra;
        let ratio: Vec<Maybe> =
            (0..n).map(|i| a[i * n + k].map(|entry| algebra.quotient(entry, pivot))).collect();
        for i in (0..n).filter(|&i| i != k) {
            for j in (i..n).filter(|&j| j != k) {
                let (Some(factor), Some(entry)) = (ratio[i], a[k * n + j]) else { continue };
                let part = algebra.product(factor, entry);
                let left = match i == j && i < k {
                    true => algebra.sum(a[i * n + j], Some(part)),
                    false => algebra.difference(a[i * n + j], Some(part)),
                };
                (a[i * n + j], a[j * n + i]) = (left, left);
            }
        }
        for i in (0..n).filter(|&i| i != k) {
            (a[i * n + k], a[k * n + i]) = (ratio[i], ratio[i]);
        }
        a[k * n + k] = Some(algebra.quotient(one, pivot));
    }
    let mut entries = vec![None; n * n];
    for i in 0..n {
        for j in i..n {
            let Some(swept) = a[i * n + j] else { continue };
            let [first, second] = [i, j].map(|i| set.windings[i].name.as_str());
            let name = if i == j { first.to_owned() } else { joint(first, second) };
            build.name_value(&format!("G_{name}"), swept);
            let entry = build.algebra.signed(i != j, swept);
            (entries[i * n + j], entries[j * n + i]) = (Some(entry), Some(entry));
        }
    }
    Ok(Inverse { n, entries, numerator: one })
}
