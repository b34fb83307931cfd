//! Studies: a circuit and a question in, plain results out. Nothing here prints.

pub mod adaptive;
pub(crate) mod batch;
pub mod compare;
pub mod engine;
pub mod explain;
pub mod grid;
pub mod pair;
pub mod point;
pub mod prove;
pub mod sweep;

use crate::diag::Diagnostic;
use crate::quantity::Dimension;
use num_complex::Complex64;

/// A complex result with a bound on how far it may be from the exact solution of the circuit.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Value {
    /// The value in SI units; phasors are rms.
    pub value: Complex64,
    /// Bound on |value − exact|, in the same unit.
    pub error: f64,
}

/// The voltage of one node.
#[derive(Clone, Debug, PartialEq)]
pub struct NodeResult {
    /// The node's name.
    pub name: String,
    /// The node its voltage is measured against.
    pub reference: String,
    /// The voltage in volts.
    pub voltage: Value,
}

/// What happens in one element.
#[derive(Clone, Debug, PartialEq)]
pub struct ElementResult {
    /// The element's name.
    pub name: String,
    /// What it is: `resistor`, `winding`, `capacitor`, `voltage source`, …
    pub kind: &'static str,
    /// Left node.
    pub left: String,
    /// Right node.
    pub right: String,
    /// Left minus right, in volts; `None` where it is not determined (an open capacitor between
    /// two islands at f = 0).
    pub drop: Option<Value>,
    /// From left to right through the element, in amperes.
    pub current: Value,
    /// Absorbed complex power, in volt-amperes.
    pub power: Value,
}

/// One reading.
#[derive(Clone, Debug, PartialEq)]
pub struct ReadingResult {
    /// The reading's name, or the expression given on the command line.
    pub name: String,
    /// Its dimension.
    pub dimension: Dimension,
    /// True where the expression can only be real (`re(…)`, `abs(…)`): print no angle.
    pub real: bool,
    /// The value in SI units.
    pub value: Value,
    /// The limits it missed, in words.
    pub missed: Vec<String>,
}

/// Tellegen's theorem on one solution.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Balance {
    /// Complex power all sources deliver, in volt-amperes.
    pub delivered: Complex64,
    /// Complex power everything else absorbs.
    pub absorbed: Complex64,
    /// |delivered − absorbed| over the sum of all magnitudes.
    pub mismatch: f64,
}

/// One solved frequency.
#[derive(Clone, Debug, PartialEq)]
pub struct Solution {
    /// The frequency in hertz.
    pub frequency_hz: f64,
    /// Every node, in the order written.
    pub nodes: Vec<NodeResult>,
    /// Every element, in the order written.
    pub elements: Vec<ElementResult>,
    /// Every reading, in the order written.
    pub readings: Vec<ReadingResult>,
    /// The power balance.
    pub balance: Balance,
    /// Mean energy stored in windings and couplings, in joules.
    pub magnetic_energy_j: f64,
    /// Mean energy stored in capacitors, in joules.
    pub electric_energy_j: f64,
    /// Index of the element with the highest drop.
    pub highest_drop: Option<usize>,
    /// What the reader should know, one line each (cautions, accuracy).
    pub notes: Vec<String>,
}

/// What a sweep delivers for one frequency.
#[derive(Clone, Debug, PartialEq)]
pub struct SweepRow {
    /// Values of the varied parameters, in SI units, in the order asked.
    pub varied: Vec<f64>,
    /// The frequency in hertz.
    pub frequency_hz: f64,
    /// One value a reading, in the order of [`SweepHead::readings`].
    pub values: Vec<Value>,
    /// Which readings missed a limit.
    pub missed: Vec<bool>,
    /// The highest voltage anywhere in the circuit, in volts rms.
    pub highest_volts: f64,
}

/// What is the same for every row of a sweep.
#[derive(Clone, Debug, PartialEq)]
pub struct SweepHead {
    /// Names of the varied parameters with their dimensions.
    pub varied: Vec<(String, Dimension)>,
    /// Name, dimension and realness of every reading.
    pub readings: Vec<(String, Dimension, bool)>,
    /// How many rows will come; 0 where only the sweep itself will tell.
    pub rows: usize,
}

/// Why a study has no result.
#[derive(Clone, Debug, PartialEq)]
pub enum StudyError {
    /// The circuit or the call is wrong.
    Refused(Vec<Diagnostic>),
    /// No solution exists that could be trusted.
    NoSolution(Vec<Diagnostic>),
}
