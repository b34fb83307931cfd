//! Two circuits side by side: which quantities they share, and how far those are apart at one
//! frequency.

use crate::circuit::island::{Islands, Regime};
use crate::circuit::{Circuit, ElementId, FormulaId, Measure, NodeId};
use crate::number::{Ball, Balls, Field};
use crate::quantity::Dimension;
use crate::study::engine::Engine;
use crate::study::point::regime_of;
use crate::study::{StudyError, Value};
use std::collections::HashMap;

/// Quantities below this share of the largest of their kind at a frequency are judged against
/// that share of it: their own size is mostly rounding.
pub const FLOOR: f64 = 1e-9;

/// Something of a circuit that has a value at each frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Quantity {
    /// A voltage or a current.
    Measure(Measure),
    /// A formula on the circuit's tape.
    Formula(FormulaId),
}

/// A quantity of both circuits.
#[derive(Clone, Debug, PartialEq)]
pub struct Matched {
    /// What it is called, as in a `read`: `volts(bus)`, `amps(load)`, or a reading's name.
    pub name: String,
    /// Its dimension.
    pub dimension: Dimension,
    /// Where it stands in the first circuit.
    pub first: Quantity,
    /// Where it stands in the second circuit.
    pub second: Quantity,
}

/// What of the first circuit is what in the second.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Correspondence {
    /// The node of the second circuit for each node of the first.
    pub node_of: Vec<Option<NodeId>>,
    /// The element of the second circuit for each element of the first.
    pub element_of: Vec<Option<ElementId>>,
    /// Quantities known to belong together; they stand before anything of the same name.
    pub known: Vec<Matched>,
}

/// The quantities two circuits share.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Matching {
    /// The quantities.
    pub matched: Vec<Matched>,
    /// What one circuit has and the other has not, in words.
    pub unmatched: Vec<String>,
}

impl Correspondence {
    /// Nodes and elements of the same name belong together.
    pub fn by_names(first: &Circuit, second: &Circuit) -> Self {
        let mut nodes = HashMap::new();
        for (i, node) in second.nodes.iter().enumerate() {
            nodes.extend(node.names.iter().map(|name| (name.as_str(), NodeId(i as u32))));
        }
        let elements: HashMap<_, _> =
            second.each_element().map(|(id, element)| (element.name.as_str(), id)).collect();
        let node = |names: &[String]| names.iter().find_map(|n| nodes.get(n.as_str()).copied());
        Correspondence {
            node_of: first.nodes.iter().map(|n| node(&n.names)).collect(),
            element_of: first.elements.iter().map(|e| elements.get(&*e.name).copied()).collect(),
            known: Vec::new(),
        }
    }
}

impl Matching {
    /// Finds the quantities two circuits share. Voltages are taken against the reference the node
    /// has in the first circuit, in both; nodes that are on one island in one circuit only have no
    /// voltage to compare.
    pub fn new(first: &Circuit, second: &Circuit, same: &Correspondence) -> Self {
        let mut found = Matching { matched: same.known.clone(), unmatched: Vec::new() };
        found.voltages(first, second, same);
        found.elements(first, second, same);
        found.readings(first, second);
        found
    }

    fn has(&self, name: &str) -> bool {
        self.matched.iter().any(|m| m.name == name)
    }

    fn measures(&mut self, name: String, dimension: Dimension, first: Measure, second: Measure) {
        let (first, second) = (Quantity::Measure(first), Quantity::Measure(second));
        self.matched.push(Matched { name, dimension, first, second });
    }

    fn voltages(&mut self, first: &Circuit, second: &Circuit, same: &Correspondence) {
        let islands = [first, second].map(|c| Islands::find(c, Regime::Alternating));
        let tied = [first, second].map(crate::circuit::judge::tied_nodes);
        let mut met = vec![false; second.nodes.len()];
        // One base for all nodes that are on one island in the first circuit and in the second.
        let mut base: HashMap<(usize, usize), (NodeId, NodeId)> = HashMap::new();
        let group =
            |a: NodeId, b: NodeId| (islands[0].of_node[a.index()], islands[1].of_node[b.index()]);
        for &reference in &islands[0].reference {
            if let Some(there) = same.node_of[reference.index()] {
                base.insert(group(reference, there), (reference, there));
            }
        }
        for (i, there) in same.node_of.iter().enumerate() {
            let here = NodeId(i as u32);
            let Some(there) = *there else {
                if tied[0][i] {
                    let name = first.node_name(here);
                    self.unmatched.push(format!("node `{name}` is in the first circuit only"));
                }
                continue;
            };
            met[there.index()] = true;
            if !tied[0][i] || !tied[1][there.index()] {
                continue;
            }
            let (base, other) = *base.entry(group(here, there)).or_insert((here, there));
            if base == here {
                continue;
            }
            let (name, to) = (first.node_name(here), first.node_name(base));
            let name = match islands[0].reference_of(here) == base {
                true => format!("volts({name})"),
                false => format!("volts({name} to {to})"),
            };
            let [a, b] = [(here, base), (there, other)].map(|(n, to)| Measure::Volts(n, Some(to)));
            self.measures(name, Dimension::VOLTAGE, a, b);
        }
        for (i, _) in met.iter().enumerate().filter(|(i, met)| !**met && tied[1][*i]) {
            let name = second.node_name(NodeId(i as u32));
            self.unmatched.push(format!("node `{name}` is in the second circuit only"));
        }
    }

    fn elements(&mut self, first: &Circuit, second: &Circuit, same: &Correspondence) {
        let mut met = vec![false; second.elements.len()];
        for (id, element) in first.each_element() {
            let (amps, drop) =
                (format!("amps({})", element.name), format!("drop({})", element.name));
            let known = self.has(&amps) || self.has(&drop);
            match same.element_of[id.index()] {
                Some(other) => {
                    met[other.index()] = true;
                    if known {
                        continue;
                    }
                    let (a, b) = (Measure::Amps(id), Measure::Amps(other));
                    self.measures(amps, Dimension::CURRENT, a, b);
                    let (a, b) = (Measure::Drop(id), Measure::Drop(other));
                    self.measures(drop, Dimension::VOLTAGE, a, b);
                }
                None if !known => {
                    let name = &element.name;
                    self.unmatched.push(format!("element `{name}` is in the first circuit only"));
                }
                None => {}
            }
        }
        for ((_, element), _) in second.each_element().zip(&met).filter(|(_, met)| !**met) {
            let name = &element.name;
            self.unmatched.push(format!("element `{name}` is in the second circuit only"));
        }
    }

    fn readings(&mut self, first: &Circuit, second: &Circuit) {
        for read in &first.reads {
            let name = &read.name;
            let Some(other) = second.reads.iter().find(|r| r.name == *name) else {
                self.unmatched.push(format!("reading `{name}` is in the first circuit only"));
                continue;
            };
            let dimension = first.dimension(read.value);
            if dimension != second.dimension(other.value) {
                self.unmatched.push(format!("reading `{name}` is of another kind in each circuit"));
                continue;
            }
            let (first, second) = (Quantity::Formula(read.value), Quantity::Formula(other.value));
            self.matched.push(Matched { name: name.clone(), dimension, first, second });
        }
        for read in second.reads.iter().filter(|r| !first.reads.iter().any(|o| o.name == r.name)) {
            let name = &read.name;
            self.unmatched.push(format!("reading `{name}` is in the second circuit only"));
        }
    }
}

/// How far one quantity is apart at one frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Apart {
    /// In the first circuit.
    pub first: Value,
    /// In the second circuit.
    pub second: Value,
    /// |first − second| over the larger of both, or over the floor.
    pub relative: f64,
    /// How much of `relative` the error bounds of the two solutions allow for.
    pub uncertain: f64,
}

impl Apart {
    /// True where the two are further apart than the limit, whatever the solutions' errors are.
    pub fn beyond(&self, within: f64) -> bool {
        self.relative - self.uncertain > within
    }
}

/// The quantities at one frequency; nothing where a quantity has no value in one of the circuits.
#[derive(Clone, Debug, PartialEq)]
pub struct Reading {
    /// One a matched quantity.
    pub apart: Vec<Option<Apart>>,
}

/// Which circuit could not be solved at a frequency.
#[derive(Clone, Debug, PartialEq)]
pub struct Unsolved {
    /// It was the first.
    pub first: Option<StudyError>,
    /// It was the second.
    pub second: Option<StudyError>,
}

/// Two circuits ready to be solved at many frequencies.
pub struct Pair<'c> {
    circuits: [&'c Circuit; 2],
    matched: &'c [Matched],
    engines: [[Option<Engine<'c>>; 2]; 2],
}

impl<'c> Pair<'c> {
    /// Two circuits with the quantities to look at.
    pub fn new(first: &'c Circuit, second: &'c Circuit, matched: &'c [Matched]) -> Self {
        Pair { circuits: [first, second], matched, engines: Default::default() }
    }

    /// Solves both circuits and says how far the quantities are apart.
    pub fn at(&mut self, frequency_hz: f64) -> Result<Reading, Unsolved> {
        let [first, second] = [0, 1].map(|which| self.solve(which, frequency_hz));
        if first.is_err() || second.is_err() {
            return Err(Unsolved { first: first.err(), second: second.err() });
        }
        let direct = usize::from(frequency_hz == 0.0);
        let values: Vec<Option<[Ball; 2]>> = self
            .matched
            .iter()
            .map(|matched| {
                let read = |which: usize, quantity| {
                    let engine = self.engines[which][direct].as_ref()?;
                    value(engine, quantity)
                };
                Some([read(0, matched.first)?, read(1, matched.second)?])
            })
            .collect();
        let mut largest: HashMap<Dimension, f64> = HashMap::new();
        for (matched, balls) in self.matched.iter().zip(&values) {
            let sizes = balls.iter().flatten().map(|ball| ball.centre.norm());
            let most = largest.entry(matched.dimension).or_default();
            *most = sizes.fold(*most, f64::max);
        }
        let apart = |(matched, balls): (&Matched, &Option<[Ball; 2]>)| {
            balls.map(|[a, b]| compare(a, b, FLOOR * largest[&matched.dimension]))
        };
        Ok(Reading { apart: self.matched.iter().zip(&values).map(apart).collect() })
    }

    fn solve(&mut self, which: usize, frequency_hz: f64) -> Result<(), StudyError> {
        let regime = regime_of(frequency_hz);
        let slot = &mut self.engines[which][usize::from(regime == Regime::Direct)];
        let engine = match slot {
            Some(engine) => engine,
            None => slot.insert(Engine::new(self.circuits[which], regime)?),
        };
        engine.solve(frequency_hz)
    }
}

fn value(engine: &Engine, quantity: Quantity) -> Option<Ball> {
    match quantity {
        Quantity::Measure(measure) => engine.measure(measure).ok(),
        Quantity::Formula(id) => engine.value(id).ok(),
    }
}

fn compare(first: Ball, second: Ball, floor: f64) -> Apart {
    // The difference is taken in twofold precision: rounding both values first would cost it.
    let difference = Balls.sub(&first, &second);
    let size = first.centre.norm().max(second.centre.norm()).max(floor);
    let over = |x: f64| if x == 0.0 { 0.0 } else { x / size };
    Apart {
        first: first.into(),
        second: second.into(),
        relative: over(difference.centre.norm()),
        uncertain: over(difference.radius),
    }
}
