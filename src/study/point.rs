//! One frequency: everything in the circuit.

use crate::circuit::island::Regime;
use crate::circuit::{Circuit, ElementId, Law, NodeId, Read, judge};
use crate::number::ball::Ball;
use crate::study::engine::Engine;
use crate::study::{
    Balance, ElementResult, NodeResult, ReadingResult, Solution, StudyError, Value,
};
use crate::text::ast::LimitKind;
use num_complex::Complex64;

/// Extra-low voltage, a.c.: 50 V rms (IEC 60364-4-41).
pub(crate) const EXTRA_LOW_VOLTS_AC: f64 = 50.0;

/// Extra-low voltage, d.c.: 120 V (IEC 60364-4-41).
const EXTRA_LOW_VOLTS_DC: f64 = 120.0;

/// Solves a circuit at one frequency in hertz.
pub fn solve(circuit: &Circuit, frequency_hz: f64) -> Result<Solution, StudyError> {
    let mut engine = Engine::new(circuit, regime_of(frequency_hz))?;
    engine.solve(frequency_hz)?;
    Ok(report(circuit, &engine, frequency_hz))
}

/// The regime of a frequency in hertz.
pub fn regime_of(frequency_hz: f64) -> Regime {
    if frequency_hz == 0.0 { Regime::Direct } else { Regime::Alternating }
}

fn report(circuit: &Circuit, engine: &Engine, frequency_hz: f64) -> Solution {
    let mut notes = Vec::new();
    let elements: Vec<_> =
        circuit.each_element().map(|(id, _)| element_result(circuit, engine, id)).collect();
    let magnitude = |e: &ElementResult| e.drop.map_or(0.0, |v| v.value.norm());
    let highest_drop = (0..elements.len())
        .max_by(|&a, &b| magnitude(&elements[a]).total_cmp(&magnitude(&elements[b])));
    let readings = circuit.reads.iter().map(|read| reading(engine, read, &mut notes)).collect();
    let nodes = node_results(circuit, engine);
    notes.extend(caution(engine.highest_volts(), frequency_hz));
    if elements.iter().any(|e| e.drop.is_none()) {
        notes.push(
            "at f = 0 capacitors are open; the voltage across one between two islands is not \
             determined"
                .into(),
        );
    }
    let (magnetic_energy_j, electric_energy_j) = energy(circuit, engine, &elements, frequency_hz);
    Solution {
        frequency_hz,
        balance: balance(circuit, &elements),
        nodes,
        elements,
        readings,
        magnetic_energy_j,
        electric_energy_j,
        highest_drop,
        notes,
    }
}

/// The line that a circuit beyond extra-low voltage gets.
pub fn caution(highest_volts: f64, frequency_hz: f64) -> Option<String> {
    let (limit, kind) = match frequency_hz == 0.0 {
        true => (EXTRA_LOW_VOLTS_DC, "d.c."),
        false => (EXTRA_LOW_VOLTS_AC, "rms a.c."),
    };
    (highest_volts > limit).then(|| {
        let volts = readable(highest_volts);
        format!(
            "{volts} V is above the extra-low voltage limit of {limit} V {kind} (IEC \
             60364-4-41): these results describe a model; local electrical codes and a licensed \
             person decide what is safe"
        )
    })
}

/// Four digits, and all of them before the point: `193.1`, `11547`.
fn readable(volts: f64) -> String {
    if volts >= 1e6 {
        return format!("{volts:.3e}");
    }
    let decimals = if volts < 100.0 { 2 } else { usize::from(volts < 1e3) };
    format!("{volts:.decimals$}")
}

fn node_results(circuit: &Circuit, engine: &Engine) -> Vec<NodeResult> {
    let tied = judge::tied_nodes(circuit);
    let mut results = Vec::new();
    for (i, node) in circuit.nodes.iter().enumerate() {
        let id = NodeId(i as u32);
        if !tied[i] {
            continue;
        }
        let reference = engine.system().islands.reference_of(id);
        for name in &node.names {
            results.push(NodeResult {
                name: name.clone(),
                reference: circuit.node_name(reference).to_owned(),
                voltage: engine.node(id).into(),
            });
        }
    }
    results
}

fn undetermined() -> Value {
    Value { value: Complex64::new(f64::NAN, f64::NAN), error: f64::INFINITY }
}

fn element_result(circuit: &Circuit, engine: &Engine, id: ElementId) -> ElementResult {
    let element = circuit.element(id);
    ElementResult {
        name: element.name.clone(),
        kind: circuit.kind(element),
        left: circuit.node_name(element.left).to_owned(),
        right: circuit.node_name(element.right).to_owned(),
        drop: engine.drop(id).map(Value::from),
        current: engine.current(id).map_or_else(|_| undetermined(), Value::from),
        power: engine.power(id).map_or_else(|_| undetermined(), Value::from),
    }
}

fn reading(engine: &Engine, read: &Read, notes: &mut Vec<String>) -> ReadingResult {
    let formula = engine.system().tape.get(read.value);
    let value = match engine.value(read.value) {
        Ok(ball) => Value::from(ball),
        Err(fault) => {
            notes.push(format!("reading `{}` has no value here: {}", read.name, fault.error));
            undetermined()
        }
    };
    ReadingResult {
        name: read.name.clone(),
        dimension: formula.dimension,
        real: formula.real,
        value,
        missed: missed(engine, read, value),
    }
}

/// The limits a reading misses, in words. A complex reading is judged by its magnitude, a real
/// one by its value; a reading without a value misses every limit.
pub(crate) fn missed(engine: &Engine, read: &Read, value: Value) -> Vec<String> {
    let real = engine.system().tape.get(read.value).real;
    let found = if real { value.value.re } else { value.value.norm() };
    let mut missed = Vec::new();
    for limit in &read.limits {
        let Ok(ball) = engine.value(limit.value) else { continue };
        let bound = ball.centre.to_complex().re;
        // Written so that a reading that is no number misses.
        let holds = match limit.kind {
            LimitKind::Least => found >= bound,
            LimitKind::Most => found <= bound,
        };
        if !holds {
            let unit = engine.system().tape.get(read.value).dimension;
            let word = if limit.kind == LimitKind::Least { "least" } else { "most" };
            missed.push(format!("{word} {bound} {unit}").trim_end().to_owned());
        }
    }
    missed
}

fn is_source(law: &Law) -> bool {
    matches!(law, Law::VoltageSource(_) | Law::CurrentSource(_) | Law::OpAmp { .. })
}

/// Tellegen: what sources deliver is what everything else absorbs.
fn balance(circuit: &Circuit, elements: &[ElementResult]) -> Balance {
    let mut balance = Balance::default();
    let mut sum = 0.0;
    for (element, result) in circuit.elements.iter().zip(elements) {
        let power = result.power.value;
        sum += power.norm();
        if is_source(&element.law) {
            balance.delivered -= power;
        } else {
            balance.absorbed += power;
        }
    }
    let off = (balance.delivered - balance.absorbed).norm();
    balance.mismatch = if sum > 0.0 { off / sum } else { 0.0 };
    balance
}

/// Mean energy in windings with their couplings, ½·iᴴ·L·i with rms currents, and in capacitors,
/// ½·C·|v|², in joules.
fn energy(
    circuit: &Circuit,
    engine: &Engine,
    elements: &[ElementResult],
    frequency_hz: f64,
) -> (f64, f64) {
    let value = |id| engine.value(id).map_or(Complex64::default(), |b: Ball| b.centre.to_complex());
    let current = |id: ElementId| elements[id.index()].current.value;
    let (mut magnetic, mut electric) = (0.0, 0.0);
    for (id, element) in circuit.each_element() {
        match element.law {
            Law::Winding { inductance, .. } => {
                magnetic += 0.5 * value(inductance).re * current(id).norm_sqr();
            }
            Law::Capacitor { capacitance, .. } => {
                let c = value(capacitance).re;
                // The charge, without what drops across the loss.
                let volts = match (frequency_hz > 0.0, elements[id.index()].drop) {
                    (true, _) if c != 0.0 => {
                        current(id).norm() / (2.0 * std::f64::consts::PI * frequency_hz * c)
                    }
                    (false, Some(drop)) => drop.value.norm(),
                    _ => 0.0,
                };
                electric += 0.5 * c * volts * volts;
            }
            _ => {}
        }
    }
    for coupling in &circuit.couplings {
        let sign = |id: ElementId| match circuit.element(id).law {
            Law::Winding { dot: Some(end), .. } => f64::from(end.sign()),
            _ => 0.0,
        };
        let both = (current(coupling.first).conj() * current(coupling.second)).re;
        magnetic += sign(coupling.first) * sign(coupling.second) * value(coupling.mutual).re * both;
    }
    (magnetic, electric)
}
