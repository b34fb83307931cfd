//! The syntax tree: plain data, a span on every node, no logic.

use crate::quantity::{Decimal, Unit};
use crate::source::Span;
use std::sync::Arc;

/// A name as written, in Unicode NFC. Element and node names may be dotted (`cm1.La`).
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Name {
    /// The name in NFC.
    pub text: Arc<str>,
    /// Where it stands.
    pub span: Span,
}

/// A quoted text with its place (quotes included in the span, not in the text).
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Text {
    /// What stands between the quotes.
    pub text: String,
    /// Where it stands.
    pub span: Span,
}

/// A parsed file: the statements that could be read, in order.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct File {
    /// The statements in order.
    pub statements: Vec<Statement>,
}

/// One statement with its place.
#[derive(Clone, Debug, PartialEq)]
pub struct Statement {
    /// What it says.
    pub kind: StatementKind,
    /// From its first to its last character.
    pub span: Span,
}

/// What a statement says.
#[derive(Clone, Debug, PartialEq)]
pub enum StatementKind {
    /// `title "…"`
    Title(Text),
    /// `let name = value`
    Let {
        /// The new name.
        name: Name,
        /// Its value.
        value: Expr,
    },
    /// `node link node …`
    Path(Path),
    /// `couple a, b : …` or `couple from "…"`
    Couple(Couple),
    /// `reference node`
    Reference(Name),
    /// `read name = value, least …, most …`
    Read {
        /// What the reading is called.
        name: Name,
        /// What is read.
        value: Expr,
        /// The limits after it.
        limits: Vec<Limit>,
    },
    /// `ideal name : a b | c d, turns 10 : 1`
    Ideal {
        /// The transformer's name.
        name: Name,
        /// One pair of nodes a winding, the dotted node first.
        windings: Vec<(Name, Name)>,
        /// One number a winding.
        turns: Vec<Expr>,
    },
    /// `opamp name : plus minus out`
    Opamp {
        /// The amplifier's name.
        name: Name,
        /// Non-inverting input.
        plus: Name,
        /// Inverting input.
        minus: Name,
        /// Output.
        out: Name,
    },
    /// `block name (nodes ; parameters) { … }`
    Block {
        /// The block's name.
        name: Name,
        /// Its outer nodes.
        nodes: Vec<Name>,
        /// Its parameters; those without a value must be given by `use`.
        parameters: Vec<(Name, Option<Expr>)>,
        /// What stands between the braces.
        body: Vec<Statement>,
    },
    /// `use block as name (nodes ; parameters)`
    Use {
        /// Which block.
        block: Name,
        /// What this instance is called.
        name: Name,
        /// The nodes it is tied to, in the block's order.
        nodes: Vec<Name>,
        /// Parameters given.
        parameters: Vec<(Name, Expr)>,
    },
    /// `include "…"`
    Include(Text),
}

/// `least value` or `most value` of a reading.
#[derive(Clone, Debug, PartialEq)]
pub struct Limit {
    /// Which way the limit holds.
    pub kind: LimitKind,
    /// The limit.
    pub value: Expr,
    /// From the word to the value.
    pub span: Span,
}

/// Which way a limit holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LimitKind {
    /// The reading must not be less.
    Least,
    /// The reading must not be more.
    Most,
}

/// A path: a node, and links that each lead to a next node.
#[derive(Clone, Debug, PartialEq)]
pub struct Path {
    /// Where the path starts.
    pub first: Name,
    /// Each link with the node it leads to.
    pub steps: Vec<(Link, Name)>,
}

/// What joins two nodes of a path.
#[derive(Clone, Debug, PartialEq)]
pub enum Link {
    /// `==`: the two nodes are one.
    Wire(Span),
    /// `-( … )( … )-`: one element, or several in parallel.
    Elements(Vec<Element>),
}

/// One element between its brackets.
#[derive(Clone, Debug, PartialEq)]
pub struct Element {
    /// Its name.
    pub name: Name,
    /// Its value, whose unit says what it is.
    pub value: Expr,
    /// What stands after the commas.
    pub attributes: Vec<Attribute>,
    /// The mark at the left bracket.
    pub left_mark: Option<Mark>,
    /// The mark at the right bracket.
    pub right_mark: Option<Mark>,
    /// From bracket to bracket, both included.
    pub span: Span,
}

/// A polarity mark.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Mark {
    /// Which mark.
    pub kind: MarkKind,
    /// Where.
    pub span: Span,
}

/// The polarity marks.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum MarkKind {
    /// `*`: this end of the winding has the dot.
    Dot,
    /// `+`: this end of the source is positive.
    Plus,
    /// `>`: the source drives its current from left to right.
    Rightward,
    /// `<`: the source drives its current from right to left.
    Leftward,
}

/// An attribute of an element.
#[derive(Clone, Debug, PartialEq)]
pub struct Attribute {
    /// Which one, with its values.
    pub kind: AttributeKind,
    /// From its word to its last character.
    pub span: Span,
}

/// The attributes.
#[derive(Clone, Debug, PartialEq)]
pub enum AttributeKind {
    /// `q value` or `q value at frequency`
    Quality {
        /// The quality factor.
        value: Expr,
        /// The frequency at which it was measured; none: holds at every frequency.
        at: Option<Expr>,
    },
    /// `esr value`: series resistance.
    SeriesResistance(Expr),
    /// `tand value`: loss tangent.
    LossTangent(Expr),
    /// `tol value`: tolerance as a fraction.
    Tolerance(Expr),
}

/// What a `couple` statement says.
#[derive(Clone, Debug, PartialEq)]
pub enum Couple {
    /// Windings by name and how they couple.
    Stated {
        /// Two or more windings.
        windings: Vec<Name>,
        /// The statement after the colon.
        how: Coupling,
    },
    /// `couple from "file.csv"`
    FromFile(Text),
}

/// How a coupling was measured.
#[derive(Clone, Debug, PartialEq)]
pub enum Coupling {
    /// `k value`
    Factor(Expr),
    /// `M value` or `M value, R value`
    Mutual {
        /// Mutual inductance.
        inductance: Expr,
        /// Mutual resistance.
        resistance: Option<Expr>,
    },
    /// `leakage value at winding`
    Leakage {
        /// What was read.
        value: Expr,
        /// The winding it was read at, the other one shorted.
        at: Name,
    },
    /// `aiding value, opposing value`
    Series {
        /// Reading with the two in series aiding.
        aiding: Expr,
        /// Reading with the two in series opposing.
        opposing: Expr,
    },
}

/// An expression with its place.
#[derive(Clone, Debug, PartialEq)]
pub struct Expr {
    /// What it is.
    pub kind: ExprKind,
    /// Where it stands.
    pub span: Span,
}

/// The expressions. Chains are flat, so a sum of a million terms is not a million levels deep;
/// every other nesting is capped by the grammar.
#[derive(Clone, Debug, PartialEq)]
pub enum ExprKind {
    /// A number, with a unit or without.
    Number {
        /// The number as written.
        value: Decimal,
        /// Its unit.
        unit: Option<Unit>,
    },
    /// `4j`
    Imaginary(Decimal),
    /// A `let`, a parameter, or one of `j`, `pi`, `f`, `omega`.
    Name(Name),
    /// `-x`
    Negative(Box<Expr>),
    /// `a + b - c …`
    Sum(Box<Expr>, Vec<(SumOperator, Expr)>),
    /// `a * b / c …`
    Product(Box<Expr>, Vec<(ProductOperator, Expr)>),
    /// `a ^ b`
    Power(Box<Expr>, Box<Expr>),
    /// `a ∠ b`
    Phasor(Box<Expr>, Box<Expr>),
    /// `(a) unit`
    WithUnit(Box<Expr>, Unit),
    /// `name(a, b, …)`: a function of expressions.
    Call(Name, Vec<Expr>),
    /// `table("file.csv", x)`
    Table(Text, Box<Expr>),
    /// `volts(a to b)`, `drop(e)`, `amps(e)`, `power(e)`
    Reading(Reading),
}

/// `+` or `-`
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum SumOperator {
    /// `+`
    Plus,
    /// `-`
    Minus,
}

/// `*` or `/`
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ProductOperator {
    /// `*`
    Times,
    /// `/`
    Over,
}

/// A reading of the circuit inside an expression.
#[derive(Clone, Debug, PartialEq)]
pub enum Reading {
    /// `volts(a)` (to the reference of its island) or `volts(a to b)`
    Volts {
        /// The node measured.
        node: Name,
        /// The node it is measured against.
        to: Option<Name>,
    },
    /// `drop(element)`
    Drop(Name),
    /// `amps(element)`
    Amps(Name),
    /// `power(element)`
    Power(Name),
}
