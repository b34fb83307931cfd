//! The flat circuit: nodes, elements, couplings and formulas, with names and places kept.

pub mod elaborate;
pub mod error;
pub mod formula;
pub mod island;
pub mod judge;
pub mod print;
pub mod program;
pub mod table;

use crate::quantity::Dimension;
use crate::source::Span;
use crate::text::ast::LimitKind;
pub use formula::{Fault, Formula, FormulaId, Measure, Operation, Phase, Table, Tape, Values};

/// Index of a node; node 0 is `gnd`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct NodeId(pub u32);

/// The node `gnd`.
pub const GND: NodeId = NodeId(0);

/// Index of an element.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct ElementId(pub u32);

/// Index of a [`Table`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct TableId(pub u32);

impl NodeId {
    /// Position in [`Circuit::nodes`].
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

impl ElementId {
    /// Position in [`Circuit::elements`].
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

/// A node. Names joined by wires are one node with several names.
#[derive(Clone, Debug, PartialEq)]
pub struct Node {
    /// Its names, the one written first in front (`gnd` before all others).
    pub names: Vec<String>,
    /// Where it was first written.
    pub span: Span,
}

/// One end of an element.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum End {
    /// The end written first.
    Left,
    /// The end written last.
    Right,
}

impl End {
    /// +1 for the left end, −1 for the right end.
    pub fn sign(self) -> i8 {
        match self {
            End::Left => 1,
            End::Right => -1,
        }
    }
}

/// What a source drives: `constant + Σ factor · reading`, counted in the direction of its mark.
#[derive(Clone, Debug, PartialEq)]
pub struct Drive {
    /// The part that does not depend on the circuit.
    pub constant: Option<FormulaId>,
    /// The parts in proportion to readings: factor and reading.
    pub terms: Vec<(FormulaId, Measure)>,
    /// The positive end of a voltage source; the end a current source drives its current out of
    /// the element at is the other one (its current enters at this end).
    pub end: End,
}

/// How a capacitor loses energy.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum CapacitorLoss {
    /// Not at all.
    None,
    /// A resistance in series, in ohms.
    Series(FormulaId),
    /// A loss tangent: series resistance times ωC (IEC 60384-1), the same at every frequency.
    Tangent(FormulaId),
}

/// What an element is.
#[derive(Clone, Debug, PartialEq)]
pub enum Law {
    /// v = R·i; complex values are impedances.
    Resistor {
        /// In ohms.
        resistance: FormulaId,
    },
    /// i = G·v; complex values are admittances.
    Conductance {
        /// In siemens.
        conductance: FormulaId,
    },
    /// v = (R + jωL)·i + couplings.
    Winding {
        /// In henries.
        inductance: FormulaId,
        /// Series resistance in ohms.
        series: Option<FormulaId>,
        /// The end with the dot.
        dot: Option<End>,
    },
    /// i = jωC·v, with losses.
    Capacitor {
        /// In farads.
        capacitance: FormulaId,
        /// Its losses.
        loss: CapacitorLoss,
    },
    /// v is given.
    VoltageSource(Drive),
    /// i is given.
    CurrentSource(Drive),
    /// One winding of an ideal transformer: all v/turns are equal, Σ turns·i = 0.
    IdealWinding {
        /// Which of [`Circuit::ideals`].
        ideal: usize,
        /// Its turns.
        turns: FormulaId,
    },
    /// The output (left) of an ideal operational amplifier against `gnd` (right).
    OpAmp {
        /// Non-inverting input.
        plus: NodeId,
        /// Inverting input.
        minus: NodeId,
    },
}

/// An element between two nodes.
#[derive(Clone, Debug, PartialEq)]
pub struct Element {
    /// Its name, unique in the circuit.
    pub name: String,
    /// The node at its left end.
    pub left: NodeId,
    /// The node at its right end.
    pub right: NodeId,
    /// What it is.
    pub law: Law,
    /// Its tolerance as a fraction.
    pub tolerance: Option<FormulaId>,
    /// Where it was written.
    pub span: Span,
}

/// Two coupled windings.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Coupling {
    /// One winding.
    pub first: ElementId,
    /// The other.
    pub second: ElementId,
    /// Mutual inductance in henries, for currents into the dots.
    pub mutual: FormulaId,
    /// Mutual resistance in ohms, for currents into the dots.
    pub resistance: Option<FormulaId>,
    /// How it was stated.
    pub stated: Stated,
    /// Where it was stated.
    pub span: Span,
}

/// How a coupling was stated; the readings are cross-checked later.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Stated {
    /// As a coupling factor.
    Factor(FormulaId),
    /// As a mutual inductance.
    Mutual,
    /// As the inductance of one winding with the other one shorted.
    Leakage {
        /// The reading in henries.
        value: FormulaId,
        /// The winding it was taken at.
        at: ElementId,
    },
    /// As two readings of both windings in series.
    Series {
        /// In henries.
        aiding: FormulaId,
        /// In henries.
        opposing: FormulaId,
    },
}

/// An ideal transformer.
#[derive(Clone, Debug, PartialEq)]
pub struct Ideal {
    /// Its name; its windings are called `name.1`, `name.2`, …
    pub name: String,
    /// Its windings.
    pub windings: Vec<ElementId>,
}

/// A limit of a reading.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ReadLimit {
    /// Which way it holds.
    pub kind: LimitKind,
    /// The limit, real, of the reading's dimension.
    pub value: FormulaId,
}

/// A reading with a name.
#[derive(Clone, Debug, PartialEq)]
pub struct Read {
    /// What it is called.
    pub name: String,
    /// What is read.
    pub value: FormulaId,
    /// Its limits.
    pub limits: Vec<ReadLimit>,
    /// Where it was written.
    pub span: Span,
}

/// A flat circuit.
#[derive(Clone, Debug, PartialEq)]
pub struct Circuit {
    /// Its title.
    pub title: Option<String>,
    /// Its nodes; the first is `gnd`, used or not.
    pub nodes: Vec<Node>,
    /// Its elements, in the order written.
    pub elements: Vec<Element>,
    /// Its couplings; no pair stands twice.
    pub couplings: Vec<Coupling>,
    /// Its ideal transformers.
    pub ideals: Vec<Ideal>,
    /// Nodes chosen as references of their islands.
    pub references: Vec<(NodeId, Span)>,
    /// Its readings.
    pub reads: Vec<Read>,
    /// The `let`s and parameters that were given names, for printing.
    pub lets: Vec<(String, FormulaId)>,
    /// All its formulas.
    pub tape: Tape,
}

impl Element {
    /// Gives every node of the element, inputs included, a new number.
    pub fn renumber_nodes(&mut self, renumber: impl Fn(&mut NodeId)) {
        renumber(&mut self.left);
        renumber(&mut self.right);
        match &mut self.law {
            Law::OpAmp { plus, minus } => {
                renumber(plus);
                renumber(minus);
            }
            Law::VoltageSource(drive) | Law::CurrentSource(drive) => {
                drive.terms.iter_mut().for_each(|(_, measure)| measure.renumber_nodes(&renumber));
            }
            _ => {}
        }
    }
}

impl Circuit {
    /// An element.
    pub fn element(&self, id: ElementId) -> &Element {
        &self.elements[id.index()]
    }

    /// The first name of a node.
    pub fn node_name(&self, id: NodeId) -> &str {
        &self.nodes[id.index()].names[0]
    }

    /// Every element with its number.
    pub fn each_element(&self) -> impl Iterator<Item = (ElementId, &Element)> {
        self.elements.iter().enumerate().map(|(i, e)| (ElementId(i as u32), e))
    }

    /// What users call the kind of an element.
    pub fn kind(&self, element: &Element) -> &'static str {
        let complex = |id: FormulaId| !self.tape.get(id).real;
        match &element.law {
            Law::Resistor { resistance } if complex(*resistance) => "impedance",
            Law::Resistor { .. } => "resistor",
            Law::Conductance { conductance } if complex(*conductance) => "admittance",
            Law::Conductance { .. } => "conductance",
            Law::Winding { .. } => "winding",
            Law::Capacitor { .. } => "capacitor",
            Law::VoltageSource(drive) if drive.terms.is_empty() => "voltage source",
            Law::VoltageSource(_) => "dependent voltage source",
            Law::CurrentSource(drive) if drive.terms.is_empty() => "current source",
            Law::CurrentSource(_) => "dependent current source",
            Law::IdealWinding { .. } => "ideal winding",
            Law::OpAmp { .. } => "op-amp output",
        }
    }

    /// Dimension of a formula.
    pub fn dimension(&self, id: FormulaId) -> Dimension {
        self.tape.get(id).dimension
    }
}
