//! Modified nodal analysis (Ho, Ruehli, Brennan, 1975): which unknowns there are, where each
//! quantity stands in the matrix, and the values at one frequency, over any field.
//!
//! Unknowns are the node voltages against the reference of their island, and a branch current for
//! every winding, voltage source, ideal winding and operational amplifier, for every element whose
//! current drives another, and for every resistor that may be zero. The pattern is found once per
//! circuit; per frequency only values change.

pub mod affine;
mod stamp;

use crate::circuit::island::{Islands, Regime};
use crate::circuit::{
    Circuit, ElementId, Fault, FormulaId, Law, Measure, NodeId, Phase, Tape, Values,
};
use crate::number::Field;
use crate::number::{Ball, Balls};

/// A factor in the matrix or on the right-hand side.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Quantity {
    /// 1
    One,
    /// The value of a formula.
    Formula(FormulaId),
}

/// One addition to a matrix entry.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stamp {
    /// Index into the entries of the pattern.
    pub slot: u32,
    /// Subtract instead.
    pub negative: bool,
    /// What is added.
    pub quantity: Quantity,
}

/// One addition to the right-hand side.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DriveStamp {
    /// The row.
    pub row: u32,
    /// Subtract instead.
    pub negative: bool,
    /// What is added.
    pub formula: FormulaId,
}

/// What an unknown or an equation belongs to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Unknown {
    /// The voltage of a node; its equation is Kirchhoff's current law there.
    Node(NodeId),
    /// The current of an element; its equation is the element's law.
    Branch(ElementId),
}

/// How the current of an element follows from the solution.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Through {
    /// It is an unknown.
    Unknown(u32),
    /// Admittance times drop.
    Admittance(FormulaId),
    /// It is given by the source's drive.
    Given,
}

/// The equations of a circuit in one regime.
#[derive(Clone, Debug)]
pub struct System {
    /// The circuit's formulas, and after them those made for the stamps.
    pub tape: Tape,
    /// The islands in this regime.
    pub islands: Islands,
    /// What each unknown is.
    pub unknowns: Vec<Unknown>,
    /// The unknown of each node; `None` for references.
    pub of_node: Vec<Option<u32>>,
    /// How each element's current is found.
    pub through: Vec<Through>,
    /// Where each column begins in `row`; one more than there are unknowns.
    pub column_start: Vec<usize>,
    /// Row of each entry, ascending in each column.
    pub row: Vec<usize>,
    /// Additions to the matrix.
    pub stamps: Vec<Stamp>,
    /// Additions to the right-hand side.
    pub drives: Vec<DriveStamp>,
}

impl System {
    /// Finds unknowns and pattern of a circuit.
    pub fn new(circuit: &Circuit, regime: Regime) -> Self {
        let islands = Islands::find(circuit, regime);
        let sensed = sensed(circuit);
        let constants = circuit.tape.evaluate_constants(&Balls);
        let mut unknowns = Vec::new();
        let tied = crate::circuit::judge::tied_nodes(circuit);
        let of_node: Vec<_> = (0..circuit.nodes.len())
            .map(|i| {
                let node = NodeId(i as u32);
                let free = tied[i] && islands.reference_of(node) != node;
                free.then(|| push(&mut unknowns, Unknown::Node(node)))
            })
            .collect();
        let of_branch: Vec<_> = circuit
            .each_element()
            .map(|(id, _)| {
                let own = sensed[id.index()] || needs_branch(circuit, id, &constants);
                own.then(|| push(&mut unknowns, Unknown::Branch(id)))
            })
            .collect();
        let mut stamper = stamp::Stamper::new(circuit, &islands, &of_node, &of_branch);
        for (id, _) in circuit.each_element() {
            stamper.element(id);
        }
        for ideal in &circuit.ideals {
            stamper.ideal(ideal);
        }
        for coupling in &circuit.couplings {
            stamper.coupling(coupling);
        }
        let stamp::Stamped { tape, raw, drives, through } = stamper.done();
        let (column_start, row, stamps) = compress(unknowns.len(), raw);
        System { tape, islands, unknowns, of_node, through, column_start, row, stamps, drives }
    }

    /// Adds up matrix entries and right-hand side from the values of the formulas; both must be
    /// as long as `row` and `unknowns`. Fails where a formula that is needed has no value.
    pub fn assemble<F: Field>(
        &self,
        field: &F,
        values: &Values<F::Number>,
        entries: &mut [F::Number],
        rhs: &mut [F::Number],
    ) -> Result<(), Fault> {
        assert!(entries.len() == self.row.len() && rhs.len() == self.unknowns.len());
        let zero = field.decimal(crate::quantity::Decimal { mantissa: 0, exponent: 0 });
        let one = field.decimal(crate::quantity::Decimal { mantissa: 1, exponent: 0 });
        entries.fill(zero.clone());
        rhs.fill(zero);
        for stamp in &self.stamps {
            let value = match stamp.quantity {
                Quantity::One => &one,
                Quantity::Formula(id) => values[id.index()].as_ref().map_err(|f| *f)?,
            };
            let entry = &mut entries[stamp.slot as usize];
            *entry = if stamp.negative { field.sub(entry, value) } else { field.add(entry, value) };
        }
        for drive in &self.drives {
            let value = values[drive.formula.index()].as_ref().map_err(|f| *f)?;
            let entry = &mut rhs[drive.row as usize];
            *entry = if drive.negative { field.sub(entry, value) } else { field.add(entry, value) };
        }
        Ok(())
    }
}

fn push(unknowns: &mut Vec<Unknown>, unknown: Unknown) -> u32 {
    unknowns.push(unknown);
    unknowns.len() as u32 - 1
}

/// The elements whose current drives another element.
fn sensed(circuit: &Circuit) -> Vec<bool> {
    let mut sensed = vec![false; circuit.elements.len()];
    for element in &circuit.elements {
        if let Law::VoltageSource(drive) | Law::CurrentSource(drive) = &element.law {
            for (_, measure) in &drive.terms {
                if let Measure::Amps(id) = measure {
                    sensed[id.index()] = true;
                }
            }
        }
    }
    sensed
}

/// True for elements whose law is written for an impedance or a voltage.
fn needs_branch(circuit: &Circuit, id: ElementId, constants: &Values<Ball>) -> bool {
    match &circuit.element(id).law {
        Law::Winding { .. }
        | Law::VoltageSource(_)
        | Law::IdealWinding { .. }
        | Law::OpAmp { .. } => true,
        // A resistance that is zero, or may be at some frequency, has no admittance.
        Law::Resistor { resistance } => {
            let constant = circuit.tape.get(*resistance).phase == Phase::Constant;
            let zero = |ball: &Ball| ball.centre.is_zero();
            !constant || constants[resistance.index()].as_ref().is_ok_and(zero)
        }
        Law::Conductance { .. } | Law::Capacitor { .. } | Law::CurrentSource(_) => false,
    }
}

/// Sorts raw stamps into compressed columns; one entry may take many stamps.
fn compress(n: usize, mut raw: Vec<stamp::Raw>) -> (Vec<usize>, Vec<usize>, Vec<Stamp>) {
    // Stable, so that the order of additions does not depend on the sort.
    raw.sort_by_key(|stamp| (stamp.column, stamp.row));
    let mut column_start = vec![0; n + 1];
    let mut row = Vec::new();
    let mut stamps = Vec::with_capacity(raw.len());
    let mut last = None;
    for stamp in raw {
        if last != Some((stamp.column, stamp.row)) {
            last = Some((stamp.column, stamp.row));
            row.push(stamp.row as usize);
            column_start[stamp.column as usize + 1] += 1;
        }
        let slot = row.len() as u32 - 1;
        stamps.push(Stamp { slot, negative: stamp.negative, quantity: stamp.quantity });
    }
    for i in 0..n {
        column_start[i + 1] += column_start[i];
    }
    (column_start, row, stamps)
}
