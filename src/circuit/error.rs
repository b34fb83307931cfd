//! What can be wrong with a circuit whose text could be read.

use crate::diag::Diagnostic;
use crate::quantity::Dimension;
use crate::source::Span;
use crate::text::ast::MarkKind;
use std::fmt;
use thiserror::Error;

/// Things that must have different names.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Thing {
    /// A block.
    Block,
    /// A node of a block.
    BlockNode,
    /// An element.
    Element,
    /// An instance of a block.
    Instance,
    /// A `let` or parameter.
    Let,
    /// A reading.
    Read,
    /// The title.
    Title,
}

impl fmt::Display for Thing {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        out.write_str(match self {
            Thing::Block => "block",
            Thing::BlockNode => "node of a block",
            Thing::Element => "element",
            Thing::Instance => "instance",
            Thing::Let => "`let`",
            Thing::Read => "reading",
            Thing::Title => "title",
        })
    }
}

/// `"a plain number"` or the unit in backquotes.
pub(crate) fn unit_words(dimension: Dimension) -> String {
    if dimension == Dimension::NONE {
        return "a plain number".into();
    }
    format!("`{dimension}`")
}

/// One fault of a circuit.
#[derive(Clone, Debug, PartialEq, Error)]
#[allow(missing_docs)] // the message of each variant says what it is; fields are names and places
pub enum CircuitError {
    #[error("the {thing} `{name}` is there twice")]
    Duplicate { thing: Thing, name: String, span: Span, first: Span },
    #[error("no `let` at the top of the file is called `{name}`")]
    UnknownOverride { name: String, near: Option<String>, span: Span },
    #[error("`{name}` is {} in the circuit, and {} here", unit_words(*own), unit_words(*given))]
    OverrideDimension { name: String, given: Dimension, own: Dimension, span: Span },
    #[error("nothing is called `{name}` here")]
    UnknownName { name: String, near: Option<String>, element: bool, span: Span },
    #[error("no element is called `{name}`")]
    UnknownElement { name: String, near: Option<String>, span: Span },
    #[error("no node is called `{name}`")]
    UnknownNode { name: String, near: Option<String>, span: Span },
    #[error("no block is called `{name}`")]
    UnknownBlock { name: String, near: Option<String>, span: Span },
    #[error("there is no function `{name}`")]
    UnknownFunction { name: String, near: Option<String>, span: Span },
    #[error("block `{block}` has no parameter `{name}`")]
    UnknownParameter { name: String, block: String, near: Option<String>, span: Span },
    #[error("block `{block}` needs a value for its parameter `{name}`")]
    MissingParameter { name: String, block: String, span: Span, defined: Span },
    #[error("`{word}` belongs at the top of a file, not inside a block")]
    FileOnly { word: &'static str, span: Span },
    #[error("block `{name}` uses itself")]
    BlockUsesItself { name: String, chain: String, span: Span },
    #[error("blocks are nested more than {most} deep")]
    BlocksTooDeep { most: usize, span: Span },
    #[error("block `{block}` has {} nodes, {given} are given", wanted.len())]
    UseNodeCount { block: String, wanted: Vec<String>, given: usize, span: Span, defined: Span },
    #[error("the circuit is too large: more than {most} of this: {thing}")]
    TooMany { thing: Thing, most: usize, span: Span },
    #[error("an ideal transformer needs as many turns as windings, and at least two")]
    TurnsCount { windings: usize, turns: usize, span: Span },
    #[error("`let`s that need each other: {}", names.join(" → "))]
    CyclicLet { names: Vec<String>, spans: Vec<Span> },
    #[error("the value is {}, but {} is needed here", unit_words(*found), unit_words(*wanted))]
    WrongDimension { found: Dimension, wanted: Dimension, span: Span },
    #[error("{} and {} cannot be {}", unit_words(*left), unit_words(*right),
        if *minus { "subtracted" } else { "added" })]
    MixedSum { left: Dimension, right: Dimension, left_span: Span, right_span: Span, minus: bool },
    #[error("the arguments measure different things: {} and {}",
        unit_words(*left), unit_words(*right))]
    MixedArguments { left: Dimension, right: Dimension, left_span: Span, right_span: Span },
    #[error("`{name}` takes {wanted} argument{}{}, {given} given",
        if *wanted == 1 { "" } else { "s" }, if *more { " or more" } else { "" })]
    ArgumentCount { name: String, wanted: usize, more: bool, given: usize, span: Span },
    #[error("the unit of this expression is beyond what can be kept")]
    DimensionTooLarge { span: Span },
    #[error("the power of a quantity in {} needs a plain number as exponent",
        unit_words(*dimension))]
    ExponentUnknown { dimension: Dimension, span: Span },
    #[error("this already has the unit {}", unit_words(*found))]
    UnitTwice { found: Dimension, span: Span },
    #[error("a reading of the solved circuit cannot stand here")]
    ReadingNotAllowed { span: Span },
    #[error("only a source can depend on a reading; this value is {}", unit_words(*dimension))]
    DependentValue { dimension: Dimension, span: Span },
    #[error("a dependent source must be linear in the readings it uses")]
    NotLinear { span: Span, whole: Span },
    #[error("this value unfolds into more than {most} terms")]
    TooManyTerms { most: usize, span: Span },
    #[error("no element is measured in {}", unit_words(*dimension))]
    NoSuchElement { dimension: Dimension, span: Span },
    #[error("a winding's losses are not stated as `tand`")]
    TangentOfWinding { span: Span },
    #[error("only windings and capacitors have losses of their own")]
    AttributeNotHere { span: Span },
    #[error("the same thing is said twice")]
    AttributeTwice { span: Span },
    #[error("the voltage source has no `+` end")]
    MissingPlus { span: Span },
    #[error("the current source has no direction")]
    MissingArrow { span: Span },
    #[error("the coupled winding `{name}` has no dot")]
    MissingDot { name: String, span: Span },
    #[error("an element takes one mark, here are two")]
    TwoMarks { first: Span, second: Span },
    #[error("this mark does not belong to this element")]
    WrongMark { kind: MarkKind, span: Span },
    #[error("`{name}` is no winding, so nothing couples to it")]
    NotAWinding { name: String, span: Span, defined: Span },
    #[error("`{name}` is coupled to itself")]
    CoupledToItself { name: String, span: Span },
    #[error("the pair `{a}`, `{b}` is coupled twice")]
    CoupledTwice { a: String, b: String, span: Span, first: Span },
    #[error("this reading is taken on two windings; {given} are named")]
    ReadingOfPair { given: usize, span: Span },
    #[error("the leakage is read at `{name}`, which is not one of the two windings")]
    LeakageElsewhere { name: String, span: Span },
    #[error("{problem}")]
    BadData { problem: String, span: Span },
    #[error("`{file}` includes itself")]
    IncludeCycle { file: String, span: Span },
    #[error("includes are nested more than {most} deep")]
    IncludesTooDeep { most: usize, span: Span },
    #[error("`{file}` cannot be read: {problem}")]
    Unreadable { file: String, problem: String, span: Span },
}

impl CircuitError {
    /// The place that gives the error its file and line.
    pub fn span(&self) -> Span {
        self.diagnostic().labels.first().map_or(Span::default(), |label| label.span)
    }

    /// True for errors that a statement which could not be read may have caused.
    pub fn may_follow_from_others(&self) -> bool {
        use CircuitError as E;
        matches!(
            self,
            E::UnknownOverride { .. }
                | E::UnknownName { .. }
                | E::UnknownElement { .. }
                | E::UnknownNode { .. }
                | E::UnknownBlock { .. }
                | E::UnknownParameter { .. }
                | E::MissingParameter { .. }
        )
    }

    /// The error with its places and ways out.
    pub fn diagnostic(&self) -> Diagnostic {
        use CircuitError as E;
        let base = Diagnostic::error(self.to_string());
        let meant = |base: Diagnostic, near: &Option<String>| match near {
            Some(near) => base.help(format!("did you mean `{near}`?")),
            None => base,
        };
        match self {
            E::Duplicate { span, first, .. } => {
                base.at(*span, "second time").at(*first, "first time").help("rename one of them")
            }
            E::UnknownOverride { near, span, .. } => meant(base.at(*span, ""), near)
                .help("`--set` replaces the value of a `let` that the circuit has"),
            E::UnknownName { name, near, element, span } => {
                let base = base.at(*span, "");
                match element {
                    true => base.help(format!(
                        "`{name}` is an element: write `drop({name})`, `amps({name})` or `power({name})`"
                    )),
                    false => meant(base, near).help(format!("define it: `let {name} = …`")),
                }
            }
            E::UnknownElement { near, span, .. }
            | E::UnknownNode { near, span, .. }
            | E::UnknownBlock { near, span, .. }
            | E::UnknownFunction { near, span, .. }
            | E::UnknownParameter { near, span, .. } => meant(base.at(*span, ""), near),
            E::MissingParameter { name, span, defined, .. } => base
                .at(*span, "")
                .at(*defined, "the parameter has no value of its own")
                .help(format!("give it after the `;`: `{name} = …`")),
            E::BlockUsesItself { chain, span, .. } => {
                base.at(*span, "").help(format!("the blocks open here are: {chain}"))
            }
            E::UseNodeCount { wanted, span, defined, .. } => base
                .at(*span, "")
                .at(*defined, "defined here")
                .help(format!("in this order: {}", wanted.join(" "))),
            E::TurnsCount { windings, turns, span } => base
                .at(*span, format!("{windings} windings, {turns} turns"))
                .help("for example `ideal t : a b | c d, turns 10 : 1`"),
            E::CyclicLet { spans, .. } => {
                let base = spans.iter().fold(base, |base, span| base.at(*span, ""));
                base.help("give one of them a value of its own")
            }
            E::MixedSum { left, right, left_span, right_span, .. } => base
                .at(*right_span, format!("this is {}", unit_words(*right)))
                .at(*left_span, format!("this is {}", unit_words(*left))),
            E::MixedArguments { left, right, left_span, right_span } => base
                .at(*right_span, format!("this is {}", unit_words(*right)))
                .at(*left_span, format!("this is {}", unit_words(*left))),
            E::WrongDimension { found, span, .. } => {
                base.at(*span, format!("this is {}", unit_words(*found)))
            }
            E::NotLinear { span, .. } => base.at(*span, "not linear here").help(
                "sums of readings times values are linear; products of readings, `abs`, `re`, \
                 `conj` and `power` are not",
            ),
            E::NoSuchElement { span, .. } => base.at(*span, "").help(
                "ohms make a resistor, henries a winding, farads a capacitor, volts or amperes a \
                 source, siemens a conductance",
            ),
            E::TangentOfWinding { span } => {
                base.at(*span, "").help("write `q …` or `esr …` instead")
            }
            E::AttributeNotHere { span } => {
                base.at(*span, "").help("put a resistor in series or in parallel in the path")
            }
            E::AttributeTwice { span } => {
                base.at(*span, "").help("keep one: `q`, `esr` and `tand` all state the loss")
            }
            E::MissingPlus { span } => {
                base.at(*span, "").help("mark the positive end: `-(+ …)-` or `-(… +)-`")
            }
            E::MissingArrow { span } => {
                base.at(*span, "").help("point with the current: `-(> …)-` or `-(< …)-`")
            }
            E::MissingDot { span, .. } => {
                base.at(*span, "").help("mark the end with the dot: `-(* …)-` or `-(… *)-`")
            }
            E::TwoMarks { first, second } => base.at(*second, "").at(*first, ""),
            E::WrongMark { kind, span } => base.at(*span, "").help(match kind {
                MarkKind::Dot => "`*` is the dot of a winding",
                MarkKind::Plus => "`+` is the positive end of a voltage source",
                _ => "`>` and `<` are the directions of a current source",
            }),
            E::NotAWinding { span, defined, .. } => {
                base.at(*span, "").at(*defined, "it is this element")
            }
            E::CoupledTwice { span, first, .. } => {
                base.at(*span, "second time").at(*first, "first time").help("keep one of the two")
            }
            E::ReadingOfPair { span, .. } => base
                .at(*span, "")
                .help("`leakage` and `aiding …, opposing …` hold for a pair; state each pair"),
            E::OverrideDimension { span, .. }
            | E::IncludeCycle { span, .. }
            | E::IncludesTooDeep { span, .. }
            | E::Unreadable { span, .. }
            | E::FileOnly { span, .. }
            | E::BlocksTooDeep { span, .. }
            | E::TooMany { span, .. }
            | E::ArgumentCount { span, .. }
            | E::DimensionTooLarge { span }
            | E::ExponentUnknown { span, .. }
            | E::UnitTwice { span, .. }
            | E::ReadingNotAllowed { span }
            | E::DependentValue { span, .. }
            | E::TooManyTerms { span, .. }
            | E::CoupledToItself { span, .. }
            | E::LeakageElsewhere { span, .. }
            | E::BadData { span, .. } => base.at(*span, ""),
        }
    }
}
