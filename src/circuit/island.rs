//! Islands: nodes tied together by elements, each with its own reference node.
//!
//! A coupling ties nothing. Choosing a reference in an island without `gnd` is exact: no current
//! can flow through a single tie.

use crate::circuit::{Circuit, ElementId, GND, Law, NodeId};

/// Which elements conduct.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Regime {
    /// f > 0
    Alternating,
    /// f = 0: capacitors are open.
    Direct,
}

/// The islands of a circuit.
#[derive(Clone, Debug, PartialEq)]
pub struct Islands {
    /// The island of each node.
    pub of_node: Vec<usize>,
    /// The reference node of each island.
    pub reference: Vec<NodeId>,
}

/// Union-find over nodes.
#[derive(Clone, Debug, Default)]
pub struct Forest {
    parent: Vec<u32>,
}

impl Forest {
    /// Every node a tree of its own.
    pub fn new(nodes: usize) -> Self {
        Forest { parent: (0..nodes as u32).collect() }
    }

    /// Adds a node, a tree of its own.
    pub fn push(&mut self) {
        self.parent.push(self.parent.len() as u32);
    }

    /// The root of a node's tree.
    pub fn root(&mut self, node: NodeId) -> NodeId {
        let mut at = node.0;
        while self.parent[at as usize] != at {
            let up = self.parent[self.parent[at as usize] as usize];
            self.parent[at as usize] = up;
            at = up;
        }
        NodeId(at)
    }

    /// Joins two trees; false if they were one already, so that the edge makes a loop. The root
    /// with the smaller number stays.
    pub fn join(&mut self, a: NodeId, b: NodeId) -> bool {
        let (a, b) = (self.root(a), self.root(b));
        self.parent[a.max(b).index()] = a.min(b).0;
        a != b
    }
}

/// The pairs of nodes an element ties.
pub fn ties(circuit: &Circuit, id: ElementId, regime: Regime) -> Vec<(NodeId, NodeId)> {
    let element = circuit.element(id);
    let ends = (element.left, element.right);
    match element.law {
        Law::Capacitor { .. } if regime == Regime::Direct => Vec::new(),
        Law::OpAmp { plus, minus } => vec![ends, (plus, minus)],
        _ => vec![ends],
    }
}

impl Islands {
    /// Finds the islands.
    pub fn find(circuit: &Circuit, regime: Regime) -> Self {
        let mut forest = Forest::new(circuit.nodes.len());
        for (id, _) in circuit.each_element() {
            for (a, b) in ties(circuit, id, regime) {
                forest.join(a, b);
            }
        }
        let mut of_node = vec![usize::MAX; circuit.nodes.len()];
        let mut reference = Vec::new();
        for i in 0..circuit.nodes.len() {
            // A root has the smallest number of its island, so it is met first.
            let root = forest.root(NodeId(i as u32)).index();
            if root == i {
                of_node[i] = reference.len();
                reference.push(NodeId(i as u32));
            } else {
                of_node[i] = of_node[root];
            }
        }
        for (node, _) in &circuit.references {
            let island = of_node[node.index()];
            if reference[island] != GND {
                reference[island] = *node;
            }
        }
        Islands { of_node, reference }
    }

    /// The reference of a node's island.
    pub fn reference_of(&self, node: NodeId) -> NodeId {
        self.reference[self.of_node[node.index()]]
    }

    /// True if a voltage between the two nodes has a meaning.
    pub fn same(&self, a: NodeId, b: NodeId) -> bool {
        self.of_node[a.index()] == self.of_node[b.index()]
    }
}
