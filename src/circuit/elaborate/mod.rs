//! Syntax trees to one flat circuit: names, scopes, blocks, formulas.
//!
//! Two passes. The first walks the statements, opens a scope for every `use`, and gives every node
//! and element its number; the second lowers values to formulas, so the order of statements does
//! not matter.

mod collect;
mod couple;
mod element;
pub(crate) mod functions;
mod lower;

pub(crate) use functions::angular;
pub(crate) use lower::children;

use crate::circuit::error::CircuitError;
use crate::circuit::formula::{FormulaId, Tape};
use crate::circuit::island::Forest;
use crate::circuit::{Circuit, Coupling, Element, ElementId, Ideal, Node, NodeId, Read, TableId};
use crate::source::{SourceId, Sources, Span};
use crate::text::ast;
use std::collections::HashMap;

/// Blocks in blocks deeper than this are taken for a mistake (real designs use three or four).
pub const DEEPEST_BLOCKS: usize = 64;

/// More elements than this are refused: nested blocks multiply, and a short text could ask for
/// more than any memory holds.
pub const MOST_ELEMENTS: usize = 4_000_000;

/// More instances of blocks than this are refused, for the same reason.
pub const MOST_INSTANCES: usize = 200_000;

/// What elaboration works on.
pub struct Input<'a> {
    /// Every text, for the data files.
    pub sources: &'a Sources,
    /// The statements of all files, includes spliced in.
    pub statements: Vec<&'a ast::Statement>,
    /// `let`s given on the command line: name, value.
    pub overrides: &'a [(ast::Name, ast::Expr)],
    /// Readings asked for on the command line: name, expression.
    pub reads: &'a [(String, ast::Expr)],
    /// The data file named at each place.
    pub data: &'a HashMap<Span, SourceId>,
}

/// Index of a scope.
type ScopeId = usize;
/// Index of a `let` or parameter.
type LetId = usize;

/// The names of a file (scope 0) or of one instance of a block.
struct Scope<'a> {
    /// Put before every name made here: `""` or `cm1.`.
    prefix: String,
    /// The scope the block was defined in.
    parent: Option<ScopeId>,
    lets: HashMap<&'a str, LetId>,
    blocks: HashMap<&'a str, Block<'a>>,
    ports: HashMap<&'a str, NodeId>,
    instances: HashMap<&'a str, Span>,
}

#[derive(Clone, Copy)]
struct Block<'a> {
    name: &'a ast::Name,
    nodes: &'a [ast::Name],
    parameters: &'a [(ast::Name, Option<ast::Expr>)],
    body: &'a [ast::Statement],
}

#[derive(Clone, Copy, PartialEq)]
enum LetState {
    Waiting,
    Open,
    Done(FormulaId),
    Failed,
}

struct Let<'a> {
    full_name: String,
    name: &'a ast::Name,
    value: &'a ast::Expr,
    /// The scope its value is read in.
    scope: ScopeId,
    state: LetState,
}

/// A statement whose values are lowered in the second pass.
enum Pending<'a> {
    Element { element: &'a ast::Element, id: ElementId },
    Turns { turns: &'a [ast::Expr], windings: Vec<ElementId> },
    Couple { couple: &'a ast::Couple, span: Span },
    Read { name: String, value: &'a ast::Expr, limits: &'a [ast::Limit], span: Span },
}

struct Elaborator<'a> {
    input: &'a Input<'a>,
    errors: Vec<CircuitError>,
    /// True once there is too much of something to go on.
    stopped: bool,
    scopes: Vec<Scope<'a>>,
    lets: Vec<Let<'a>>,
    /// `let`s given another value on the command line, with the value in the circuit.
    overridden: Vec<(LetId, &'a ast::Expr)>,
    pending: Vec<(ScopeId, Pending<'a>)>,
    tape: Tape,
    tables: HashMap<SourceId, Option<TableId>>,
    nodes: Vec<Node>,
    node_of: HashMap<String, NodeId>,
    /// Nodes that were only ever named through an instance (`cm1.x`), with the place.
    mentioned: HashMap<NodeId, Span>,
    /// Nodes joined by wires.
    joined: Forest,
    elements: Vec<Element>,
    element_of: HashMap<String, ElementId>,
    /// True once an element's value has said what it is.
    known_law: Vec<bool>,
    ideals: Vec<Ideal>,
    couplings: Vec<Coupling>,
    coupled: HashMap<(ElementId, ElementId), Span>,
    references: Vec<(NodeId, Span)>,
    reads: Vec<Read>,
    title: Option<(String, Span)>,
}

/// Elaborates the statements into a flat circuit, or says everything that is wrong with them.
pub fn elaborate(input: &Input) -> Result<Circuit, Vec<CircuitError>> {
    let mut work = Elaborator::new(input);
    work.collect();
    work.lower_lets();
    if !work.overrides_fit() {
        // Everything that uses the value would be wrong too.
        return Err(work.errors);
    }
    work.lower_pending();
    work.finish()
}

impl<'a> Elaborator<'a> {
    fn new(input: &'a Input<'a>) -> Self {
        let mut work = Elaborator {
            input,
            errors: Vec::new(),
            stopped: false,
            scopes: Vec::new(),
            lets: Vec::new(),
            overridden: Vec::new(),
            pending: Vec::new(),
            tape: Tape::default(),
            tables: HashMap::new(),
            nodes: Vec::new(),
            node_of: HashMap::new(),
            mentioned: HashMap::new(),
            joined: Forest::default(),
            elements: Vec::new(),
            element_of: HashMap::new(),
            known_law: Vec::new(),
            ideals: Vec::new(),
            couplings: Vec::new(),
            coupled: HashMap::new(),
            references: Vec::new(),
            reads: Vec::new(),
            title: None,
        };
        work.open_scope(String::new(), None);
        work.make_node("gnd".into(), Span::default());
        work
    }

    fn open_scope(&mut self, prefix: String, parent: Option<ScopeId>) -> ScopeId {
        self.scopes.push(Scope {
            prefix,
            parent,
            lets: HashMap::new(),
            blocks: HashMap::new(),
            ports: HashMap::new(),
            instances: HashMap::new(),
        });
        self.scopes.len() - 1
    }

    fn make_node(&mut self, full_name: String, span: Span) -> NodeId {
        let id = NodeId(self.nodes.len() as u32);
        self.nodes.push(Node { names: vec![full_name.clone()], span });
        self.joined.push();
        self.node_of.insert(full_name, id);
        id
    }

    /// Elements first: couplings look at what they are, wherever they stand.
    fn lower_pending(&mut self) {
        let pending = std::mem::take(&mut self.pending);
        for (scope, pending) in &pending {
            match pending {
                Pending::Element { element, id } => self.lower_element(*scope, element, *id),
                Pending::Turns { turns, windings } => self.lower_turns(*scope, turns, windings),
                Pending::Couple { .. } | Pending::Read { .. } => {}
            }
        }
        for (scope, pending) in pending {
            match pending {
                Pending::Element { .. } | Pending::Turns { .. } => {}
                Pending::Couple { couple, span } => self.lower_couple(scope, couple, span),
                Pending::Read { name, value, limits, span } => {
                    self.lower_read(scope, name, value, limits, span);
                }
            }
        }
    }

    /// Merges wired nodes, and hands the circuit over if nothing is wrong.
    fn finish(mut self) -> Result<Circuit, Vec<CircuitError>> {
        let mentioned: Vec<_> = self.mentioned.iter().map(|(&n, &s)| (n, s)).collect();
        for (node, span) in mentioned {
            let name = self.nodes[node.index()].names[0].clone();
            self.errors.push(CircuitError::UnknownNode { name, near: None, span });
        }
        if !self.errors.is_empty() {
            self.errors.sort_by_key(CircuitError::span);
            return Err(self.errors);
        }
        let mut new_of = vec![NodeId(u32::MAX); self.nodes.len()];
        let mut nodes: Vec<Node> = Vec::new();
        for i in 0..self.nodes.len() {
            // The root is the smallest number of its group, so it is met first.
            let root = self.joined.root(NodeId(i as u32)).index();
            if root == i {
                new_of[i] = NodeId(nodes.len() as u32);
                nodes.push(self.nodes[i].clone());
            } else {
                new_of[i] = new_of[root];
                let name = self.nodes[i].names[0].clone();
                nodes[new_of[root].index()].names.push(name);
            }
        }
        // The name a reference was chosen by is the one its island is measured against.
        for &(node, _) in &self.references {
            let chosen = self.nodes[node.index()].names[0].clone();
            let names = &mut nodes[new_of[node.index()].index()].names;
            if let Some(at) = names.iter().position(|name| *name == chosen)
                && names[0] != "gnd"
            {
                names.swap(0, at);
            }
        }
        let renumber = |node: &mut NodeId| *node = new_of[node.index()];
        for element in &mut self.elements {
            element.renumber_nodes(renumber);
        }
        self.tape.renumber_nodes(renumber);
        self.references.iter_mut().for_each(|(node, _)| renumber(node));
        let lets = self
            .lets
            .iter()
            .filter_map(|l| match l.state {
                LetState::Done(id) => Some((l.full_name.clone(), id)),
                _ => None,
            })
            .collect();
        Ok(Circuit {
            title: self.title.map(|(text, _)| text),
            nodes,
            elements: self.elements,
            couplings: self.couplings,
            ideals: self.ideals,
            references: self.references,
            reads: self.reads,
            lets,
            tape: self.tape,
        })
    }
}
