//! A twin and its original, and the twin's text, solved side by side.

use crate::support;
use bifilar::circuit::island::{Islands, Regime};
use bifilar::circuit::print::Printer;
use bifilar::circuit::{Circuit, ElementId, Measure, NodeId};
use bifilar::study::engine::Engine;
use bifilar::swap::{self, Options, SwapError, Twin};
use num_complex::Complex64;
use std::path::Path;

/// Reads a circuit text; panics with what is wrong with it.
#[track_caller]
pub fn read(text: &str) -> Circuit {
    match support::circuit(text, Path::new("circuits"), &[]) {
        Ok((circuit, _)) => circuit,
        Err(words) => panic!("{words}\n{text}"),
    }
}

/// The twin of a text.
#[track_caller]
pub fn twin_of(text: &str, options: &Options) -> Twin {
    swap::twin(&read(text), options).unwrap_or_else(|error| panic!("{error}\n{text}"))
}

/// Why a text has no twin.
#[track_caller]
pub fn refusal(text: &str, options: &Options) -> SwapError {
    match swap::twin(&read(text), options) {
        Ok(twin) => panic!("there is a twin:\n{}", written(&twin)),
        Err(error) => error,
    }
}

/// The text of a twin.
pub fn written(twin: &Twin) -> String {
    Printer::new(&twin.circuit).text(&[])
}

/// Values that are zero come out as less than this, in volts, amperes or volt-amperes.
const NOTHING: f64 = 1e-20;

/// What can be compared: a name, its value in the first and in the second circuit, and whether it
/// is a voltage, a current or a power.
struct Pair {
    name: String,
    kind: usize,
    first: Complex64,
    second: Complex64,
    /// What the bounds of both allow.
    error: f64,
}

/// Asserts that a twin, and the circuit its text reads back to, agree with the original.
#[track_caller]
pub fn assert_agrees(circuit: &Circuit, twin: &Twin, frequency_hz: f64, within: f64) {
    let text = written(twin);
    let Some(pairs) = pairs(circuit, twin, frequency_hz) else { return };
    judge(&pairs, within, &text, frequency_hz);
    let again = read(&text);
    assert_same_reads(&twin.circuit, &again, frequency_hz, within, &text);
}

/// True if the original has a solution here.
pub fn solvable(circuit: &Circuit, frequency_hz: f64) -> bool {
    Engine::new(circuit, Regime::Alternating)
        .is_ok_and(|mut engine| engine.solve(frequency_hz).is_ok())
}

#[track_caller]
fn judge(pairs: &[Pair], within: f64, text: &str, frequency_hz: f64) {
    let mut largest = [0.0f64; 3];
    for pair in pairs {
        largest[pair.kind] = largest[pair.kind].max(pair.first.norm());
    }
    for pair in pairs {
        let floor = 1e-9 * largest[pair.kind];
        let size = pair.first.norm().max(pair.second.norm()).max(floor);
        let off = (pair.first - pair.second).norm();
        assert!(
            off <= within * size + pair.error.min(NOTHING),
            "{} is {} in the original and {} in the twin, at {frequency_hz} Hz (allowed {:e})\n{text}",
            pair.name,
            pair.first,
            pair.second,
            pair.error,
        );
    }
}

/// Every node and element of the original with its reading in the twin; nothing where the original
/// has no solution.
#[track_caller]
fn pairs(circuit: &Circuit, twin: &Twin, frequency_hz: f64) -> Option<Vec<Pair>> {
    let mut first = Engine::new(circuit, Regime::Alternating).ok()?;
    first.solve(frequency_hz).ok()?;
    let words = |error| format!("{error:?}\n{}", written(twin));
    let mut second =
        Engine::new(&twin.circuit, Regime::Alternating).unwrap_or_else(|e| panic!("{}", words(e)));
    second.solve(frequency_hz).unwrap_or_else(|e| panic!("at {frequency_hz} Hz: {}", words(e)));
    let mut pairs = Vec::new();
    let mut add =
        |name: String, kind, a: Option<bifilar::number::Ball>, b: bifilar::number::Ball| {
            let Some(a) = a else { return };
            let [x, y] = [&a, &b].map(|ball| ball.centre.to_complex());
            pairs.push(Pair { name, kind, first: x, second: y, error: a.radius + b.radius });
        };
    let tied = tied(circuit);
    for i in (0..circuit.nodes.len()).filter(|&i| tied[i]) {
        let to = Measure::Volts(twin.node_of[i], Some(twin.reference_of[i]));
        let value = second.measure(to).unwrap_or_else(|e| panic!("{e}"));
        let node = NodeId(i as u32);
        add(format!("volts({})", circuit.node_name(node)), 0, Some(first.node(node)), value);
    }
    for (id, element) in circuit.each_element() {
        let Some(new) = twin.element_of[id.index()] else { continue };
        let measures = |id: ElementId| [Measure::Drop(id), Measure::Amps(id), Measure::Power(id)];
        for (kind, (old, new)) in measures(id).into_iter().zip(measures(new)).enumerate() {
            let value = second.measure(new).unwrap_or_else(|e| panic!("{e}"));
            add(format!("{old:?} of {}", element.name), kind, first.measure(old).ok(), value);
        }
    }
    for reading in &twin.readings {
        let w = reading.winding;
        let old = [Measure::Drop(w), Measure::Amps(w), Measure::Power(w)];
        let new = [reading.drop_formula, reading.amps_formula, reading.power_formula];
        for (kind, (old, new)) in old.into_iter().zip(new).enumerate() {
            let value = second.value(new).unwrap_or_else(|e| panic!("{e:?}"));
            add(format!("{old:?} of {}", reading.name), kind, first.measure(old).ok(), value);
        }
    }
    for (old, new) in circuit.reads.iter().zip(&twin.circuit.reads) {
        let (Ok(a), Ok(b)) = (first.value(old.value), second.value(new.value)) else { continue };
        add(format!("reading {}", old.name), 0, Some(a), b);
    }
    Some(pairs)
}

fn tied(circuit: &Circuit) -> Vec<bool> {
    let mut tied = vec![false; circuit.nodes.len()];
    for element in &circuit.elements {
        tied[element.left.index()] = true;
        tied[element.right.index()] = true;
    }
    tied
}

/// Asserts that two circuits have the same elements in the same order, with the same voltages and
/// currents, and the same readings.
#[track_caller]
pub fn assert_same_reads(
    circuit: &Circuit,
    again: &Circuit,
    frequency_hz: f64,
    within: f64,
    text: &str,
) {
    assert_eq!(circuit.title, again.title);
    assert_eq!(circuit.elements.len(), again.elements.len(), "{text}");
    assert_eq!(circuit.reads.len(), again.reads.len(), "{text}");
    assert_eq!(circuit.couplings.len(), again.couplings.len(), "{text}");
    let count = |c: &Circuit| {
        let islands = Islands::find(c, Regime::Alternating);
        let tied = tied(c);
        islands.reference.iter().filter(|node| tied[node.index()]).count()
    };
    assert_eq!(count(circuit), count(again), "{text}");
    let mut first = Engine::new(circuit, Regime::Alternating).expect("a system");
    let mut second = Engine::new(again, Regime::Alternating).expect("a system");
    if first.solve(frequency_hz).is_err() {
        return;
    }
    second.solve(frequency_hz).unwrap_or_else(|e| panic!("{e:?}\n{text}"));
    let mut pairs = Vec::new();
    for (id, element) in circuit.each_element() {
        assert_eq!(circuit.kind(element), again.kind(again.element(id)), "{text}");
        for (kind, measure) in [Measure::Drop(id), Measure::Amps(id)].into_iter().enumerate() {
            let [a, b] = [&first, &second].map(|e| e.measure(measure).expect("a value"));
            let name = format!("{measure:?} of {}", element.name);
            let [x, y] = [&a, &b].map(|ball| ball.centre.to_complex());
            pairs.push(Pair { name, kind, first: x, second: y, error: a.radius + b.radius });
        }
    }
    for (old, new) in circuit.reads.iter().zip(&again.reads) {
        let (Ok(a), Ok(b)) = (first.value(old.value), second.value(new.value)) else { continue };
        let [x, y] = [&a, &b].map(|ball| ball.centre.to_complex());
        let (name, error) = (old.name.clone(), a.radius + b.radius);
        pairs.push(Pair { name, kind: 0, first: x, second: y, error });
    }
    judge(&pairs, within, text, frequency_hz);
}
