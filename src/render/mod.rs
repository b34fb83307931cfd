//! Results to text: one renderer a file behind [`Render`]. Nothing here solves or prints.

pub mod check;
pub mod columns;
pub mod compare;
pub mod csv;
pub mod json;
pub mod number;
pub mod sweep_table;
pub mod table;

use crate::quantity::Dimension;
use crate::study::{Solution, SweepHead, SweepRow, Value};

/// How complex values are shown.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Form {
    /// Magnitude and angle in degrees.
    #[default]
    Polar,
    /// Real and imaginary part.
    Rect,
    /// Level in decibels against one unit, and angle in degrees.
    Decibel,
}

/// What a text is made for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Format {
    /// People at a terminal.
    Table,
    /// Spreadsheets and pipes.
    Csv,
    /// Programs.
    Json,
}

/// Choices that hold for every number of a text.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Style {
    /// How complex values are shown.
    pub form: Form,
    /// Volts and amperes as amplitudes instead of rms values.
    pub peak: bool,
    /// Most significant digits in tables.
    pub digits: usize,
    /// Show the bound on the error of each voltage and reading.
    pub bounds: bool,
}

impl Style {
    /// A result as it is shown: with `peak`, volts and amperes of an alternating quantity are
    /// multiplied by √2. Powers and ratios stay, and so does anything at 0 Hz.
    pub fn shown(&self, value: Value, dimension: Dimension, frequency_hz: f64) -> Value {
        let amplitude = dimension == Dimension::VOLTAGE || dimension == Dimension::CURRENT;
        if !self.peak || !amplitude || frequency_hz == 0.0 {
            return value;
        }
        let root = std::f64::consts::SQRT_2;
        let scaled = value.value * root;
        // √2 itself and the product are each rounded once.
        let error = value.error * root + 2.0 * f64::EPSILON * scaled.norm();
        Value { value: scaled, error }
    }

    /// The word for the kind of amplitudes shown.
    pub fn amplitude(&self) -> &'static str {
        if self.peak { "peak" } else { "rms" }
    }
}

/// A solved circuit with the names it is shown under.
#[derive(Clone, Copy, Debug)]
pub struct SolvedPage<'a> {
    /// The file name, without folders.
    pub circuit: &'a str,
    /// The title the circuit gives itself.
    pub title: Option<&'a str>,
    /// The results.
    pub solution: &'a Solution,
}

/// Turns results into text, appended to `out`.
pub trait Render {
    /// One solved frequency.
    fn solution(&mut self, page: &SolvedPage<'_>, out: &mut Vec<u8>);
    /// What comes before the rows of a sweep. Called once, before any row.
    fn sweep_head(&mut self, head: &SweepHead, out: &mut Vec<u8>);
    /// One row of a sweep.
    fn sweep_row(&mut self, row: &SweepRow, out: &mut Vec<u8>);
    /// What a check found.
    fn check(&mut self, page: &check::CheckPage<'_>, out: &mut Vec<u8>);
    /// Two circuits compared.
    fn comparison(&mut self, page: &compare::ComparePage<'_>, out: &mut Vec<u8>);
}

/// The renderer for a format.
pub fn renderer(format: Format, style: Style) -> Box<dyn Render> {
    match format {
        Format::Table => Box::new(table::Table::new(style)),
        Format::Csv => Box::new(csv::Csv::new(style)),
        Format::Json => Box::new(json::Json::new(style)),
    }
}

/// The unit of a result. A complex power is in volt-amperes, a real one in watts.
pub fn unit_of(dimension: Dimension, real: bool) -> String {
    if dimension == Dimension::POWER && !real { "VA".to_owned() } else { dimension.to_string() }
}

/// A unit in ASCII, for column names.
pub fn ascii_unit(unit: &str) -> String {
    unit.replace(['Ω', '\u{2126}'], "ohm").replace(['µ', 'μ'], "u").replace('°', "deg")
}

#[cfg(test)]
pub mod samples {
    //! Hand-made results for the renderers' snapshots.

    use crate::quantity::Dimension;
    use crate::study::{
        Balance, ElementResult, NodeResult, ReadingResult, Solution, SweepHead, SweepRow, Value,
    };
    use num_complex::Complex64;

    /// A value with an error bound.
    pub fn value(re: f64, im: f64, error: f64) -> Value {
        Value { value: Complex64::new(re, im), error }
    }

    fn node(name: &str, reference: &str, voltage: Value) -> NodeResult {
        NodeResult { name: name.into(), reference: reference.into(), voltage }
    }

    fn element(
        (name, kind): (&str, &'static str),
        (left, right): (&str, &str),
        drop: Option<Value>,
        current: Value,
        power: Value,
    ) -> ElementResult {
        ElementResult {
            name: name.into(),
            kind,
            left: left.into(),
            right: right.into(),
            drop,
            current,
            power,
        }
    }

    /// A small link with two islands.
    pub fn solution() -> Solution {
        let source = element(
            ("drive", "voltage source"),
            ("gnd", "in"),
            Some(value(-48.0, 0.0, 0.0)),
            value(1.25, -0.375, 2e-15),
            value(-60.0, -18.0, 1e-13),
        );
        let load = element(
            ("load", "resistor"),
            ("bus", "keel"),
            Some(value(24.0, -9.0, 1e-13)),
            value(2.0, -0.75, 1e-14),
            value(54.75, 0.0, 4e-13),
        );
        let open = element(
            ("shield", "capacitor"),
            ("bus", "gnd"),
            None,
            value(0.0, 0.0, 0.0),
            value(0.0, 0.0, 0.0),
        );
        Solution {
            frequency_hz: 85e3,
            nodes: vec![
                node("in", "gnd", value(48.0, 0.0, 1e-14)),
                node("a", "gnd", value(3.5, -312.0, 4e-2)),
                node("bus", "keel", value(24.0, -9.0, 1e-13)),
            ],
            elements: vec![source, load, open],
            readings: vec![
                ReadingResult {
                    name: "bus_voltage".into(),
                    dimension: Dimension::VOLTAGE,
                    real: false,
                    value: value(24.0, -9.0, 1e-13),
                    missed: vec![],
                },
                ReadingResult {
                    name: "efficiency".into(),
                    dimension: Dimension::NONE,
                    real: true,
                    value: value(0.9125, 0.0, 1e-14),
                    missed: vec!["least 0.95".into()],
                },
            ],
            balance: Balance {
                delivered: Complex64::new(60.0, 18.0),
                absorbed: Complex64::new(60.0, 18.0),
                mismatch: 1.5e-16,
            },
            magnetic_energy_j: 1.234e-3,
            electric_energy_j: 0.9e-3,
            highest_drop: Some(1),
            notes: vec!["one note".into()],
        }
    }

    /// What two readings over one parameter look like.
    pub fn sweep() -> (SweepHead, Vec<SweepRow>) {
        let head = SweepHead {
            varied: vec![("L_dock".into(), Dimension::INDUCTANCE)],
            readings: vec![
                ("out".into(), Dimension::VOLTAGE, false),
                ("max(a, b)".into(), Dimension::RESISTANCE, false),
                ("efficiency".into(), Dimension::NONE, true),
            ],
            rows: 2,
        };
        let row = |frequency_hz, out| SweepRow {
            varied: vec![240e-6],
            frequency_hz,
            values: vec![out, value(0.0, -50.0, 1e-12), value(0.5, 0.0, 0.0)],
            missed: vec![false, false, frequency_hz > 1e4],
            highest_volts: 50.0,
        };
        let rows = vec![row(1e4, value(3.0, 4.0, 1e-15)), row(12345.5, value(-1e-3, 0.0, 1e-7))];
        (head, rows)
    }
}
