//! The twin of a circuit: the same circuit with its couplings replaced by what needs none.
//!
//! One file per equivalent holds its formula, its conditions and its source; `tie` decides whether
//! two islands may be joined, `ratio` and `round` serve the options of the same names. Every value
//! is a formula of the values given, so the twin is exact, also where legs are negative.

mod algebra;
mod build;
mod dependent;
pub mod error;
mod explain;
mod finish;
mod leakage;
mod mesh;
mod pair;
mod pi;
mod ratio;
pub mod round;
mod sets;
mod tee;
mod tie;

use crate::circuit::{Circuit, ElementId, FormulaId, Measure, NodeId};
use crate::diag::did_you_mean;
use algebra::Algebra;
use build::Build;
pub use error::SwapError;
pub use explain::{explain, summary};
pub use ratio::Ratio;
pub use round::Series;
use sets::CoupledSet;
use std::fmt;
use std::str::FromStr;

/// What couplings are replaced by.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// Three legs that meet in a star point.
    Tee,
    /// Three legs in a triangle.
    Pi,
    /// A leg between every two terminals.
    Mesh,
    /// Inductances and ideal transformers, step by step.
    Leakage,
    /// Uncoupled windings with dependent sources.
    Dependent,
}

impl Kind {
    /// All of them.
    pub const ALL: [Kind; 5] = [Kind::Tee, Kind::Pi, Kind::Mesh, Kind::Leakage, Kind::Dependent];

    /// The word on the command line.
    pub fn word(self) -> &'static str {
        match self {
            Kind::Tee => "tee",
            Kind::Pi => "pi",
            Kind::Mesh => "mesh",
            Kind::Leakage => "leakage",
            Kind::Dependent => "dependent",
        }
    }

    /// What a set becomes, for a sentence.
    pub fn in_words(self) -> &'static str {
        match self {
            Kind::Tee => "a tee",
            Kind::Pi => "a pi",
            Kind::Mesh => "a mesh",
            Kind::Leakage => "inductances and ideal transformers",
            Kind::Dependent => "uncoupled windings with dependent sources",
        }
    }
}

impl fmt::Display for Kind {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        out.write_str(self.word())
    }
}

impl FromStr for Kind {
    type Err = String;

    fn from_str(word: &str) -> Result<Self, String> {
        Kind::ALL
            .into_iter()
            .find(|kind| kind.word() == word)
            .ok_or_else(|| String::from("the kinds are tee, pi, mesh, leakage and dependent"))
    }
}

/// What is asked for.
#[derive(Clone, Debug, PartialEq)]
pub struct Options {
    /// What couplings are replaced by.
    pub into: Kind,
    /// Two or more windings of the only set to be replaced; empty: every set.
    pub only: Vec<String>,
    /// The two nodes to be joined where islands are.
    pub tie: Option<(String, String)>,
    /// Never join islands; take an ideal transformer.
    pub keep_isolation: bool,
    /// Put an ideal transformer of this ratio before the second winding.
    pub ratio: Option<Ratio>,
    /// Round legs to preferred values.
    pub round: Option<Series>,
    /// Legs to leave out: a leg in the way of the current becomes a wire, one beside it is open.
    pub drop: Vec<String>,
}

impl Options {
    /// Every set into one kind, exactly.
    pub fn new(into: Kind) -> Self {
        Options {
            into,
            only: Vec::new(),
            tie: None,
            keep_isolation: false,
            ratio: None,
            round: None,
            drop: Vec::new(),
        }
    }
}

/// What allowed the replacement of a set.
#[derive(Clone, Debug, PartialEq)]
pub enum Condition {
    /// The equivalent holds wherever the windings are.
    Always,
    /// The windings meet at this node.
    Shared(String),
    /// These nodes were joined; no current flows through a single tie.
    Tied(Vec<(String, String)>),
    /// An ideal transformer was put in.
    Transformer(Reason),
}

/// Why an ideal transformer was put in.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Reason {
    /// A tie would have closed a loop.
    Loop,
    /// Isolation was to be kept.
    KeepIsolation,
    /// A ratio was asked for.
    Ratio,
}

/// Whether a part could be bought.
#[derive(Clone, Debug, PartialEq)]
pub enum Purchase {
    /// Yes: the nearest E24 value, and how far it is off, as a fraction.
    Yes {
        /// In henries or ohms.
        nearest: f64,
        /// (nearest − value)/value
        off: f64,
    },
    /// Negative: only calculation has such a part.
    Negative,
    /// Smaller or larger than what is made.
    OutOfRange,
    /// The value depends on the frequency.
    Varies,
    /// Ideal: only calculation has such a part.
    Ideal,
    /// There is no part: a wire, or nothing at all.
    NoPart,
}

/// What became of a leg.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Fate {
    /// An element of the twin.
    Element,
    /// Zero: a wire.
    Wire,
    /// Infinite: left out.
    Open,
    /// Left out as asked: a wire.
    DroppedWire,
    /// Left out as asked: open.
    DroppedOpen,
}

/// One part of an equivalent.
#[derive(Clone, Debug, PartialEq)]
pub struct Leg {
    /// Its name in the text of the twin.
    pub name: String,
    /// `H`, `Ω`, or nothing for turns and sources.
    pub unit: &'static str,
    /// Its formula in named values.
    pub formula: String,
    /// Its value, where it is the same at every frequency and real.
    pub value: Option<f64>,
    /// What became of it.
    pub fate: Fate,
    /// Whether it could be bought.
    pub purchase: Purchase,
    /// The value before rounding.
    pub rounded_from: Option<f64>,
}

/// What happened to one set.
#[derive(Clone, Debug, PartialEq)]
pub struct Swapped {
    /// The windings, in the order written.
    pub windings: Vec<String>,
    /// What replaced them.
    pub kind: Kind,
    /// Row-major inductance matrix in henries, for currents into the dots; nothing where a value
    /// depends on the frequency.
    pub inductance: Vec<Option<f64>>,
    /// Row-major coupling factors.
    pub k: Vec<Option<f64>>,
    /// Inductance seen at each winding with all the others shorted, in henries.
    pub leakage: Vec<Option<f64>>,
    /// What allowed it.
    pub condition: Condition,
    /// True where windings on different islands are joined in the twin.
    pub isolation_lost: bool,
    /// Its parts.
    pub legs: Vec<Leg>,
}

/// How a replaced winding reads in the twin.
#[derive(Clone, Debug, PartialEq)]
pub struct Reading {
    /// The winding in the original circuit.
    pub winding: ElementId,
    /// Its name there.
    pub name: String,
    /// Left minus right.
    pub drop: Measure,
    /// From left to right: the sum of these, true for those that are subtracted.
    pub amps: Vec<(bool, ElementId)>,
    /// The drop as a formula of the twin, in volts.
    pub drop_formula: FormulaId,
    /// The current as a formula of the twin, in amperes.
    pub amps_formula: FormulaId,
    /// The complex power absorbed as a formula of the twin.
    pub power_formula: FormulaId,
}

/// A circuit without the couplings that were replaced.
#[derive(Clone, Debug, PartialEq)]
pub struct Twin {
    /// The twin.
    pub circuit: Circuit,
    /// What was done to each set.
    pub records: Vec<Swapped>,
    /// How each replaced winding reads in the twin.
    pub readings: Vec<Reading>,
    /// Where each element of the original stands in the twin; nothing for replaced windings.
    pub element_of: Vec<Option<ElementId>>,
    /// Which node of the twin each node of the original is.
    pub node_of: Vec<NodeId>,
    /// The node of the twin that is the reference of each original node: islands that were joined
    /// have one reference only.
    pub reference_of: Vec<NodeId>,
    /// What the reader must know.
    pub warnings: Vec<String>,
}

/// Replaces the couplings of a circuit that the judge found no error in.
pub fn twin(circuit: &Circuit, options: &Options) -> Result<Twin, SwapError> {
    check_options(options)?;
    let algebra = Algebra::new(circuit.tape.clone());
    let all = sets::find(circuit, &algebra);
    let chosen = choose(circuit, all, &options.only)?;
    let mut build = Build::new(circuit, algebra, options)?;
    for mut set in chosen {
        build.begin(&mut set);
        let condition = match options.into {
            Kind::Tee => tee::build(&mut build, &set)?,
            Kind::Pi => pi::build(&mut build, &set)?,
            Kind::Mesh => mesh::build(&mut build, &set)?,
            Kind::Leakage => leakage::build(&mut build, &set)?,
            Kind::Dependent => dependent::build(&mut build, &set)?,
        };
        build.end(&set, condition)?;
    }
    finish::finish(build)
}

fn check_options(options: &Options) -> Result<(), SwapError> {
    let kind = options.into;
    let pair = matches!(kind, Kind::Tee | Kind::Pi);
    if options.ratio.is_some() && !pair {
        return Err(SwapError::RatioNotHere { kind });
    }
    if options.ratio.is_some_and(Ratio::is_zero) {
        return Err(SwapError::RatioZero);
    }
    if options.tie.is_some() && matches!(kind, Kind::Leakage | Kind::Dependent) {
        return Err(SwapError::TieNotHere { kind });
    }
    if options.keep_isolation && kind == Kind::Mesh {
        return Err(SwapError::MeshKeepsNoIsolation);
    }
    Ok(())
}

/// The sets asked for.
fn choose(
    circuit: &Circuit,
    all: Vec<CoupledSet>,
    only: &[String],
) -> Result<Vec<CoupledSet>, SwapError> {
    if all.is_empty() {
        return Err(SwapError::NothingCoupled);
    }
    let Some(first) = only.first() else { return Ok(all) };
    if only.len() == 1 {
        return Err(SwapError::OnlyOne);
    }
    let mut chosen: Option<usize> = None;
    for name in only {
        let found = circuit.each_element().find(|(_, e)| same_name(&e.name, name));
        let Some((id, element)) = found else {
            let known = circuit.elements.iter().map(|e| e.name.as_str());
            let near = did_you_mean(name, known).map(str::to_owned);
            return Err(SwapError::UnknownWinding { name: name.clone(), near });
        };
        let place = all.iter().position(|set| set.windings.iter().any(|w| w.id == id));
        match (place, chosen) {
            (None, _) => {
                return Err(SwapError::NotCoupled { name: name.clone(), span: element.span });
            }
            (Some(here), Some(before)) if here != before => {
                let (first, second) = (first.clone(), name.clone());
                return Err(SwapError::DifferentSets { first, second, span: element.span });
            }
            _ => chosen = place,
        }
    }
    Ok(all.into_iter().enumerate().filter(|(i, _)| Some(*i) == chosen).map(|(_, s)| s).collect())
}

/// People may write the name as in the circuit (`cm1.La`) or as in the twin's text (`cm1_La`).
fn same_name(name: &str, asked: &str) -> bool {
    name == asked || name.replace('.', "_") == asked.replace('.', "_")
}
