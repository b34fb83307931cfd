//! First pass: scopes, nodes, elements and instances get their names and numbers.

use crate::circuit::elaborate::{
    Block, DEEPEST_BLOCKS, Elaborator, Let, LetState, MOST_ELEMENTS, MOST_INSTANCES, Pending,
    ScopeId,
};
use crate::circuit::error::{CircuitError, Thing};
use crate::circuit::{Element, ElementId, GND, Ideal, Law, NodeId, formula::FormulaId};
use crate::diag::did_you_mean;
use crate::source::Span;
use crate::text::ast::{self, StatementKind};

impl<'a> Elaborator<'a> {
    pub(super) fn collect(&mut self) {
        let statements = self.input.statements.clone();
        self.declare(&statements, 0);
        self.apply_overrides();
        self.walk(&statements, 0, &mut Vec::new());
        for (name, value) in self.input.reads {
            let pending =
                Pending::Read { name: name.clone(), value, limits: &[], span: value.span };
            self.pending.push((0, pending));
        }
    }

    /// Makes the `let`s and blocks of a scope known before anything uses them.
    fn declare(&mut self, statements: &[&'a ast::Statement], scope: ScopeId) {
        for statement in statements {
            match &statement.kind {
                StatementKind::Let { name, value } => self.declare_let(scope, name, value, scope),
                StatementKind::Block { name, nodes, parameters, body } => {
                    let block = Block { name, nodes, parameters, body };
                    let old = self.scopes[scope].blocks.insert(&name.text, block);
                    if let Some(old) = old {
                        self.duplicate(Thing::Block, &name.text, name.span, old.name.span);
                    }
                }
                _ => {}
            }
        }
    }

    fn declare_let(
        &mut self,
        scope: ScopeId,
        name: &'a ast::Name,
        value: &'a ast::Expr,
        value_scope: ScopeId,
    ) {
        let full_name = format!("{}{}", self.scopes[scope].prefix, name.text);
        if let Some(&old) = self.scopes[scope].lets.get(&*name.text) {
            let first = self.lets[old].name.span;
            return self.duplicate(Thing::Let, &full_name, name.span, first);
        }
        self.scopes[scope].lets.insert(&name.text, self.lets.len());
        let state = LetState::Waiting;
        self.lets.push(Let { full_name, name, value, scope: value_scope, state });
    }

    fn apply_overrides(&mut self) {
        for (name, value) in self.input.overrides {
            match self.scopes[0].lets.get(&*name.text) {
                Some(&id) => {
                    let own = std::mem::replace(&mut self.lets[id].value, value);
                    self.overridden.push((id, own));
                }
                None => {
                    let known = self.scopes[0].lets.keys().copied();
                    let near = did_you_mean(&name.text, known).map(str::to_owned);
                    let name = name.clone();
                    let (text, span) = (name.text.to_string(), name.span);
                    self.errors.push(CircuitError::UnknownOverride { name: text, near, span });
                }
            }
        }
    }

    pub(super) fn duplicate(&mut self, thing: Thing, name: &str, span: Span, first: Span) {
        self.errors.push(CircuitError::Duplicate { thing, name: name.into(), span, first });
    }

    fn walk(&mut self, statements: &[&'a ast::Statement], scope: ScopeId, open: &mut Vec<&'a str>) {
        for statement in statements {
            if self.stopped {
                return;
            }
            self.walk_statement(statement, scope, open);
        }
    }

    /// Says once that there is too much of something; the walk ends there.
    fn overfull(&mut self, error: CircuitError) {
        if !self.stopped {
            self.stopped = true;
            self.errors.push(error);
        }
    }

    fn walk_statement(
        &mut self,
        statement: &'a ast::Statement,
        scope: ScopeId,
        open: &mut Vec<&'a str>,
    ) {
        let span = statement.span;
        match &statement.kind {
            StatementKind::Let { .. } | StatementKind::Block { .. } => {}
            StatementKind::Title(text) => match &self.title {
                _ if scope != 0 => self.errors.push(CircuitError::FileOnly { word: "title", span }),
                Some((_, first)) => {
                    let first = *first;
                    self.duplicate(Thing::Title, &text.text, text.span, first);
                }
                None => self.title = Some((text.text.clone(), text.span)),
            },
            // Files splice their includes in before elaboration; one is left only inside a block.
            StatementKind::Include(_) => {
                self.errors.push(CircuitError::FileOnly { word: "include", span });
            }
            StatementKind::Path(path) => self.walk_path(path, scope),
            StatementKind::Couple(couple) => {
                self.pending.push((scope, Pending::Couple { couple, span }));
            }
            StatementKind::Reference(name) => {
                let node = self.node(scope, name);
                self.references.push((node, name.span));
            }
            StatementKind::Read { name, value, limits } => {
                let span = name.span;
                let name = format!("{}{}", self.scopes[scope].prefix, name.text);
                self.pending.push((scope, Pending::Read { name, value, limits, span }));
            }
            StatementKind::Ideal { name, windings, turns } => {
                self.walk_ideal(scope, name, windings, turns, span);
            }
            StatementKind::Opamp { name, plus, minus, out } => {
                let law =
                    Law::OpAmp { plus: self.node(scope, plus), minus: self.node(scope, minus) };
                let out = self.node(scope, out);
                self.make_element(scope, &name.text, name.span, out, GND, law, span);
            }
            StatementKind::Use { block, name, nodes, parameters } => {
                self.walk_use(scope, block, name, nodes, parameters, open);
            }
        }
    }

    fn walk_path(&mut self, path: &'a ast::Path, scope: ScopeId) {
        let mut left = self.node(scope, &path.first);
        for (link, name) in &path.steps {
            let right = self.node(scope, name);
            match link {
                ast::Link::Wire(_) => _ = self.joined.join(left, right),
                ast::Link::Elements(elements) => {
                    for element in elements {
                        // A stand-in until the value is lowered and says what the element is.
                        let law = Law::OpAmp { plus: GND, minus: GND };
                        let name = &element.name;
                        let made = self.make_element(
                            scope,
                            &name.text,
                            name.span,
                            left,
                            right,
                            law,
                            element.span,
                        );
                        if let Some(id) = made {
                            self.known_law[id.index()] = false;
                            self.pending.push((scope, Pending::Element { element, id }));
                        }
                    }
                }
            }
            left = right;
        }
    }

    #[allow(clippy::too_many_arguments)] // one call for each part of an element
    fn make_element(
        &mut self,
        scope: ScopeId,
        name: &str,
        name_span: Span,
        left: NodeId,
        right: NodeId,
        law: Law,
        span: Span,
    ) -> Option<ElementId> {
        let full_name = format!("{}{name}", self.scopes[scope].prefix);
        if let Some(old) = self.element_of.get(&full_name) {
            let first = self.elements[old.index()].span;
            self.duplicate(Thing::Element, &full_name, name_span, first);
            return None;
        }
        if self.elements.len() >= MOST_ELEMENTS {
            self.overfull(CircuitError::TooMany {
                thing: Thing::Element,
                most: MOST_ELEMENTS,
                span,
            });
            return None;
        }
        let id = ElementId(self.elements.len() as u32);
        self.element_of.insert(full_name.clone(), id);
        self.known_law.push(true);
        self.elements.push(Element { name: full_name, left, right, law, tolerance: None, span });
        Some(id)
    }

    fn walk_ideal(
        &mut self,
        scope: ScopeId,
        name: &'a ast::Name,
        windings: &'a [(ast::Name, ast::Name)],
        turns: &'a [ast::Expr],
        span: Span,
    ) {
        if windings.len() < 2 || windings.len() != turns.len() {
            let (windings, turns) = (windings.len(), turns.len());
            return self.errors.push(CircuitError::TurnsCount { windings, turns, span });
        }
        let ideal = self.ideals.len();
        let mut made = Vec::new();
        for (i, (dotted, other)) in windings.iter().enumerate() {
            let (left, right) = (self.node(scope, dotted), self.node(scope, other));
            let law = Law::IdealWinding { ideal, turns: FormulaId::PLACEHOLDER };
            let winding = format!("{}.{}", name.text, i + 1);
            let span = dotted.span.to(other.span);
            match self.make_element(scope, &winding, name.span, left, right, law, span) {
                Some(id) => made.push(id),
                None => return,
            }
        }
        let full_name = format!("{}{}", self.scopes[scope].prefix, name.text);
        self.ideals.push(Ideal { name: full_name, windings: made.clone() });
        self.pending.push((scope, Pending::Turns { turns, windings: made }));
    }

    fn walk_use(
        &mut self,
        scope: ScopeId,
        block: &'a ast::Name,
        name: &'a ast::Name,
        nodes: &'a [ast::Name],
        parameters: &'a [(ast::Name, ast::Expr)],
        open: &mut Vec<&'a str>,
    ) {
        let Some((home, found)) = self.find_block(scope, block) else { return };
        if let Some(first) = self.scopes[scope].instances.insert(&name.text, name.span) {
            return self.duplicate(Thing::Instance, &name.text, name.span, first);
        }
        if open.contains(&&*block.text) {
            let chain = open.join(", ");
            let (name, span) = (block.text.to_string(), block.span);
            return self.errors.push(CircuitError::BlockUsesItself { name, chain, span });
        }
        if open.len() >= DEEPEST_BLOCKS {
            let (most, span) = (DEEPEST_BLOCKS, block.span);
            return self.errors.push(CircuitError::BlocksTooDeep { most, span });
        }
        if self.scopes.len() > MOST_INSTANCES {
            let (thing, most, span) = (Thing::Instance, MOST_INSTANCES, block.span);
            return self.overfull(CircuitError::TooMany { thing, most, span });
        }
        if nodes.len() != found.nodes.len() {
            return self.errors.push(CircuitError::UseNodeCount {
                block: block.text.to_string(),
                wanted: found.nodes.iter().map(|n| n.text.to_string()).collect(),
                given: nodes.len(),
                span: name.span,
                defined: found.name.span,
            });
        }
        let outer: Vec<_> = nodes.iter().map(|node| self.node(scope, node)).collect();
        let prefix = format!("{}{}.", self.scopes[scope].prefix, name.text);
        let inner = self.open_scope(prefix, Some(home));
        for (port, node) in found.nodes.iter().zip(outer) {
            if self.scopes[inner].ports.insert(&port.text, node).is_some() {
                self.duplicate(Thing::BlockNode, &port.text, port.span, found.name.span);
            }
        }
        self.bind_parameters(scope, inner, found, name, parameters);
        let body: Vec<&'a ast::Statement> = found.body.iter().collect();
        self.declare(&body, inner);
        open.push(&block.text);
        self.walk(&body, inner, open);
        open.pop();
    }

    fn find_block(&mut self, scope: ScopeId, name: &ast::Name) -> Option<(ScopeId, Block<'a>)> {
        let mut at = Some(scope);
        while let Some(here) = at {
            if let Some(block) = self.scopes[here].blocks.get(&*name.text) {
                return Some((here, *block));
            }
            at = self.scopes[here].parent;
        }
        let known = self.scopes[0].blocks.keys().copied();
        let near = did_you_mean(&name.text, known).map(str::to_owned);
        let (name, span) = (name.text.to_string(), name.span);
        self.errors.push(CircuitError::UnknownBlock { name, near, span });
        None
    }

    fn bind_parameters(
        &mut self,
        outer: ScopeId,
        inner: ScopeId,
        block: Block<'a>,
        instance: &'a ast::Name,
        given: &'a [(ast::Name, ast::Expr)],
    ) {
        for (name, value) in given {
            if block.parameters.iter().any(|(p, _)| p.text == name.text) {
                self.declare_let(inner, name, value, outer);
            } else {
                let known = block.parameters.iter().map(|(p, _)| &*p.text);
                self.errors.push(CircuitError::UnknownParameter {
                    near: did_you_mean(&name.text, known).map(str::to_owned),
                    name: name.text.to_string(),
                    block: block.name.text.to_string(),
                    span: name.span,
                });
            }
        }
        for (name, default) in block.parameters {
            if given.iter().any(|(g, _)| g.text == name.text) {
                continue;
            }
            match default {
                Some(value) => self.declare_let(inner, name, value, inner),
                None => self.errors.push(CircuitError::MissingParameter {
                    name: name.text.to_string(),
                    block: block.name.text.to_string(),
                    span: instance.span,
                    defined: name.span,
                }),
            }
        }
    }

    /// The node a name means in a scope; made if it is new.
    fn node(&mut self, scope: ScopeId, name: &ast::Name) -> NodeId {
        if &*name.text == "gnd" {
            return GND;
        }
        if let Some(&port) = self.scopes[scope].ports.get(&*name.text) {
            return port;
        }
        let full_name = format!("{}{}", self.scopes[scope].prefix, name.text);
        let dotted = name.text.contains('.');
        match self.node_of.get(&full_name) {
            Some(&id) => {
                if !dotted {
                    self.mentioned.remove(&id);
                }
                id
            }
            None => {
                let id = self.make_node(full_name, name.span);
                if dotted {
                    self.mentioned.insert(id, name.span);
                }
                id
            }
        }
    }

    /// The name most likely meant. Looked for only while few errors are known: every search goes
    /// through all names.
    fn near<'n>(&self, wanted: &str, names: impl Iterator<Item = &'n String>) -> Option<String> {
        const MOST_SEARCHES: usize = 50;
        let few = self.errors.len() < MOST_SEARCHES;
        let names = names.map(String::as_str);
        if few { did_you_mean(wanted, names).map(str::to_owned) } else { None }
    }

    /// The node a name means in a scope, which must exist; `None` with an error if it does not.
    pub(super) fn known_node(&mut self, scope: ScopeId, name: &ast::Name) -> Option<NodeId> {
        if &*name.text == "gnd" {
            return Some(GND);
        }
        let full_name = format!("{}{}", self.scopes[scope].prefix, name.text);
        let port = self.scopes[scope].ports.get(&*name.text);
        if let Some(&id) = port.or_else(|| self.node_of.get(&full_name)) {
            return Some(id);
        }
        let near = self.near(&full_name, self.node_of.keys());
        let (name, span) = (name.text.to_string(), name.span);
        self.errors.push(CircuitError::UnknownNode { name, near, span });
        None
    }

    /// The element a name means in a scope; `None` with an error if there is none.
    pub(super) fn known_element(&mut self, scope: ScopeId, name: &ast::Name) -> Option<ElementId> {
        let full_name = format!("{}{}", self.scopes[scope].prefix, name.text);
        if let Some(&id) = self.element_of.get(&full_name) {
            return Some(id);
        }
        let first_winding = format!("{full_name}.1");
        let ideal = self.element_of.contains_key(&first_winding);
        let near = match ideal {
            true => Some(first_winding),
            false => self.near(&full_name, self.element_of.keys()),
        };
        let (name, span) = (name.text.to_string(), name.span);
        self.errors.push(CircuitError::UnknownElement { name, near, span });
        None
    }
}
