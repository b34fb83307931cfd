//! Free names for everything a flat circuit holds.

use crate::circuit::{Circuit, ElementId, Law, Measure, NodeId};
use std::collections::HashSet;

/// The name of everything in the text.
pub(super) struct Names {
    nodes: Vec<Vec<String>>,
    elements: Vec<String>,
    ideals: Vec<String>,
    lets: Vec<String>,
    reads: Vec<String>,
    taken_lets: HashSet<String>,
}

impl Names {
    pub(super) fn new(circuit: &Circuit) -> Self {
        let all: Vec<&str> =
            circuit.nodes.iter().flat_map(|n| n.names.iter().map(String::as_str)).collect();
        let (flat, _) = flatten(&all);
        let mut flat = flat.into_iter();
        let nodes =
            circuit.nodes.iter().map(|n| flat.by_ref().take(n.names.len()).collect()).collect();

        let ideals: Vec<&str> = circuit.ideals.iter().map(|i| i.name.as_str()).collect();
        let (ideals, _) = flatten(&ideals);
        let plain: Vec<&str> = circuit.elements.iter().map(|e| e.name.as_str()).collect();
        let (mut elements, _) = flatten(&plain);
        for (id, element) in circuit.each_element() {
            if let Law::IdealWinding { ideal, .. } = element.law {
                let place = circuit.ideals[ideal].windings.iter().position(|&w| w == id);
                elements[id.index()] = format!("{}.{}", ideals[ideal], place.unwrap_or(0) + 1);
            }
        }
        let lets: Vec<&str> = circuit.lets.iter().map(|(name, _)| name.as_str()).collect();
        let (lets, taken_lets) = flatten(&lets);
        let reads: Vec<&str> = circuit.reads.iter().map(|r| r.name.as_str()).collect();
        let (reads, _) = flatten(&reads);
        Names { nodes, elements, ideals, lets, reads, taken_lets }
    }

    pub(super) fn node(&self, id: NodeId) -> &str {
        &self.nodes[id.index()][0]
    }

    pub(super) fn all_of_node(&self, id: NodeId) -> &[String] {
        &self.nodes[id.index()]
    }

    pub(super) fn element(&self, id: ElementId) -> &str {
        &self.elements[id.index()]
    }

    pub(super) fn ideal(&self, ideal: usize) -> &str {
        &self.ideals[ideal]
    }

    /// By position in [`Circuit::lets`].
    pub(super) fn let_name(&self, position: usize) -> &str {
        &self.lets[position]
    }

    pub(super) fn read(&self, position: usize) -> &str {
        &self.reads[position]
    }

    /// No `let` has this name.
    pub(super) fn is_free_let(&self, name: &str) -> bool {
        !self.taken_lets.contains(name)
    }

    pub(super) fn measure(&self, measure: Measure) -> String {
        match measure {
            Measure::Volts(node, None) => format!("volts({})", self.node(node)),
            Measure::Volts(node, Some(to)) => {
                format!("volts({} to {})", self.node(node), self.node(to))
            }
            Measure::Drop(id) => format!("drop({})", self.element(id)),
            Measure::Amps(id) => format!("amps({})", self.element(id)),
            Measure::Power(id) => format!("power({})", self.element(id)),
        }
    }
}

/// Names a text may give, all different: those that are already such stay as they are.
fn flatten(names: &[&str]) -> (Vec<String>, HashSet<String>) {
    let is_flat = |name: &str| name.chars().all(|c| c.is_alphanumeric() || c == '_' || is_mark(c));
    let mut taken: HashSet<String> =
        names.iter().filter(|name| is_flat(name)).map(|name| (*name).to_owned()).collect();
    let flat = names
        .iter()
        .map(|name| {
            if is_flat(name) && !name.is_empty() {
                return (*name).to_owned();
            }
            let base = tame(name);
            let mut free = base.clone();
            let mut number = 2;
            while !taken.insert(free.clone()) {
                free = format!("{base}_{number}");
                number += 1;
            }
            free
        })
        .collect();
    (flat, taken)
}

/// Combining marks belong to the letter before them.
fn is_mark(c: char) -> bool {
    matches!(c, '\u{300}'..='\u{36f}')
}

/// A name made of letters, digits and `_` that starts with a letter or `_`; a reading asked for on
/// the command line may be called by its whole expression.
fn tame(name: &str) -> String {
    let mut out = String::new();
    for c in name.chars() {
        if c.is_alphanumeric() || is_mark(c) {
            out.push(c);
        } else if !out.ends_with('_') {
            out.push('_');
        }
    }
    let out = out.trim_end_matches('_');
    if out.starts_with(|c: char| c.is_numeric()) || out.is_empty() || !out.contains('_') {
        return format!("read_{out}");
    }
    out.to_owned()
}

/// As [`tame`], for parts of names.
#[cfg(test)]
mod tests {
    use crate::circuit::print::names::flatten;

    #[test]
    fn dotted_names_become_free_ones() {
        let (flat, _) = flatten(&["cm1.La", "cm1_La", "x", "cm1_La_2", "volts(a to b)"]);
        assert_eq!(flat, ["cm1_La_3", "cm1_La", "x", "cm1_La_2", "volts_a_to_b"]);
    }
}
