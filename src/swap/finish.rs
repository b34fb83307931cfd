//! The last step: elements and nodes get their final numbers, and every reading means what it meant.

use crate::circuit::island::{Islands, Regime};
use crate::circuit::print::Printer;
use crate::circuit::{
    Circuit, Coupling, Drive, Element, ElementId, FormulaId, GND, Ideal, Law, Measure, Node,
    NodeId, Operation, Stated, Tape,
};
use crate::diag::did_you_mean;
use crate::number::Function;
use crate::quantity::{Decimal, Dimension};
use crate::source::Span;
use crate::swap::build::{Build, Done, Part};
use crate::swap::{Fate, Leg, Purchase, Reading, SwapError, Swapped, Twin, explain, same_name};
use std::collections::HashMap;

/// Old numbers to new ones.
struct Maps<'b, 'o> {
    build: &'b Build<'o>,
    node: Vec<NodeId>,
    element: Vec<Option<ElementId>>,
}

pub(crate) fn finish(build: Build) -> Result<Twin, SwapError> {
    check_used(&build)?;
    let (nodes, node) = merge_nodes(&build);
    let (order, element) = order_elements(&build);
    let maps = Maps { build: &build, node, element };
    let mut twin = maps.structure(nodes, &order);
    let islands = Islands::find(&twin, Regime::Alternating);
    let (tape, formula) = maps.rebuild_tape(&islands);
    twin.tape = tape;
    renumber_formulas(&mut twin, &formula);
    maps.rewrite_drives(&mut twin, &islands);
    let readings = maps.readings(&mut twin);
    let records = records(&build, &twin, &formula);
    let map_node = |node: &NodeId| maps.node[node.index()];
    Ok(Twin {
        records,
        readings,
        element_of: maps.element[..build.original_elements].to_vec(),
        node_of: maps.node[..build.original_nodes].to_vec(),
        reference_of: build.reference[..build.original_nodes].iter().map(map_node).collect(),
        circuit: twin,
        warnings: build.warnings.clone(),
    })
}

/// Whatever was named on the call must have been met.
fn check_used(build: &Build) -> Result<(), SwapError> {
    if let (Some((first, second)), false) = (&build.options.tie, build.tie_used) {
        let (first, second) = (first.clone(), second.clone());
        return Err(SwapError::TieElsewhere { first, second });
    }
    let droppable = |part: &&Part| part.fate != Fate::Open && !part.ideal;
    let legs: Vec<&str> = build
        .done
        .iter()
        .flat_map(|done| done.parts.iter().filter(droppable).map(|part| part.name.as_str()))
        .collect();
    let was_dropped = |name: &str| {
        let parts = build.done.iter().flat_map(|done| &done.parts);
        parts.clone().any(|part| {
            same_name(&part.name, name)
                && matches!(part.fate, Fate::DroppedWire | Fate::DroppedOpen)
        })
    };
    match build.options.drop.iter().find(|name| !was_dropped(name)) {
        None => Ok(()),
        Some(name) => Err(SwapError::UnknownLeg {
            name: name.clone(),
            near: did_you_mean(name, legs.iter().copied()).map(str::to_owned),
            legs: legs.iter().map(|leg| format!("`{leg}`")).collect::<Vec<_>>().join(", "),
        }),
    }
}

fn merge_nodes(build: &Build) -> (Vec<Node>, Vec<NodeId>) {
    let mut nodes: Vec<Node> = Vec::new();
    let mut new_of_key = HashMap::new();
    let mut map = Vec::new();
    for (i, node) in build.circuit.nodes.iter().enumerate() {
        let key = build.node_key(NodeId(i as u32));
        let id = *new_of_key.entry(key).or_insert_with(|| {
            nodes.push(Node { names: Vec::new(), span: node.span });
            NodeId(nodes.len() as u32 - 1)
        });
        // A made node that fell into another one has served its purpose; its name says nothing.
        if i < build.original_nodes || nodes[id.index()].names.is_empty() {
            nodes[id.index()].names.extend(node.names.iter().cloned());
        }
        map.push(id);
    }
    (nodes, map)
}

/// The elements in the order of the twin: new ones in the place of the first winding of their set.
fn order_elements(build: &Build) -> (Vec<ElementId>, Vec<Option<ElementId>>) {
    // No winding is in two sets.
    let placed: HashMap<ElementId, &Vec<ElementId>> =
        build.placed.iter().map(|(anchor, list)| (*anchor, list)).collect();
    let mut order = Vec::new();
    for i in 0..build.original_elements {
        let id = ElementId(i as u32);
        if !build.replaced.contains(&id) {
            order.push(id);
        }
        order.extend(placed.get(&id).into_iter().flat_map(|list| list.iter().copied()));
    }
    let mut map = vec![None; build.circuit.elements.len()];
    for (new, old) in order.iter().enumerate() {
        map[old.index()] = Some(ElementId(new as u32));
    }
    (order, map)
}

impl Maps<'_, '_> {
    /// The element, which is not a replaced winding.
    fn kept(&self, id: ElementId) -> ElementId {
        self.element[id.index()].expect("only replaced windings are gone")
    }

    /// Everything but the formulas.
    fn structure(&self, nodes: Vec<Node>, order: &[ElementId]) -> Circuit {
        let old = &self.build.circuit;
        let elements = order
            .iter()
            .map(|id| {
                let mut element: Element = old.element(*id).clone();
                element.renumber_nodes(|node| *node = self.node[node.index()]);
                element
            })
            .collect();
        let kept = |c: &&Coupling| !self.build.replaced.contains(&c.first);
        let couplings = old.couplings.iter().filter(kept).map(|c| Coupling {
            first: self.kept(c.first),
            second: self.kept(c.second),
            stated: match c.stated {
                Stated::Leakage { value, at } => Stated::Leakage { value, at: self.kept(at) },
                stated => stated,
            },
            ..*c
        });
        let ideals = old.ideals.iter().map(|ideal| Ideal {
            name: ideal.name.clone(),
            windings: ideal.windings.iter().map(|&id| self.kept(id)).collect(),
        });
        let mut twin = Circuit {
            title: old.title.clone(),
            nodes,
            elements,
            couplings: couplings.collect(),
            ideals: ideals.collect(),
            references: Vec::new(),
            reads: old.reads.clone(),
            lets: old.lets.clone(),
            tape: Tape::default(),
        };
        twin.references = self.references(&twin);
        twin
    }

    /// Every former island keeps its reference, as far as it is an island still.
    fn references(&self, twin: &Circuit) -> Vec<(NodeId, Span)> {
        let islands = Islands::find(twin, Regime::Alternating);
        let tied = crate::circuit::judge::tied_nodes(twin);
        let mut chosen: Vec<(usize, NodeId)> = Vec::new();
        let stated = self.build.circuit.references.iter().map(|(node, _)| *node);
        let all = self.build.reference[..self.build.original_nodes].iter().copied();
        for old in stated.chain(all) {
            let node = self.node[old.index()];
            let island = islands.of_node[node.index()];
            let grounded = islands.of_node[GND.index()] == island;
            if tied[node.index()] && !grounded && chosen.iter().all(|(i, _)| *i != island) {
                chosen.push((island, node));
            }
        }
        chosen.into_iter().map(|(_, node)| (node, Span::default())).collect()
    }

    /// A node voltage that means what it meant, though its island may have another reference now.
    fn volts(&self, node: NodeId, to: Option<NodeId>, islands: &Islands) -> Measure {
        let new = self.node[node.index()];
        let reference = self.node[self.build.reference[node.index()].index()];
        match to {
            Some(to) => Measure::Volts(new, Some(self.node[to.index()])),
            None if islands.reference_of(new) == reference => Measure::Volts(new, None),
            None => Measure::Volts(new, Some(reference)),
        }
    }

    /// The drop of an element that was replaced.
    fn drop(&self, id: ElementId) -> Measure {
        let element = self.build.circuit.element(id);
        let [left, right] = [element.left, element.right].map(|node| self.node[node.index()]);
        Measure::Volts(left, Some(right))
    }

    fn amps(&self, id: ElementId) -> Vec<(bool, ElementId)> {
        self.build.amps[&id].iter().map(|(negative, id)| (*negative, self.kept(*id))).collect()
    }

    fn is_replaced(&self, id: ElementId) -> bool {
        self.build.replaced.contains(&id)
    }

    /// The tape with every reading of a replaced winding rewritten, and where each formula went.
    fn rebuild_tape(&self, islands: &Islands) -> (Tape, Vec<FormulaId>) {
        let old = &self.build.algebra.tape;
        let mut tape = Tape::default();
        tape.tables.clone_from(&old.tables);
        let mut map: Vec<FormulaId> = Vec::with_capacity(old.len());
        for (_, formula) in old.iter() {
            let (dimension, span) = (formula.dimension, formula.span);
            let id = match formula.operation {
                Operation::Measure(measure) => self.measure(&mut tape, measure, islands, span),
                operation => {
                    tape.push(renumbered(operation, |id| map[id.index()]), dimension, span)
                }
            };
            map.push(id);
        }
        (tape, map)
    }

    fn measure(
        &self,
        tape: &mut Tape,
        measure: Measure,
        islands: &Islands,
        span: Span,
    ) -> FormulaId {
        let (new, dimension) = match measure {
            Measure::Volts(node, to) => (self.volts(node, to, islands), Dimension::VOLTAGE),
            Measure::Drop(id) if self.is_replaced(id) => (self.drop(id), Dimension::VOLTAGE),
            Measure::Amps(id) if self.is_replaced(id) => return self.amps_formula(tape, id, span),
            Measure::Power(id) if self.is_replaced(id) => {
                return self.power_formula(tape, id, span);
            }
            Measure::Drop(id) => (Measure::Drop(self.kept(id)), Dimension::VOLTAGE),
            Measure::Amps(id) => (Measure::Amps(self.kept(id)), Dimension::CURRENT),
            Measure::Power(id) => (Measure::Power(self.kept(id)), Dimension::POWER),
        };
        tape.push(Operation::Measure(new), dimension, span)
    }

    fn amps_formula(&self, tape: &mut Tape, id: ElementId, span: Span) -> FormulaId {
        let dimension = Dimension::CURRENT;
        let mut sum: Option<FormulaId> = None;
        for (negative, element) in self.amps(id) {
            let term = tape.push(Operation::Measure(Measure::Amps(element)), dimension, span);
            let operation = match (sum, negative) {
                (None, false) => {
                    sum = Some(term);
                    continue;
                }
                (None, true) => Operation::Negative(term),
                (Some(sum), false) => Operation::Sum(sum, term),
                (Some(sum), true) => Operation::Difference(sum, term),
            };
            sum = Some(tape.push(operation, dimension, span));
        }
        let zero = Operation::Number(Decimal { mantissa: 0, exponent: 0 });
        sum.unwrap_or_else(|| tape.push(zero, dimension, span))
    }

    fn power_formula(&self, tape: &mut Tape, id: ElementId, span: Span) -> FormulaId {
        let drop = tape.push(Operation::Measure(self.drop(id)), Dimension::VOLTAGE, span);
        let amps = self.amps_formula(tape, id, span);
        let conjugate = Operation::Call(Function::Conj, amps);
        let conjugate = tape.push(conjugate, Dimension::CURRENT, span);
        tape.push(Operation::Product(drop, conjugate), Dimension::POWER, span)
    }

    /// Dependent sources that read replaced windings. The factors are renumbered already, the
    /// readings still have the numbers of the original, but for nodes.
    fn rewrite_drives(&self, twin: &mut Circuit, islands: &Islands) {
        let Circuit { elements, tape, .. } = twin;
        // Node numbers were renewed with the elements; the old ones are needed for references.
        let old_terms = self.old_terms();
        for (element, old) in elements.iter_mut().zip(old_terms) {
            let (Law::VoltageSource(drive) | Law::CurrentSource(drive)) = &mut element.law else {
                continue;
            };
            let factors: Vec<FormulaId> = drive.terms.iter().map(|(factor, _)| *factor).collect();
            drive.terms.clear();
            for (factor, measure) in factors.into_iter().zip(old) {
                self.rewrite_term(tape, drive, factor, measure, islands);
            }
        }
    }

    fn old_terms(&self) -> Vec<Vec<Measure>> {
        let mut terms = vec![Vec::new(); self.element.iter().flatten().count()];
        for (old, new) in self.element.iter().enumerate() {
            let Some(new) = new else { continue };
            let law = &self.build.circuit.elements[old].law;
            if let Law::VoltageSource(drive) | Law::CurrentSource(drive) = law {
                terms[new.index()] = drive.terms.iter().map(|(_, measure)| *measure).collect();
            }
        }
        terms
    }

    fn rewrite_term(
        &self,
        tape: &mut Tape,
        drive: &mut Drive,
        factor: FormulaId,
        measure: Measure,
        islands: &Islands,
    ) {
        match measure {
            Measure::Volts(node, to) => drive.terms.push((factor, self.volts(node, to, islands))),
            Measure::Drop(id) if self.is_replaced(id) => drive.terms.push((factor, self.drop(id))),
            Measure::Amps(id) if self.is_replaced(id) => {
                for (negative, element) in self.amps(id) {
                    let formula = *tape.get(factor);
                    let factor = match (negative, formula.operation) {
                        (false, _) => factor,
                        (true, Operation::Negative(inner)) => inner,
                        (true, _) => {
                            let operation = Operation::Negative(factor);
                            tape.push(operation, formula.dimension, formula.span)
                        }
                    };
                    drive.terms.push((factor, Measure::Amps(element)));
                }
            }
            Measure::Drop(id) => drive.terms.push((factor, Measure::Drop(self.kept(id)))),
            Measure::Amps(id) => drive.terms.push((factor, Measure::Amps(self.kept(id)))),
            Measure::Power(id) => drive.terms.push((factor, Measure::Power(self.kept(id)))),
        }
    }

    fn readings(&self, twin: &mut Circuit) -> Vec<Reading> {
        let mut readings = Vec::new();
        for done in &self.build.done {
            for winding in &done.set.windings {
                let span = self.build.circuit.element(winding.id).span;
                let drop = self.drop(winding.id);
                let tape = &mut twin.tape;
                let volt = Dimension::VOLTAGE;
                readings.push(Reading {
                    winding: winding.id,
                    name: winding.name.clone(),
                    drop,
                    amps: self.amps(winding.id),
                    drop_formula: tape.push(Operation::Measure(drop), volt, span),
                    amps_formula: self.amps_formula(tape, winding.id, span),
                    power_formula: self.power_formula(tape, winding.id, span),
                });
            }
        }
        readings
    }
}

/// The operation with other operands.
fn renumbered(operation: Operation, new: impl Fn(FormulaId) -> FormulaId) -> Operation {
    use Operation as O;
    match operation {
        O::Negative(a) => O::Negative(new(a)),
        O::Sum(a, b) => O::Sum(new(a), new(b)),
        O::Difference(a, b) => O::Difference(new(a), new(b)),
        O::Product(a, b) => O::Product(new(a), new(b)),
        O::Quotient(a, b) => O::Quotient(new(a), new(b)),
        O::WholePower(a, n) => O::WholePower(new(a), n),
        O::Power(a, b) => O::Power(new(a), new(b)),
        O::Call(function, a) => O::Call(function, new(a)),
        O::Call2(function, a, b) => O::Call2(function, new(a), new(b)),
        O::Table(table, a) => O::Table(table, new(a)),
        O::Number(_) | O::Pi | O::ImaginaryUnit | O::Frequency | O::Measure(_) => operation,
    }
}

fn renumber_formulas(twin: &mut Circuit, map: &[FormulaId]) {
    use crate::circuit::CapacitorLoss as Loss;
    let new = |id: &mut FormulaId| *id = map[id.index()];
    for element in &mut twin.elements {
        element.tolerance.iter_mut().for_each(new);
        match &mut element.law {
            Law::Resistor { resistance: id }
            | Law::Conductance { conductance: id }
            | Law::IdealWinding { turns: id, .. } => new(id),
            Law::Winding { inductance, series, .. } => {
                new(inductance);
                series.iter_mut().for_each(new);
            }
            Law::Capacitor { capacitance, loss } => {
                new(capacitance);
                match loss {
                    Loss::None => {}
                    Loss::Series(id) | Loss::Tangent(id) => new(id),
                }
            }
            Law::VoltageSource(drive) | Law::CurrentSource(drive) => {
                drive.constant.iter_mut().for_each(new);
                drive.terms.iter_mut().for_each(|(factor, _)| new(factor));
            }
            Law::OpAmp { .. } => {}
        }
    }
    for coupling in &mut twin.couplings {
        new(&mut coupling.mutual);
        coupling.resistance.iter_mut().for_each(new);
        match &mut coupling.stated {
            Stated::Factor(id) | Stated::Leakage { value: id, .. } => new(id),
            Stated::Series { aiding, opposing } => {
                new(aiding);
                new(opposing);
            }
            Stated::Mutual => {}
        }
    }
    for read in &mut twin.reads {
        new(&mut read.value);
        read.limits.iter_mut().for_each(|limit| new(&mut limit.value));
    }
    twin.lets.iter_mut().for_each(|(_, id)| new(id));
}

fn records(build: &Build, twin: &Circuit, map: &[FormulaId]) -> Vec<Swapped> {
    let printer = Printer::new(twin);
    let record = |done: &Done| Swapped {
        windings: done.set.windings.iter().map(|w| w.name.clone()).collect(),
        kind: build.options.into,
        inductance: done.matrices.inductance.clone(),
        k: done.matrices.k.clone(),
        leakage: done.matrices.leakage.clone(),
        condition: done.condition.clone(),
        isolation_lost: done.isolation_lost,
        legs: done.parts.iter().map(|part| leg(build, &printer, part, map)).collect(),
    };
    build.done.iter().map(record).collect()
}

fn leg(build: &Build, printer: &Printer, part: &Part, map: &[FormulaId]) -> Leg {
    let real = |id: Option<FormulaId>| id.and_then(|id| build.algebra.real(id));
    let (value, exact) = (real(part.value), real(part.exact));
    let formula = match part.exact {
        Some(id) => printer.definition(map[id.index()]),
        None if part.fate == Fate::Open => "infinite".into(),
        None => "0".into(),
    };
    let purchase = match part.fate {
        Fate::Element if part.ideal => Purchase::Ideal,
        Fate::Element => explain::purchase(value, part.dimension),
        _ => Purchase::NoPart,
    };
    Leg {
        name: part.name.replace('.', "_"),
        unit: part.dimension.usual_unit().unwrap_or(""),
        formula,
        value,
        fate: part.fate,
        purchase,
        rounded_from: exact.filter(|exact| Some(*exact) != value),
    }
}
