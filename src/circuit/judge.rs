//! Judges a flat circuit without solving it: errors, then remarks.

mod couplings;
mod remarks;

use crate::circuit::island::{Islands, Regime};
use crate::circuit::{
    CapacitorLoss, Circuit, Element, Fault, FormulaId, GND, Law, Measure, Operation, Phase, Values,
};
use crate::diag::Diagnostic;
use crate::number::{Ball, Balls, FieldError};
use crate::source::Span;

/// Everything wrong or remarkable about a circuit.
pub fn judge(circuit: &Circuit) -> Vec<Diagnostic> {
    let values = circuit.tape.evaluate_constants(&Balls);
    let islands = Islands::find(circuit, Regime::Alternating);
    let mut found = Vec::new();
    for element in &circuit.elements {
        judge_element(circuit, element, &values, &mut found);
    }
    for read in &circuit.reads {
        for limit in &read.limits {
            judge_value(circuit, limit.value, &values, &mut found);
        }
    }
    for coupling in &circuit.couplings {
        let parts = std::iter::once(coupling.mutual).chain(coupling.resistance);
        parts.for_each(|id| _ = judge_value(circuit, id, &values, &mut found));
    }
    judge_divisors(circuit, &values, &mut found);
    judge_references(circuit, &islands, &mut found);
    judge_readings(circuit, &islands, &mut found);
    if found.is_empty() {
        couplings::judge(circuit, &values, &mut found);
    }
    if found.is_empty() {
        remarks::remark(circuit, &islands, &values, &mut found);
    }
    found
}

/// The value of a constant formula, if it is finite and real.
pub fn real_constant(circuit: &Circuit, id: FormulaId) -> Option<f64> {
    let values = circuit.tape.evaluate_constants(&Balls);
    real(circuit, id, &values)
}

fn real(circuit: &Circuit, id: FormulaId, values: &Values<Ball>) -> Option<f64> {
    if circuit.tape.get(id).phase != Phase::Constant {
        return None;
    }
    let ball = values[id.index()].as_ref().ok()?;
    let value = ball.centre.to_complex();
    (value.re.is_finite() && value.im.abs() <= ball.radius).then_some(value.re)
}

/// The error of a value that could not be had.
pub fn fault(circuit: &Circuit, fault: Fault) -> Diagnostic {
    let formula = circuit.tape.get(fault.at);
    let base = Diagnostic::error(format!("this value cannot be computed: {}", fault.error))
        .at(formula.span, "");
    match formula.operation {
        Operation::Table(table, _) => {
            let points = &circuit.tape.tables[table.0 as usize].points;
            base.help(format!(
                "the data reach from {} to {} and are not extrapolated",
                points[0].0,
                points[points.len() - 1].0
            ))
        }
        _ => base,
    }
}

/// Says so if a formula that must have a finite value has none; gives the value if it is constant.
fn judge_value<'v>(
    circuit: &Circuit,
    id: FormulaId,
    values: &'v Values<Ball>,
    found: &mut Vec<Diagnostic>,
) -> Option<&'v Ball> {
    if circuit.tape.get(id).phase != Phase::Constant {
        return None;
    }
    match &values[id.index()] {
        Err(error) => {
            let error = fault(circuit, *error);
            if !found.contains(&error) {
                found.push(error);
            }
            None
        }
        Ok(ball) => {
            let value = ball.centre.to_complex();
            if value.re.is_finite() && value.im.is_finite() {
                return Some(ball);
            }
            let span = circuit.tape.get(id).span;
            found.push(Diagnostic::error("this value is not finite").at(span, ""));
            None
        }
    }
}

/// The formulas an element's behaviour rests on.
pub(crate) fn parts(element: &Element) -> Vec<FormulaId> {
    match &element.law {
        Law::Resistor { resistance: a } | Law::Conductance { conductance: a } => vec![*a],
        Law::Winding { inductance, series, .. } => {
            std::iter::once(*inductance).chain(*series).collect()
        }
        Law::Capacitor { capacitance, loss } => match loss {
            CapacitorLoss::None => vec![*capacitance],
            CapacitorLoss::Series(a) | CapacitorLoss::Tangent(a) => vec![*capacitance, *a],
        },
        Law::VoltageSource(drive) | Law::CurrentSource(drive) => {
            drive.constant.into_iter().chain(drive.terms.iter().map(|(id, _)| *id)).collect()
        }
        Law::IdealWinding { turns, .. } => vec![*turns],
        Law::OpAmp { .. } => Vec::new(),
    }
}

fn judge_element(
    circuit: &Circuit,
    element: &Element,
    values: &Values<Ball>,
    found: &mut Vec<Diagnostic>,
) {
    for id in parts(element).into_iter().chain(element.tolerance) {
        judge_value(circuit, id, values, found);
    }
    if let Law::IdealWinding { turns, .. } = element.law {
        let formula = circuit.tape.get(turns);
        match real(circuit, turns, values) {
            Some(turns) if turns != 0.0 => {}
            _ => found.push(
                Diagnostic::error("turns must be a real constant, and not zero")
                    .at(formula.span, ""),
            ),
        }
    }
    if let Some(tolerance) = element.tolerance {
        let span = circuit.tape.get(tolerance).span;
        match real(circuit, tolerance, values) {
            Some(t) if (0.0..1.0).contains(&t) => {}
            _ => found.push(
                Diagnostic::error("a tolerance is a constant from 0 to below 100 %").at(span, ""),
            ),
        }
    }
}

/// A formula of the frequency that divides by a constant zero has a value at no frequency.
fn judge_divisors(circuit: &Circuit, values: &Values<Ball>, found: &mut Vec<Diagnostic>) {
    for (id, formula) in circuit.tape.iter() {
        let Operation::Quotient(_, below) = formula.operation else { continue };
        let constant = circuit.tape.get(below).phase == Phase::Constant;
        if formula.phase != Phase::Frequency || !constant {
            continue;
        }
        if values[below.index()].as_ref().is_ok_and(|ball| ball.centre.is_zero()) {
            found.push(fault(circuit, Fault { at: id, error: FieldError::DivisionByZero }));
        }
    }
}

fn judge_references(circuit: &Circuit, islands: &Islands, found: &mut Vec<Diagnostic>) {
    let mut chosen: Vec<(usize, Span)> = Vec::new();
    let tied = tied_nodes(circuit);
    for &(node, span) in &circuit.references {
        let name = circuit.node_name(node);
        let island = islands.of_node[node.index()];
        if !tied[node.index()] {
            found.push(Diagnostic::error(format!("no element touches node `{name}`")).at(span, ""));
        } else if islands.reference[island] == GND && tied[GND.index()] {
            found.push(
                Diagnostic::error(format!("the island of `{name}` already has `gnd`"))
                    .at(span, "")
                    .help("leave this statement out: `gnd` is the reference of its island"),
            );
        } else if let Some((_, first)) = chosen.iter().find(|(i, _)| *i == island) {
            found.push(
                Diagnostic::error("one island has two references")
                    .at(span, "second reference")
                    .at(*first, "first reference")
                    .help("keep one: their voltage against each other is not free"),
            );
        } else {
            chosen.push((island, span));
        }
    }
}

/// True for the nodes that an element touches.
pub fn tied_nodes(circuit: &Circuit) -> Vec<bool> {
    let mut tied = vec![false; circuit.nodes.len()];
    for element in &circuit.elements {
        tied[element.left.index()] = true;
        tied[element.right.index()] = true;
        if let Law::OpAmp { plus, minus } = element.law {
            tied[plus.index()] = true;
            tied[minus.index()] = true;
        }
    }
    tied
}

fn judge_readings(circuit: &Circuit, islands: &Islands, found: &mut Vec<Diagnostic>) {
    for (_, formula) in circuit.tape.iter() {
        let Operation::Measure(Measure::Volts(a, Some(b))) = formula.operation else { continue };
        if islands.same(a, b) {
            continue;
        }
        let name = |node| circuit.node_name(node);
        let reference = |node| name(islands.reference_of(node));
        found.push(
            Diagnostic::error(format!(
                "the voltage from `{}` to `{}` has no meaning: nothing ties their islands",
                name(a),
                name(b)
            ))
            .at(formula.span, format!("measured against `{}` and `{}`", reference(a), reference(b)))
            .help("read each against a node of its own island, or tie the islands with an element"),
        );
    }
}
