//! The stamps: one function per kind of element writes where its quantities stand.
//!
//! Kirchhoff's current law counts currents that leave a node; an element's current leaves its
//! left node and enters its right node.

use crate::circuit::island::Islands;
use crate::circuit::{
    CapacitorLoss, Circuit, Coupling, Drive, ElementId, FormulaId, GND, Ideal, Law, Measure,
    NodeId, Operation, Tape, elaborate,
};
use crate::quantity::{Decimal, Dimension};
use crate::source::Span;
use crate::system::{DriveStamp, Quantity, Through};

/// A stamp before the pattern is known.
pub(super) struct Raw {
    pub row: u32,
    pub column: u32,
    pub negative: bool,
    pub quantity: Quantity,
}

/// Everything the stamps produced.
pub(super) struct Stamped {
    pub tape: Tape,
    pub raw: Vec<Raw>,
    pub drives: Vec<DriveStamp>,
    pub through: Vec<Through>,
}

pub(super) struct Stamper<'c> {
    circuit: &'c Circuit,
    islands: &'c Islands,
    of_node: &'c [Option<u32>],
    of_branch: &'c [Option<u32>],
    tape: Tape,
    /// j·2π·f
    s: FormulaId,
    one: FormulaId,
    raw: Vec<Raw>,
    drives: Vec<DriveStamp>,
    through: Vec<Through>,
}

impl<'c> Stamper<'c> {
    pub(super) fn new(
        circuit: &'c Circuit,
        islands: &'c Islands,
        of_node: &'c [Option<u32>],
        of_branch: &'c [Option<u32>],
    ) -> Self {
        let mut tape = circuit.tape.clone();
        let nowhere = Span::default();
        let f = tape.push(Operation::Frequency, Dimension::FREQUENCY, nowhere);
        let omega = elaborate::angular(&mut tape, f, nowhere);
        let j = tape.push(Operation::ImaginaryUnit, Dimension::NONE, nowhere);
        let s = tape.push(Operation::Product(j, omega), Dimension::FREQUENCY, nowhere);
        let one = Operation::Number(Decimal { mantissa: 1, exponent: 0 });
        let one = tape.push(one, Dimension::NONE, nowhere);
        let (raw, drives, through) = (Vec::new(), Vec::new(), Vec::new());
        Stamper { circuit, islands, of_node, of_branch, tape, s, one, raw, drives, through }
    }

    pub(super) fn done(self) -> Stamped {
        Stamped { tape: self.tape, raw: self.raw, drives: self.drives, through: self.through }
    }

    /// Stamps one element; couplings and the joint equations of ideal transformers come later.
    pub(super) fn element(&mut self, id: ElementId) {
        let through = match &self.circuit.element(id).law {
            Law::Resistor { resistance } => self.resistor(id, *resistance),
            Law::Conductance { conductance } => self.admittance(id, *conductance),
            Law::Winding { inductance, series, .. } => self.winding(id, *inductance, *series),
            Law::Capacitor { capacitance, loss } => self.capacitor(id, *capacitance, *loss),
            Law::VoltageSource(drive) => self.voltage_source(id, drive),
            Law::CurrentSource(drive) => self.current_source(id, drive),
            Law::IdealWinding { .. } => self.branch(id),
            Law::OpAmp { plus, minus } => self.op_amp(id, *plus, *minus),
        };
        self.through.push(through);
    }

    // ---- one function per kind -------------------------------------------------------------

    fn resistor(&mut self, id: ElementId, resistance: FormulaId) -> Through {
        if self.of_branch[id.index()].is_some() {
            return self.impedance(id, resistance); // v − R·i = 0
        }
        let admittance = self.inverse(resistance);
        self.admittance(id, admittance) // i = v/R
    }

    fn winding(
        &mut self,
        id: ElementId,
        inductance: FormulaId,
        series: Option<FormulaId>,
    ) -> Through {
        let reactance = self.times_s(inductance, Dimension::RESISTANCE);
        let impedance = match series {
            None => reactance,
            Some(r) => self.op(Operation::Sum(r, reactance), Dimension::RESISTANCE, r),
        };
        self.impedance(id, impedance) // v − (R + sL)·i = 0
    }

    fn capacitor(&mut self, id: ElementId, capacitance: FormulaId, loss: CapacitorLoss) -> Through {
        let siemens = Dimension::CONDUCTANCE;
        let susceptance = self.times_s(capacitance, siemens);
        // i = sC/(1 + sC·R)·v, or sC/(1 + j·tanδ)·v
        let extra = match loss {
            CapacitorLoss::None => return self.admittance(id, susceptance),
            CapacitorLoss::Series(r) => {
                self.op(Operation::Product(susceptance, r), Dimension::NONE, r)
            }
            CapacitorLoss::Tangent(t) => {
                let j = self.op(Operation::ImaginaryUnit, Dimension::NONE, t);
                self.op(Operation::Product(j, t), Dimension::NONE, t)
            }
        };
        let below = self.op(Operation::Sum(self.one, extra), Dimension::NONE, extra);
        let admittance = self.op(Operation::Quotient(susceptance, below), siemens, extra);
        self.admittance(id, admittance)
    }

    fn voltage_source(&mut self, id: ElementId, drive: &Drive) -> Through {
        let through = self.branch(id);
        let row = self.own_row(id); // v = ±(E + Σ factor·reading)
        self.drop_into(Some(row), id, false, Quantity::One);
        self.driven(row, drive, false);
        through
    }

    fn current_source(&mut self, id: ElementId, drive: &Drive) -> Through {
        if self.of_branch[id.index()].is_some() {
            let through = self.branch(id);
            let row = self.own_row(id); // i = ±(I + Σ factor·reading)
            self.add(Some(row), Some(row), false, Quantity::One);
            self.driven(row, drive, false);
            return through;
        }
        let element = self.circuit.element(id);
        for (node, leaves) in [(element.left, true), (element.right, false)] {
            if let Some(row) = self.of_node[node.index()] {
                self.driven(row, drive, leaves); // known current to the right side
            }
        }
        Through::Given
    }

    fn op_amp(&mut self, id: ElementId, plus: NodeId, minus: NodeId) -> Through {
        let through = self.branch(id);
        let row = Some(self.own_row(id)); // v(plus) − v(minus) = 0
        self.add(row, self.of_node[plus.index()], false, Quantity::One);
        self.add(row, self.of_node[minus.index()], true, Quantity::One);
        through
    }

    /// The joint equations of an ideal transformer: n₁·v_k − n_k·v₁ = 0 for every further
    /// winding, and Σ n_k·i_k = 0 in the row of the first.
    pub(super) fn ideal(&mut self, ideal: &Ideal) {
        let turns = |id: ElementId| match self.circuit.element(id).law {
            Law::IdealWinding { turns, .. } => turns,
            _ => unreachable!("an ideal transformer consists of ideal windings"),
        };
        let all: Vec<_> = ideal.windings.iter().map(|&id| (id, turns(id))).collect();
        let (first, first_turns) = all[0];
        let sum_row = self.own_row(first);
        for &(id, own_turns) in &all {
            let own = self.own_row(id);
            self.add(Some(sum_row), Some(own), false, Quantity::Formula(own_turns));
            if id != first {
                self.drop_into(Some(own), id, false, Quantity::Formula(first_turns));
                self.drop_into(Some(own), first, true, Quantity::Formula(own_turns));
            }
        }
    }

    /// −(R + sM) between the rows of two windings, both ways, for currents into the dots.
    pub(super) fn coupling(&mut self, coupling: &Coupling) {
        let sign = |id: ElementId| match self.circuit.element(id).law {
            Law::Winding { dot: Some(end), .. } => end.sign(),
            _ => unreachable!("couplings are between windings with dots"),
        };
        let opposite = sign(coupling.first) != sign(coupling.second);
        let reactance = self.times_s(coupling.mutual, Dimension::RESISTANCE);
        let impedance = match coupling.resistance {
            None => reactance,
            Some(r) => self.op(Operation::Sum(r, reactance), Dimension::RESISTANCE, r),
        };
        let (a, b) = (self.own_row(coupling.first), self.own_row(coupling.second));
        for (row, column) in [(a, b), (b, a)] {
            self.add(Some(row), Some(column), !opposite, Quantity::Formula(impedance));
        }
    }

    // ---- the pieces they are made of -------------------------------------------------------

    /// The current of an element as an unknown: +i leaves the left node, −i the right one.
    fn branch(&mut self, id: ElementId) -> Through {
        let element = self.circuit.element(id);
        let own = self.own_row(id);
        self.add(self.of_node[element.left.index()], Some(own), false, Quantity::One);
        self.add(self.of_node[element.right.index()], Some(own), true, Quantity::One);
        Through::Unknown(own)
    }

    /// v − z·i = 0
    fn impedance(&mut self, id: ElementId, impedance: FormulaId) -> Through {
        let through = self.branch(id);
        let row = self.own_row(id);
        self.drop_into(Some(row), id, false, Quantity::One);
        self.add(Some(row), Some(row), true, Quantity::Formula(impedance));
        through
    }

    /// i = y·v in the two nodes' equations; y·v − i = 0 where the current is an unknown.
    fn admittance(&mut self, id: ElementId, admittance: FormulaId) -> Through {
        let element = self.circuit.element(id);
        let y = Quantity::Formula(admittance);
        if self.of_branch[id.index()].is_some() {
            let through = self.branch(id);
            let row = self.own_row(id);
            self.drop_into(Some(row), id, false, y);
            self.add(Some(row), Some(row), true, Quantity::One);
            return through;
        }
        self.drop_into(self.of_node[element.left.index()], id, false, y);
        self.drop_into(self.of_node[element.right.index()], id, true, y);
        Through::Admittance(admittance)
    }

    /// ± quantity · (v_left − v_right) of an element into a row.
    fn drop_into(&mut self, row: Option<u32>, id: ElementId, negative: bool, quantity: Quantity) {
        let element = self.circuit.element(id);
        self.add(row, self.of_node[element.left.index()], negative, quantity);
        self.add(row, self.of_node[element.right.index()], !negative, quantity);
    }

    /// ±(constant + Σ factor·reading) to the right-hand side of a row: the constant there, the
    /// readings to the left-hand side.
    fn driven(&mut self, row: u32, drive: &Drive, negative: bool) {
        let negative = negative != (drive.end.sign() < 0);
        if let Some(formula) = drive.constant {
            self.drives.push(DriveStamp { row, negative, formula });
        }
        let row = Some(row);
        for &(factor, measure) in &drive.terms {
            let factor = Quantity::Formula(factor);
            match measure {
                Measure::Volts(node, to) => {
                    let to = to.unwrap_or_else(|| self.islands.reference_of(node));
                    self.add(row, self.of_node[node.index()], !negative, factor);
                    self.add(row, self.of_node[to.index()], negative, factor);
                }
                Measure::Drop(other) => self.drop_into(row, other, !negative, factor),
                Measure::Amps(other) => {
                    let other = self.own_row(other);
                    self.add(row, Some(other), !negative, factor);
                }
                Measure::Power(_) => unreachable!("a power is not linear; elaboration refused it"),
            }
        }
    }

    fn add(&mut self, row: Option<u32>, column: Option<u32>, negative: bool, quantity: Quantity) {
        // A reference has neither an equation nor an unknown.
        if let (Some(row), Some(column)) = (row, column) {
            self.raw.push(Raw { row, column, negative, quantity });
        }
    }

    fn own_row(&self, id: ElementId) -> u32 {
        self.of_branch[id.index()].expect("elements with a law of their own have a branch current")
    }

    fn op(&mut self, operation: Operation, dimension: Dimension, from: FormulaId) -> FormulaId {
        let span = self.tape.get(from).span;
        self.tape.push(operation, dimension, span)
    }

    fn times_s(&mut self, value: FormulaId, dimension: Dimension) -> FormulaId {
        self.op(Operation::Product(self.s, value), dimension, value)
    }

    fn inverse(&mut self, value: FormulaId) -> FormulaId {
        self.op(Operation::Quotient(self.one, value), Dimension::CONDUCTANCE, value)
    }
}

// `gnd` is node 0 in every circuit, so an operational amplifier always has its return.
const _: () = assert!(GND.0 == 0);
