//! What a drawn circuit is: named nodes, branches with their laws, mutual impedances.

use crate::exact::number::Exact;

/// One two-terminal branch. Its drop is left minus right, its current flows left to right in it.
#[derive(Clone, Debug)]
pub struct Branch {
    /// The element's name; `None` for what results do not list (wires, amplifier inputs).
    pub name: Option<String>,
    pub left: usize,
    pub right: usize,
    pub law: Law,
}

/// What a branch says about its drop `v` and its current `i`.
#[derive(Clone, Debug)]
pub enum Law {
    /// `v = Z·i`
    Impedance(Exact),
    /// `i = Y·v`
    Admittance(Exact),
    /// `v` is given.
    Voltage(Exact),
    /// `i` is given.
    Current(Exact),
    /// `v` is a sum of readings.
    VoltageOf(Vec<Term>),
    /// `i` is a sum of readings.
    CurrentOf(Vec<Term>),
    /// `v = Z·i` and what the mutual impedances add.
    Winding { own: Exact, dot_left: bool },
    /// One winding of an ideal transformer, its dot on the left. Windings of one transformer
    /// follow each other in the list of branches.
    Turns { transformer: usize, turns: Exact },
    /// `v = 0`
    Wire,
    /// `v = 0` and `i = 0`
    AmplifierInput,
    /// Says nothing.
    AmplifierOutput,
}

/// A factor times a reading.
#[derive(Clone, Debug)]
pub struct Term {
    pub factor: Exact,
    pub sense: Sense,
}

/// A reading that controls a source.
#[derive(Clone, Copy, Debug)]
pub enum Sense {
    /// A node against another one, or against the reference of its island.
    Volts(usize, Option<usize>),
    /// The drop of a branch.
    Drop(usize),
    /// The current of a branch.
    Amps(usize),
}

/// `R + jωM` between two windings, referred to currents into their dots.
#[derive(Clone, Debug)]
pub struct Mutual {
    pub first: usize,
    pub second: usize,
    pub impedance: Exact,
}

/// A whole circuit at one frequency.
#[derive(Clone, Debug, Default)]
pub struct Network {
    pub nodes: Vec<String>,
    pub branches: Vec<Branch>,
    pub mutuals: Vec<Mutual>,
    /// Nodes in the order in which they are to become references: `gnd` first, then those a
    /// `reference` statement names, then the others as written.
    pub reference_order: Vec<usize>,
}

impl Network {
    /// For every node the reference of its island. Every branch ties its two ends.
    pub fn references(&self) -> Vec<usize> {
        let mut island: Vec<usize> = (0..self.nodes.len()).collect();
        for branch in &self.branches {
            let (from, to) = (island[branch.left], island[branch.right]);
            for one in island.iter_mut().filter(|one| **one == from) {
                *one = to;
            }
        }
        let mut references = vec![usize::MAX; self.nodes.len()];
        for &candidate in &self.reference_order {
            for node in 0..self.nodes.len() {
                if island[node] == island[candidate] && references[node] == usize::MAX {
                    references[node] = candidate;
                }
            }
        }
        references
    }

    /// The same network with every value rounded to doubles.
    pub fn rounded(&self) -> Self {
        let mut network = self.clone();
        for mutual in &mut network.mutuals {
            mutual.impedance = mutual.impedance.rounded();
        }
        for branch in &mut network.branches {
            match &mut branch.law {
                Law::Impedance(value)
                | Law::Admittance(value)
                | Law::Voltage(value)
                | Law::Current(value)
                | Law::Winding { own: value, .. } => *value = value.rounded(),
                Law::VoltageOf(terms) | Law::CurrentOf(terms) => {
                    terms.iter_mut().for_each(|term| term.factor = term.factor.rounded());
                }
                Law::Turns { .. } | Law::Wire | Law::AmplifierInput | Law::AmplifierOutput => {}
            }
        }
        network
    }
}
