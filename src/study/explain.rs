//! Why a circuit has no single solution, in circuit words.

use crate::circuit::island::{Forest, Islands, Regime};
use crate::circuit::{Circuit, Element, ElementId, Law, NodeId, Phase, Values};
use crate::diag::Diagnostic;
use crate::number::{Ball, Balls};
use crate::solve::SolveError;
use crate::system::{System, Unknown};
use num_complex::Complex64;

/// Members of a null vector below this fraction of its largest one take no part.
const TAKES_PART: f64 = 1e-4;

/// Names listed in one message.
const MOST_NAMES: usize = 8;

/// Faults that the graph alone shows: loops of voltage sources, and nodes that only current
/// sources reach.
pub fn graph(circuit: &Circuit, islands: &Islands, regime: Regime) -> Vec<Diagnostic> {
    let mut found = Vec::new();
    voltage_loops(circuit, regime, &mut found);
    current_cutsets(circuit, islands, regime, &mut found);
    found
}

/// True for elements that fix their drop whatever their current is.
fn fixes_drop(
    circuit: &Circuit,
    constants: &Values<Ball>,
    element: &Element,
    regime: Regime,
) -> bool {
    let zero = |id: crate::circuit::FormulaId| {
        constants[id.index()].as_ref().is_ok_and(|ball| ball.centre.is_zero())
            && circuit.tape.get(id).phase == Phase::Constant
    };
    match &element.law {
        Law::VoltageSource(drive) => drive.terms.is_empty(),
        Law::Resistor { resistance } => zero(*resistance),
        Law::Winding { series, .. } => regime == Regime::Direct && series.is_none_or(zero),
        _ => false,
    }
}

fn voltage_loops(circuit: &Circuit, regime: Regime, found: &mut Vec<Diagnostic>) {
    let constants = circuit.tape.evaluate_constants(&Balls);
    let mut forest = Forest::new(circuit.nodes.len());
    let mut tree: Vec<ElementId> = Vec::new();
    for (id, element) in circuit.each_element() {
        if !fixes_drop(circuit, &constants, element, regime) {
            continue;
        }
        if element.left != element.right && forest.join(element.left, element.right) {
            tree.push(id);
            continue;
        }
        let mut around = path(circuit, &tree, element.left, element.right);
        around.push(id);
        found.push(loop_error(circuit, &around, regime));
    }
}

/// The elements of a tree on the way from one node to another.
fn path(circuit: &Circuit, tree: &[ElementId], from: NodeId, to: NodeId) -> Vec<ElementId> {
    let mut next: Vec<Vec<(NodeId, ElementId)>> = vec![Vec::new(); circuit.nodes.len()];
    for &id in tree {
        let element = circuit.element(id);
        next[element.left.index()].push((element.right, id));
        next[element.right.index()].push((element.left, id));
    }
    let mut came: Vec<Option<(NodeId, ElementId)>> = vec![None; circuit.nodes.len()];
    let mut waiting = vec![from];
    while let Some(node) = waiting.pop() {
        if node == to {
            break;
        }
        for &(other, id) in &next[node.index()] {
            if other != from && came[other.index()].is_none() {
                came[other.index()] = Some((node, id));
                waiting.push(other);
            }
        }
    }
    let mut way = Vec::new();
    let mut at = to;
    while let Some((before, id)) = came[at.index()] {
        way.push(id);
        at = before;
    }
    way.reverse();
    way
}

fn loop_error(circuit: &Circuit, around: &[ElementId], regime: Regime) -> Diagnostic {
    let names = list(around.iter().map(|&id| circuit.element(id).name.as_str()));
    let windings = around.iter().any(|&id| matches!(circuit.element(id).law, Law::Winding { .. }));
    let message = match windings && regime == Regime::Direct {
        true => format!("at f = 0 windings are shorts, and {names} close a loop"),
        false => format!("{names} close a loop that nothing but voltages and wires is in"),
    };
    let base = Diagnostic::error(message);
    let base = around
        .iter()
        .take(MOST_NAMES)
        .fold(base, |base, &id| base.at(circuit.element(id).span, ""));
    base.help("the current around the loop is not determined: put the real series resistance in")
}

fn current_cutsets(
    circuit: &Circuit,
    islands: &Islands,
    regime: Regime,
    found: &mut Vec<Diagnostic>,
) {
    let mut forest = Forest::new(circuit.nodes.len());
    for (id, element) in circuit.each_element() {
        match &element.law {
            // Only independent sources surely carry their own current and nothing else.
            Law::CurrentSource(drive) if drive.terms.is_empty() => {}
            _ => {
                for (a, b) in crate::circuit::island::ties(circuit, id, regime) {
                    forest.join(a, b);
                }
            }
        }
    }
    // A part of an island without the island's reference hangs on current sources.
    let mut reported = Vec::new();
    for (id, element) in circuit.each_element() {
        if !matches!(element.law, Law::CurrentSource(_)) {
            continue;
        }
        for node in [element.left, element.right] {
            let reference = islands.reference_of(node);
            let root = forest.root(node);
            if root == forest.root(reference) || reported.contains(&root) {
                continue;
            }
            reported.push(root);
            let members: Vec<_> = (0..circuit.nodes.len())
                .map(|i| NodeId(i as u32))
                .filter(|&n| forest.root(n) == root)
                .collect();
            let names = list(members.iter().map(|&n| circuit.node_name(n)));
            let verb = if members.len() == 1 { "hangs" } else { "hang" };
            found.push(
                Diagnostic::error(format!("{names} {verb} on current sources alone"))
                    .at(circuit.element(id).span, "its current has nowhere else to go")
                    .help("give the current a way back: the source's real shunt, or a load"),
            );
        }
    }
}

/// The error for a system that could not be solved. `null` is a vector that the equations map to
/// (nearly) zero: its large members are what is not determined.
pub fn singular(
    circuit: &Circuit,
    system: &System,
    frequency_hz: Option<f64>,
    error: &SolveError,
    null: Option<&[Complex64]>,
) -> Vec<Diagnostic> {
    let at = frequency_hz.map_or(String::new(), |f| format!("at {f} Hz "));
    let (elements, nodes) = match (null, column(error)) {
        (Some(null), _) => members(circuit, system, null),
        (None, Some(column)) => one_member(system, column),
        (None, None) => (Vec::new(), Vec::new()),
    };
    let names = list(elements.iter().map(|&id| circuit.element(id).name.as_str()));
    let base = match (elements.is_empty(), nodes.is_empty()) {
        _ if !is_singular(error) => Diagnostic::error(format!(
            "{at}the accuracy cannot be vouched for: the equations are too close to having no \
             single solution"
        )),
        (false, _) if windings_only(circuit, &elements) => Diagnostic::error(format!(
            "{at}the windings {names} share a current in no definite way"
        ))
        .help("k = 1 windings in parallel need their leakage or their resistance"),
        (false, _) if rings(circuit, &elements) => Diagnostic::error(format!(
            "{at}{names} ring without loss: the circuit resonates exactly here"
        ))
        .help("state the losses (`q`, `esr`, `tand`), or move the frequency"),
        (false, _) => Diagnostic::error(format!(
            "{at}the currents of {names} are not determined by the circuit"
        )),
        (true, false) => Diagnostic::error(format!(
            "{at}the voltage of {} is not determined by the circuit",
            list(nodes.iter().map(|&n| circuit.node_name(n)))
        ))
        .help("something must tie it to the rest: a load, a shunt, a wire"),
        (true, true) => Diagnostic::error(format!("{at}the circuit has no single solution")),
    };
    let base = elements
        .iter()
        .take(MOST_NAMES)
        .fold(base, |base, &id| base.at(circuit.element(id).span, ""));
    let base = match elements.is_empty() {
        true => nodes
            .iter()
            .take(MOST_NAMES)
            .fold(base, |base, &node| base.at(circuit.nodes[node.index()].span, "")),
        false => base,
    };
    vec![base]
}

/// The elements whose current, and the nodes whose voltage, take part in a null vector. An
/// element without a branch current takes part through its admittance.
fn members(
    circuit: &Circuit,
    system: &System,
    null: &[Complex64],
) -> (Vec<ElementId>, Vec<NodeId>) {
    let mut currents = vec![0.0f64; circuit.elements.len()];
    let mut voltages = vec![0.0f64; circuit.nodes.len()];
    for (value, unknown) in null.iter().zip(&system.unknowns) {
        match unknown {
            Unknown::Branch(id) => currents[id.index()] = value.norm(),
            Unknown::Node(node) => voltages[node.index()] = value.norm(),
        }
    }
    let top = |list: &[f64]| list.iter().copied().fold(0.0, f64::max);
    let top_voltage = top(&voltages);
    // Capacitors have no branch current; one rings along if its drop does.
    let volts = |node: NodeId| match system.of_node[node.index()] {
        Some(unknown) => null[unknown as usize],
        None => Complex64::default(),
    };
    let top_current = top(&currents);
    let elements: Vec<_> = circuit
        .each_element()
        .filter(|(id, element)| {
            let branch = top_current > 0.0 && currents[id.index()] > TAKES_PART * top_current;
            let drop = (volts(element.left) - volts(element.right)).norm();
            let capacitor = matches!(element.law, Law::Capacitor { .. })
                && top_current > 0.0
                && drop > TAKES_PART * top_voltage;
            branch || capacitor
        })
        .map(|(id, _)| id)
        .collect();
    let nodes = (0..circuit.nodes.len())
        .filter(|&i| top_voltage > 0.0 && voltages[i] > TAKES_PART * top_voltage)
        .map(|i| NodeId(i as u32))
        .collect();
    (elements, nodes)
}

fn column(error: &SolveError) -> Option<usize> {
    match *error {
        SolveError::StructurallySingular { column }
        | SolveError::Singular { column }
        | SolveError::NotFinite { column } => Some(column),
        SolveError::NotAccurate { .. } | SolveError::OutOfMemory => None,
    }
}

fn is_singular(error: &SolveError) -> bool {
    matches!(error, SolveError::StructurallySingular { .. } | SolveError::Singular { .. })
}

fn one_member(system: &System, column: usize) -> (Vec<ElementId>, Vec<NodeId>) {
    match system.unknowns[column] {
        Unknown::Node(node) => (Vec::new(), vec![node]),
        Unknown::Branch(id) => (vec![id], Vec::new()),
    }
}

fn windings_only(circuit: &Circuit, elements: &[ElementId]) -> bool {
    elements.len() > 1
        && elements.iter().all(|&id| matches!(circuit.element(id).law, Law::Winding { .. }))
}

fn rings(circuit: &Circuit, elements: &[ElementId]) -> bool {
    let any =
        |wanted: fn(&Law) -> bool| elements.iter().any(|&id| wanted(&circuit.element(id).law));
    any(|law| matches!(law, Law::Winding { .. })) && any(|law| matches!(law, Law::Capacitor { .. }))
}

/// `` `a`, `b` and `c` ``, cut off where it would grow too long.
fn list<'n>(names: impl Iterator<Item = &'n str>) -> String {
    let mut names: Vec<_> = names.map(|name| format!("`{name}`")).collect();
    let more = names.len().saturating_sub(MOST_NAMES);
    names.truncate(MOST_NAMES);
    if more > 0 {
        return format!("{} and {more} more", names.join(", "));
    }
    match names.split_last() {
        Some((last, rest)) if !rest.is_empty() => format!("{} and {last}", rest.join(", ")),
        Some((only, _)) => only.clone(),
        None => String::new(),
    }
}
