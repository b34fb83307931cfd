//! A flat circuit as a text that reads back to the same circuit.
//!
//! What came out of blocks has dotted names (`cm1.La`), which no text can give at file scope: they
//! become free names such as `cm1_La`, everywhere alike. Elements keep their order and direction;
//! formulas keep their `let` names, and numbers are written with all their digits.

mod formula;
mod names;

use crate::circuit::island::{Islands, Regime};
use crate::circuit::{
    CapacitorLoss, Circuit, Coupling, Drive, Element, ElementId, End, FormulaId, GND, Law, Measure,
    NodeId, Operation, Stated,
};
use crate::text::ast::LimitKind;
use formula::Formulas;
use names::Names;
use std::fmt::Write as _;

/// A path is broken off where its line would be longer than this, in characters.
const LONGEST_LINE: usize = 100;

/// Writes circuits and their formulas as text.
pub struct Printer<'c> {
    circuit: &'c Circuit,
    names: Names,
    formulas: Formulas<'c>,
}

impl<'c> Printer<'c> {
    /// Settles names, and which formulas get a `let` of their own.
    pub fn new(circuit: &'c Circuit) -> Self {
        let names = Names::new(circuit);
        let formulas = Formulas::new(circuit, &names, &roots(circuit));
        Printer { circuit, names, formulas }
    }

    /// The text of a formula, with `let` names for the values that have one.
    pub fn formula(&self, id: FormulaId) -> String {
        self.formulas.text(&self.names, id)
    }

    /// The text of what a formula is made of, even if the formula itself has a `let` name.
    pub fn definition(&self, id: FormulaId) -> String {
        self.formulas.definition(&self.names, id)
    }

    /// What an element is called in the text.
    pub fn element_name(&self, id: ElementId) -> &str {
        self.names.element(id)
    }

    /// What a node is called in the text.
    pub fn node_name(&self, id: NodeId) -> &str {
        self.names.node(id)
    }

    /// The whole circuit, below comment lines.
    pub fn text(&self, head: &[String]) -> String {
        let mut out = String::new();
        for line in head {
            let line = format!("# {line}");
            out += line.trim_end();
            out += "\n";
        }
        if let Some(title) = &self.circuit.title {
            let title: String = title.chars().filter(|c| *c != '"' && *c != '\n').collect();
            _ = writeln!(out, "title \"{title}\"");
        }
        for part in [self.lets(), self.elements(), self.wires(), self.tail(), self.reads()] {
            if !part.is_empty() && !out.is_empty() {
                out += "\n";
            }
            out += &part;
        }
        out
    }

    fn lets(&self) -> String {
        let lets = self.formulas.lets(&self.names);
        let width = lets.iter().map(|(name, _)| name.chars().count()).max().unwrap_or(0).min(16);
        lets.iter().map(|(name, value)| format!("let {name:width$} = {value}\n")).collect()
    }

    fn elements(&self) -> String {
        let mut out = String::new();
        let mut line = Line::default();
        for (id, element) in self.circuit.each_element() {
            match &element.law {
                Law::IdealWinding { ideal, .. } => {
                    if self.circuit.ideals[*ideal].windings.first() == Some(&id) {
                        line.end(&mut out);
                        out += &self.ideal(*ideal);
                    }
                }
                Law::OpAmp { plus, minus } => {
                    line.end(&mut out);
                    let node = |id| self.names.node(id);
                    let (plus, minus, left) = (node(*plus), node(*minus), node(element.left));
                    let name = self.names.element(id);
                    _ = writeln!(out, "opamp {name} : {plus} {minus} {left}");
                }
                _ => {
                    let (left, right) = (element.left, element.right);
                    let between = [left, right].map(|node| self.names.node(node));
                    line.add(&mut out, (left, right), between, &self.link(id, element));
                }
            }
        }
        line.end(&mut out);
        out
    }

    fn ideal(&self, ideal: usize) -> String {
        let mut pairs = Vec::new();
        let mut turns = Vec::new();
        for &id in &self.circuit.ideals[ideal].windings {
            let element = self.circuit.element(id);
            let node = |id| self.names.node(id);
            pairs.push(format!("{} {}", node(element.left), node(element.right)));
            if let Law::IdealWinding { turns: value, .. } = element.law {
                turns.push(self.formulas.factor(&self.names, value));
            }
        }
        let name = self.names.ideal(ideal);
        format!("ideal {name} : {}, turns {}\n", pairs.join(" | "), turns.join(" : "))
    }

    /// What stands between the round brackets of an element, marks included.
    fn link(&self, id: ElementId, element: &Element) -> String {
        let text = |id| self.formulas.text(&self.names, id);
        let (mut left, mut right) = ("", "");
        let mut mark = |end, sign| match end {
            End::Left => left = sign,
            End::Right => right = sign,
        };
        let mut value = match &element.law {
            Law::Resistor { resistance: value } | Law::Conductance { conductance: value } => {
                text(*value)
            }
            Law::Winding { inductance, series, dot } => {
                if let Some(end) = dot {
                    mark(*end, "*");
                }
                let loss = series.map(|series| self.winding_loss(*inductance, series));
                text(*inductance) + &loss.unwrap_or_default()
            }
            Law::Capacitor { capacitance, loss } => {
                text(*capacitance)
                    + &match loss {
                        CapacitorLoss::None => String::new(),
                        CapacitorLoss::Series(r) => format!(", esr {}", text(*r)),
                        CapacitorLoss::Tangent(t) => format!(", tand {}", text(*t)),
                    }
            }
            Law::VoltageSource(drive) => {
                mark(drive.end, "+");
                self.drive(drive)
            }
            Law::CurrentSource(drive) => {
                left = if drive.end == End::Left { ">" } else { "<" };
                self.drive(drive)
            }
            Law::IdealWinding { .. } | Law::OpAmp { .. } => String::new(),
        };
        if let Some(tolerance) = element.tolerance {
            value += &format!(", tol {}", self.formulas.percent(&self.names, tolerance));
        }
        format!("{left} {}: {value} {right}", self.names.element(id))
    }

    /// `q … at …` where the resistance was stated so, else `esr …`.
    fn winding_loss(&self, inductance: FormulaId, series: FormulaId) -> String {
        let text = |id| self.formulas.text(&self.names, id);
        let operation = |id| self.circuit.tape.get(id).operation;
        if !self.formulas.has_name(series)
            && let Operation::Quotient(reactance, q) = operation(series)
            && let Operation::Product(omega, l) = operation(reactance)
            && l == inductance
            && let Some(at) = self.formulas.frequency_of(omega)
        {
            return match operation(at) {
                Operation::Frequency => format!(", q {}", text(q)),
                _ => format!(", q {} at {}", text(q), text(at)),
            };
        }
        format!(", esr {}", text(series))
    }

    fn drive(&self, drive: &Drive) -> String {
        let mut terms = Vec::new();
        terms.extend(drive.constant.map(|id| self.formulas.term(&self.names, id)));
        for &(factor, measure) in &drive.terms {
            let factor = self.formulas.term(&self.names, factor);
            terms.push(format!("{factor} * {}", self.names.measure(measure)));
        }
        terms.join(" + ")
    }

    /// Further names of nodes, and nodes that no element touches but a reading names.
    fn wires(&self) -> String {
        let tied = crate::circuit::judge::tied_nodes(self.circuit);
        let mut read = vec![false; self.circuit.nodes.len()];
        for (_, formula) in self.circuit.tape.iter() {
            if let Operation::Measure(Measure::Volts(a, b)) = formula.operation {
                read[a.index()] = true;
                b.iter().for_each(|b| read[b.index()] = true);
            }
        }
        let mut out = String::new();
        for i in 0..self.circuit.nodes.len() {
            let node = NodeId(i as u32);
            let names = self.names.all_of_node(node);
            let lonely = !tied[i] && read[i] && node != GND;
            if names.len() > 1 {
                _ = writeln!(out, "{}", names.join(" == "));
            } else if lonely {
                _ = writeln!(out, "{} == {}", names[0], names[0]);
            }
        }
        out
    }

    fn tail(&self) -> String {
        let mut out = String::new();
        for coupling in &self.circuit.couplings {
            let [a, b] = [coupling.first, coupling.second].map(|id| self.names.element(id));
            _ = writeln!(out, "couple {a}, {b} : {}", self.coupling(coupling));
        }
        // Stated for every island that has a choice, so that it does not hang on the order of
        // nodes.
        let islands = Islands::find(self.circuit, Regime::Alternating);
        let tied = crate::circuit::judge::tied_nodes(self.circuit);
        for &node in &islands.reference {
            if node != GND && tied[node.index()] {
                _ = writeln!(out, "reference {}", self.names.node(node));
            }
        }
        out
    }

    fn coupling(&self, coupling: &Coupling) -> String {
        let text = |id| self.formulas.text(&self.names, id);
        match coupling.stated {
            Stated::Factor(k) => format!("k {}", text(k)),
            Stated::Mutual => {
                let resistance = coupling.resistance.map(|r| format!(", R {}", text(r)));
                format!("M {}{}", text(coupling.mutual), resistance.unwrap_or_default())
            }
            Stated::Leakage { value, at } => {
                format!("leakage {} at {}", text(value), self.names.element(at))
            }
            Stated::Series { aiding, opposing } => {
                format!("aiding {}, opposing {}", text(aiding), text(opposing))
            }
        }
    }

    fn reads(&self) -> String {
        let width = self.circuit.reads.iter().enumerate();
        let width = width.map(|(i, _)| self.names.read(i).chars().count()).max().unwrap_or(0);
        let mut out = String::new();
        for (i, read) in self.circuit.reads.iter().enumerate() {
            let value = self.formulas.text(&self.names, read.value);
            _ = write!(out, "read {:width$} = {value}", self.names.read(i), width = width.min(16));
            for limit in &read.limits {
                let word = match limit.kind {
                    LimitKind::Least => "least",
                    LimitKind::Most => "most",
                };
                _ = write!(out, ", {word} {}", self.formulas.text(&self.names, limit.value));
            }
            out += "\n";
        }
        out
    }
}

/// A path while it is written.
#[derive(Default)]
struct Line {
    text: String,
    /// Both ends of the last link.
    last: Option<(NodeId, NodeId)>,
    /// Its right node, which is not written yet.
    right: String,
}

impl Line {
    fn add(&mut self, out: &mut String, ends: (NodeId, NodeId), names: [&str; 2], link: &str) {
        let length = self.text.chars().count() + link.chars().count() + self.right.len() + 12;
        match self.last {
            Some(last) if last == ends && length <= LONGEST_LINE => {
                self.text += &format!("({link})");
            }
            Some(last) if last.1 == ends.0 && ends.0 != GND && length <= LONGEST_LINE => {
                self.text += &format!("- {} -({link})", self.right);
            }
            _ => {
                self.end(out);
                self.text = format!("{} -({link})", names[0]);
            }
        }
        self.last = Some(ends);
        self.right = names[1].to_owned();
    }

    fn end(&mut self, out: &mut String) {
        if self.last.take().is_some() {
            _ = writeln!(out, "{}- {}", self.text, self.right);
        }
    }
}

/// Every formula the text will show.
fn roots(circuit: &Circuit) -> Vec<FormulaId> {
    let mut roots: Vec<FormulaId> = circuit.lets.iter().map(|(_, id)| *id).collect();
    for element in &circuit.elements {
        roots.extend(crate::circuit::judge::parts(element));
        roots.extend(element.tolerance);
    }
    for coupling in &circuit.couplings {
        match coupling.stated {
            Stated::Factor(k) => roots.push(k),
            Stated::Mutual => {
                roots.extend([coupling.mutual].into_iter().chain(coupling.resistance))
            }
            Stated::Leakage { value, .. } => roots.push(value),
            Stated::Series { aiding, opposing } => roots.extend([aiding, opposing]),
        }
    }
    for read in &circuit.reads {
        roots.push(read.value);
        roots.extend(read.limits.iter().map(|limit| limit.value));
    }
    roots
}
