//! A twin while it is built: new nodes and elements, nodes joined, windings replaced.

use crate::circuit::island::{Islands, Regime, ties};
use crate::circuit::{
    Circuit, Drive, Element, ElementId, End, FormulaId, Ideal, Law, Measure, Node, NodeId,
};
use crate::diag::did_you_mean;
use crate::quantity::Dimension;
use crate::swap::algebra::{Algebra, Maybe};
use crate::swap::sets::{CoupledSet, Winding};
use crate::swap::{Condition, Fate, Options, SwapError, explain, same_name};
use std::collections::{HashMap, HashSet};

/// A union-find that grows.
#[derive(Default)]
struct Trees {
    parent: Vec<u32>,
    size: Vec<u32>,
}

impl Trees {
    fn grow_to(&mut self, count: usize) {
        while self.parent.len() < count {
            self.parent.push(self.parent.len() as u32);
            self.size.push(1);
        }
    }

    fn root(&self, node: NodeId) -> u32 {
        let mut at = node.0;
        while self.parent[at as usize] != at {
            at = self.parent[at as usize];
        }
        at
    }

    /// The larger tree takes the smaller one in, so paths stay short.
    fn join(&mut self, a: NodeId, b: NodeId) {
        let (a, b) = (self.root(a), self.root(b));
        if a == b {
            return;
        }
        let larger = self.size[a as usize] >= self.size[b as usize];
        let (top, under) = if larger { (a, b) } else { (b, a) };
        self.parent[under as usize] = top;
        self.size[top as usize] += self.size[under as usize];
    }
}

/// What becomes of a leg of zero inductance, or of one that is dropped.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(crate) enum Role {
    /// In the way of the current: dropped, it is a wire.
    Series,
    /// Beside the current: dropped, it is open.
    Shunt,
}

/// A leg before its formula has a text.
pub(crate) struct Part {
    pub name: String,
    /// The formula it should have, before rounding.
    pub exact: Maybe,
    /// The formula it has.
    pub value: Maybe,
    pub dimension: Dimension,
    pub fate: Fate,
    pub ideal: bool,
}

/// What a leg became.
#[derive(Clone, Copy)]
pub(crate) enum Laid {
    Element(ElementId),
    Wire,
    Open,
}

/// What is known of a set that is done.
pub(crate) struct Done {
    pub set: CoupledSet,
    pub condition: Condition,
    pub isolation_lost: bool,
    pub parts: Vec<Part>,
    pub matrices: explain::Matrices,
}

pub(crate) struct Build<'o> {
    /// Elements of the original, then new ones; the tape is with `algebra`.
    pub circuit: Circuit,
    pub algebra: Algebra,
    pub options: &'o Options,
    pub original_elements: usize,
    pub original_nodes: usize,
    /// The reference of each node's island in the original; new nodes have that of their home.
    pub reference: Vec<NodeId>,
    /// How the current of each replaced winding reads: the sum of these, or their negatives.
    pub amps: HashMap<ElementId, Vec<(bool, ElementId)>>,
    /// New elements and the winding whose place they take.
    pub placed: Vec<(ElementId, Vec<ElementId>)>,
    pub replaced: HashSet<ElementId>,
    pub done: Vec<Done>,
    pub warnings: Vec<String>,
    pub tie_nodes: Option<(NodeId, NodeId)>,
    pub tie_used: bool,
    /// Nodes tied by elements and wires.
    trees: Trees,
    /// Nodes that are one.
    wires: Trees,
    taken: HashSet<(Space, String)>,
    /// Formulas that have a `let` name.
    named: HashSet<FormulaId>,
    parts: Vec<Part>,
    /// The trees of the windings of this set before it was replaced.
    islands_before: Vec<u32>,
}

#[derive(Clone, Copy, PartialEq, Eq, Hash)]
enum Space {
    Element,
    Node,
    Let,
}

impl<'o> Build<'o> {
    pub(crate) fn new(
        original: &Circuit,
        algebra: Algebra,
        options: &'o Options,
    ) -> Result<Self, SwapError> {
        let islands = Islands::find(original, Regime::Alternating);
        let reference =
            (0..original.nodes.len()).map(|i| islands.reference_of(NodeId(i as u32))).collect();
        let mut trees = Trees::default();
        trees.grow_to(original.nodes.len());
        for (id, _) in original.each_element() {
            for (a, b) in ties(original, id, Regime::Alternating) {
                trees.join(a, b);
            }
        }
        let mut wires = Trees::default();
        wires.grow_to(original.nodes.len());
        let mut taken = HashSet::new();
        let flat = |name: &str| name.replace('.', "_");
        taken.extend(original.elements.iter().map(|e| (Space::Element, flat(&e.name))));
        taken.extend(original.ideals.iter().map(|i| (Space::Element, flat(&i.name))));
        let nodes = original.nodes.iter().flat_map(|n| &n.names);
        taken.extend(nodes.map(|name| (Space::Node, flat(name))));
        taken.extend(original.lets.iter().map(|(name, _)| (Space::Let, flat(name))));
        let mut build = Build {
            circuit: original.clone(),
            algebra,
            options,
            original_elements: original.elements.len(),
            original_nodes: original.nodes.len(),
            reference,
            amps: HashMap::new(),
            placed: Vec::new(),
            replaced: HashSet::new(),
            done: Vec::new(),
            warnings: Vec::new(),
            tie_nodes: None,
            tie_used: false,
            trees,
            wires,
            taken,
            named: original.lets.iter().map(|(_, id)| *id).collect(),
            parts: Vec::new(),
            islands_before: Vec::new(),
        };
        build.circuit.tape = Default::default();
        build.find_tie_nodes()?;
        Ok(build)
    }

    fn find_tie_nodes(&mut self) -> Result<(), SwapError> {
        let Some((first, second)) = &self.options.tie else { return Ok(()) };
        let (a, b) = (self.find_node(first)?, self.find_node(second)?);
        if self.same_tree(a, b) {
            let (first, second) = (first.clone(), second.clone());
            return Err(SwapError::TieMakesLoop { first, second });
        }
        self.tie_nodes = Some((a, b));
        Ok(())
    }

    fn find_node(&self, name: &str) -> Result<NodeId, SwapError> {
        let nodes = &self.circuit.nodes;
        let found = nodes.iter().position(|n| n.names.iter().any(|own| same_name(own, name)));
        found.map(|i| NodeId(i as u32)).ok_or_else(|| {
            let known = nodes.iter().flat_map(|n| n.names.iter().map(String::as_str));
            let near = did_you_mean(name, known).map(str::to_owned);
            SwapError::UnknownNode { name: name.to_owned(), near }
        })
    }

    /// Starts a set: its values get names, its windings are taken out.
    pub(crate) fn begin(&mut self, set: &mut CoupledSet) {
        self.placed.push((set.windings[0].id, Vec::new()));
        self.islands_before = set.windings.iter().map(|w| self.trees.root(w.left)).collect();
        for winding in &set.windings {
            self.replaced.insert(winding.id);
            self.name_value(&format!("L_{}", winding.name), winding.inductance);
        }
        for i in 0..set.len() {
            for j in i + 1..set.len() {
                if let Some(m) = set.inductance(i, j) {
                    let joint = joint(&set.windings[i].name, &set.windings[j].name);
                    self.name_value(&format!("M_{joint}"), m);
                }
            }
        }
        let toleranced: Vec<_> = set.windings.iter().filter(|w| w.tolerance).collect();
        if !toleranced.is_empty() {
            let names: Vec<_> = toleranced.iter().map(|w| format!("`{}`", w.name)).collect();
            self.warnings.push(format!(
                "the tolerances of {} are not in the twin: its legs depend on one another",
                names.join(", ")
            ));
        }
    }

    /// Ends a set.
    pub(crate) fn end(&mut self, set: &CoupledSet, condition: Condition) -> Result<(), SwapError> {
        if self.algebra.overflow {
            let (names, span) = (set.names(), set.span);
            return Err(SwapError::DimensionTooLarge { names, span });
        }
        let before = &self.islands_before;
        let several = before.iter().any(|tree| *tree != before[0]);
        let together = set.windings.iter().all(|w| self.same_tree(w.left, set.windings[0].left));
        let isolation_lost = several && together;
        if isolation_lost {
            self.warnings.push(format!(
                "{} are isolated from each other, this {} is not; it is a model: never build it \
                 in place of an isolating transformer",
                set.names(),
                self.options.into
            ));
        }
        let matrices = explain::Matrices::of(&mut self.algebra, set);
        let parts = std::mem::take(&mut self.parts);
        let set = set.clone();
        self.done.push(Done { set, condition, isolation_lost, parts, matrices });
        Ok(())
    }

    // ---- names ------------------------------------------------------------------------------

    fn free(&mut self, space: Space, base: &str) -> String {
        let mut name = base.to_owned();
        let mut number = 2;
        while !self.taken.insert((space, name.replace('.', "_"))) {
            name = format!("{base}_{number}");
            number += 1;
        }
        name
    }

    /// Gives a value a `let` name, unless it has one.
    pub(crate) fn name_value(&mut self, base: &str, id: FormulaId) {
        if self.named.insert(id) {
            let name = self.free(Space::Let, &base.replace('.', "_"));
            self.circuit.lets.push((name, id));
        }
    }

    pub(crate) fn node_name(&self, node: NodeId) -> String {
        self.circuit.node_name(node).to_owned()
    }

    // ---- nodes ------------------------------------------------------------------------------

    /// A new node; `home` is a node of the island it will belong to.
    pub(crate) fn node(&mut self, base: &str, home: NodeId) -> NodeId {
        let id = NodeId(self.circuit.nodes.len() as u32);
        let name = self.free(Space::Node, base);
        let span = self.circuit.nodes[home.index()].span;
        self.circuit.nodes.push(Node { names: vec![name], span });
        self.reference.push(self.reference[home.index()]);
        self.trees.grow_to(id.index() + 1);
        self.wires.grow_to(id.index() + 1);
        id
    }

    pub(crate) fn same_tree(&self, a: NodeId, b: NodeId) -> bool {
        self.trees.root(a) == self.trees.root(b)
    }

    pub(crate) fn same_node(&self, a: NodeId, b: NodeId) -> bool {
        self.wires.root(a) == self.wires.root(b)
    }

    /// A number that is the same for nodes that are one.
    pub(crate) fn node_key(&self, node: NodeId) -> u32 {
        self.wires.root(node)
    }

    /// Makes two nodes one.
    pub(crate) fn merge(&mut self, a: NodeId, b: NodeId) {
        self.wires.join(a, b);
        self.trees.join(a, b);
    }

    /// Makes two nodes of different trees one, which no current can notice.
    pub(crate) fn tie(&mut self, nodes: [NodeId; 2]) -> (String, String) {
        assert!(!self.same_tree(nodes[0], nodes[1]), "a tie must not make a loop");
        self.merge(nodes[0], nodes[1]);
        (self.node_name(nodes[0]), self.node_name(nodes[1]))
    }

    // ---- elements ---------------------------------------------------------------------------

    /// A new element in the place of the set.
    pub(crate) fn add(&mut self, base: &str, left: NodeId, right: NodeId, law: Law) -> ElementId {
        let name = match law {
            Law::IdealWinding { .. } => base.to_owned(),
            _ => self.free(Space::Element, base),
        };
        let id = ElementId(self.circuit.elements.len() as u32);
        self.trees.join(left, right);
        let (anchor, list) = self.placed.last_mut().expect("elements are added to a set");
        let span = self.circuit.elements[anchor.index()].span;
        list.push(id);
        self.circuit.elements.push(Element { name, left, right, law, tolerance: None, span });
        id
    }

    /// An ideal transformer without windings.
    pub(crate) fn ideal(&mut self, base: &str) -> usize {
        let name = self.free(Space::Element, base);
        self.circuit.ideals.push(Ideal { name, windings: Vec::new() });
        self.circuit.ideals.len() - 1
    }

    pub(crate) fn ideal_winding(
        &mut self,
        ideal: usize,
        dotted: NodeId,
        plain: NodeId,
        turns: FormulaId,
    ) -> ElementId {
        let own = &self.circuit.ideals[ideal];
        let name = format!("{}.{}", own.name, own.windings.len() + 1);
        let id = self.add(&name, dotted, plain, Law::IdealWinding { ideal, turns });
        self.circuit.ideals[ideal].windings.push(id);
        id
    }

    /// Elements in series at one end of a winding, the outermost first, in its own direction.
    /// The innermost node; if there are any, the winding's current is that of the first.
    pub(crate) fn chain(
        &mut self,
        winding: &Winding,
        end: End,
        laws: Vec<(String, Law)>,
    ) -> NodeId {
        let mut at = winding.node(end);
        for (name, law) in laws {
            let inner = self.node(&format!("{}_in", winding.name), at);
            let (left, right) = match end {
                End::Left => (at, inner),
                End::Right => (inner, at),
            };
            let id = self.add(&name, left, right, law);
            self.amps.entry(winding.id).or_insert_with(|| vec![(false, id)]);
            at = inner;
        }
        at
    }

    /// What stays outside an equivalent in series with a winding: its loss, and what the currents
    /// of the others do to it through mutual resistance.
    pub(crate) fn outside(
        &mut self,
        set: &CoupledSet,
        i: usize,
        mutual: bool,
    ) -> Vec<(String, Law)> {
        let winding = &set.windings[i];
        let mut laws = Vec::new();
        if let Some(resistance) = winding.series {
            laws.push((format!("{}_R", winding.name), Law::Resistor { resistance }));
        }
        if mutual {
            let terms = (0..set.len())
                .filter_map(|j| Some((j, set.mutual(i, j)?.resistance?)))
                .map(|(j, resistance)| self.induced(set, j, resistance))
                .collect::<Vec<_>>();
            if !terms.is_empty() {
                let drive = Drive { constant: None, terms, end: winding.dot };
                laws.push((format!("{}_shared_R", winding.name), Law::VoltageSource(drive)));
            }
        }
        laws
    }

    /// An impedance times the current into the dot of a winding.
    pub(crate) fn induced(
        &mut self,
        set: &CoupledSet,
        j: usize,
        impedance: FormulaId,
    ) -> (FormulaId, Measure) {
        let other = &set.windings[j];
        let factor = self.algebra.signed(other.dot == End::Right, impedance);
        // Replaced windings are read by other elements in the end.
        (factor, Measure::Amps(other.id))
    }

    /// A wire that a current can be read in.
    pub(crate) fn ammeter(&mut self, base: &str, left: NodeId, right: NodeId) -> ElementId {
        let resistance = self.algebra.number(0.0, Dimension::RESISTANCE);
        self.add(base, left, right, Law::Resistor { resistance })
    }

    // ---- legs -------------------------------------------------------------------------------

    /// Lays a leg of an inductance and a resistance; zero is a wire, which the caller has to make.
    pub(crate) fn leg(
        &mut self,
        base: &str,
        ends: (NodeId, NodeId),
        (inductance, series): (Maybe, Maybe),
        role: Role,
    ) -> Laid {
        let dimension = Dimension::INDUCTANCE;
        let name = self.free(Space::Element, base);
        self.taken.remove(&(Space::Element, name.replace('.', "_")));
        let dropped = self.options.drop.iter().any(|asked| same_name(&name, asked));
        let value = inductance.map(|exact| self.rounded(&name, exact));
        let (fate, laid) = match (dropped, role, value, series) {
            (true, Role::Series, ..) => (Fate::DroppedWire, Laid::Wire),
            (true, Role::Shunt, ..) => (Fate::DroppedOpen, Laid::Open),
            (_, _, None, None) => (Fate::Wire, Laid::Wire),
            (_, _, None, Some(resistance)) => {
                let id = self.add(&name, ends.0, ends.1, Law::Resistor { resistance });
                (Fate::Element, Laid::Element(id))
            }
            (_, _, Some(inductance), series) => {
                let law = Law::Winding { inductance, series, dot: None };
                (Fate::Element, Laid::Element(self.add(&name, ends.0, ends.1, law)))
            }
        };
        let exact = inductance;
        self.parts.push(Part { name, exact, value, dimension, fate, ideal: false });
        laid
    }

    /// Notes that a leg is infinite and left out.
    pub(crate) fn infinite_leg(&mut self, base: &str) {
        self.note(base, None, Dimension::INDUCTANCE, Fate::Open, false);
    }

    /// Notes a part of an equivalent that is no leg to round or drop.
    pub(crate) fn note(
        &mut self,
        name: &str,
        value: Maybe,
        dimension: Dimension,
        fate: Fate,
        ideal: bool,
    ) {
        let name = name.to_owned();
        self.parts.push(Part { name, exact: value, value, dimension, fate, ideal });
    }

    fn rounded(&mut self, name: &str, exact: FormulaId) -> FormulaId {
        let Some(series) = self.options.round else { return exact };
        match self.algebra.real(exact) {
            Some(value) if value != 0.0 => {
                let near = series.nearest(value.abs());
                self.algebra.decimal(near, value < 0.0, Dimension::INDUCTANCE)
            }
            _ => {
                self.warnings.push(format!("`{name}` depends on the frequency and is not rounded"));
                exact
            }
        }
    }
}

/// One name for two windings: `dock_buoy`, `cm1.La_Lb`.
pub(crate) fn joint(a: &str, b: &str) -> String {
    match (a.rsplit_once('.'), b.rsplit_once('.')) {
        (Some((first, _)), Some((second, own))) if first == second => format!("{a}_{own}"),
        _ => format!("{a}_{}", b.replace('.', "_")),
    }
}
