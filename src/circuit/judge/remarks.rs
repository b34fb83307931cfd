//! Remarks: things that are legal and that their writer should know.

use crate::circuit::island::Islands;
use crate::circuit::judge::{couplings, real, tied_nodes};
use crate::circuit::{Circuit, ElementId, End, GND, Law, NodeId, Values};
use crate::diag::Diagnostic;
use crate::number::ball::Ball;

/// Remarks of one kind after this many are summed up in one line.
const MOST_OF_A_KIND: usize = 12;

/// A secondary with at least this many times the inductance of its primary (ten times the turns)
/// is taken for that of a current transformer.
const CURRENT_TRANSFORMER_RATIO: f64 = 100.0;

pub(super) fn remark(
    circuit: &Circuit,
    islands: &Islands,
    values: &Values<Ball>,
    found: &mut Vec<Diagnostic>,
) {
    limited(found, unusual_values(circuit, values));
    limited(found, free_islands(circuit, islands));
    let lone = lone_ends(circuit);
    limited(found, dangling(circuit, &lone));
    limited(found, open_secondaries(circuit, values, &lone));
    if let Some(node) = circuit.nodes.iter().find(|n| n.names.iter().any(|name| name == "0")) {
        found.push(
            Diagnostic::remark("`0` is a node like any other")
                .at(node.span, "")
                .help("the reference node is called `gnd`"),
        );
    }
    let drives = |law: &Law| matches!(law, Law::VoltageSource(_) | Law::CurrentSource(_));
    if !circuit.elements.iter().any(|e| drives(&e.law)) {
        found.push(Diagnostic::remark("no source drives this circuit: everything in it is zero"));
    }
}

fn limited(found: &mut Vec<Diagnostic>, mut remarks: Vec<Diagnostic>) {
    let more = remarks.len().saturating_sub(MOST_OF_A_KIND);
    remarks.truncate(MOST_OF_A_KIND);
    found.extend(remarks);
    if more > 0 {
        found.push(Diagnostic::remark(format!("… and {more} more of this kind")));
    }
}

fn unusual_values(circuit: &Circuit, values: &Values<Ball>) -> Vec<Diagnostic> {
    let mut remarks = Vec::new();
    for element in &circuit.elements {
        let (id, zero) = match element.law {
            Law::Resistor { resistance } => (resistance, "a resistance of zero is a wire"),
            Law::Conductance { conductance } => (conductance, "a conductance of zero is open"),
            Law::Winding { inductance, .. } => (inductance, "a winding of zero is a wire"),
            Law::Capacitor { capacitance, .. } => (capacitance, "a capacitance of zero is open"),
            _ => continue,
        };
        let Some(value) = real(circuit, id, values) else { continue };
        let say = |words: String| Diagnostic::remark(words).at(element.span, "");
        if value == 0.0 {
            remarks.push(say(format!("`{}`: {zero}", element.name)));
        } else if value < 0.0 {
            let kind = circuit.kind(element);
            remarks.push(say(format!(
                "`{}` is a negative {kind}: it can be calculated, not bought",
                element.name
            )));
        }
    }
    remarks
}

fn free_islands(circuit: &Circuit, islands: &Islands) -> Vec<Diagnostic> {
    let tied = tied_nodes(circuit);
    let chosen = |node: NodeId| circuit.references.iter().any(|(n, _)| *n == node);
    let each = islands.reference.iter().filter(|r| **r != GND && tied[r.index()] && !chosen(**r));
    each.map(|&reference| {
        let island = islands.of_node[reference.index()];
        let count = islands.of_node.iter().filter(|i| **i == island).count();
        let name = circuit.node_name(reference);
        Diagnostic::remark(format!(
            "an island of {count} nodes has no `gnd`: its voltages are measured against `{name}`"
        ))
        .at(circuit.nodes[reference.index()].span, "")
        .help(format!("choose another node with `reference …`, or keep it: `reference {name}`"))
    })
    .collect()
}

/// The nodes that a single element end touches, with that element.
fn lone_ends(circuit: &Circuit) -> Vec<Option<ElementId>> {
    let mut degree = vec![0u32; circuit.nodes.len()];
    let mut last = vec![None; circuit.nodes.len()];
    let mut touch = |node: NodeId, id| {
        degree[node.index()] += 1;
        last[node.index()] = Some(id);
    };
    for (id, element) in circuit.each_element() {
        touch(element.left, id);
        touch(element.right, id);
        if let Law::OpAmp { plus, minus } = element.law {
            // An input takes no current, so it does not close anybody's circuit, but a node made
            // for it is no oversight.
            [plus, minus].into_iter().for_each(|node| touch(node, id));
        }
    }
    degree.iter().zip(last).map(|(&d, id)| if d == 1 { id } else { None }).collect()
}

fn dangling(circuit: &Circuit, lone: &[Option<ElementId>]) -> Vec<Diagnostic> {
    let mut remarks = Vec::new();
    for (i, id) in lone.iter().enumerate() {
        let Some(id) = *id else { continue };
        // The one end of a source at `gnd` and the like is no dangling node.
        if NodeId(i as u32) == GND || circuit.references.iter().any(|(n, _)| n.index() == i) {
            continue;
        }
        let element = circuit.element(id);
        let node = &circuit.nodes[i];
        remarks.push(
            Diagnostic::remark(format!(
                "node `{}` hangs on `{}` alone: no current flows there",
                node.names[0], element.name
            ))
            .at(node.span, ""),
        );
    }
    remarks
}

fn open_secondaries(
    circuit: &Circuit,
    values: &Values<Ball>,
    lone: &[Option<ElementId>],
) -> Vec<Diagnostic> {
    let mut remarks = Vec::new();
    let inductance = |id: ElementId| match circuit.element(id).law {
        Law::Winding { inductance, .. } => real(circuit, inductance, values),
        _ => None,
    };
    let open = |id: ElementId| {
        [End::Left, End::Right].iter().any(|end| {
            let element = circuit.element(id);
            let node = if *end == End::Left { element.left } else { element.right };
            lone[node.index()] == Some(id)
        })
    };
    for set in couplings::sets(circuit, values) {
        for &id in set.windings.iter().filter(|id| open(**id)) {
            let own = inductance(id);
            let steps_up = set.windings.iter().any(|&other| {
                matches!((own, inductance(other)),
                    (Some(a), Some(b)) if a >= CURRENT_TRANSFORMER_RATIO * b)
            });
            if steps_up {
                let element = circuit.element(id);
                remarks.push(
                    Diagnostic::remark(format!("the winding `{}` is open", element.name))
                        .at(element.span, "many more turns than its primary")
                        .help(
                            "if this is a current transformer: its open secondary can reach a \
                             dangerous voltage; short it before the burden is taken off",
                        ),
                );
            }
        }
    }
    remarks
}
