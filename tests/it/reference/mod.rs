//! Checks against values from outside the project: standards, handbooks, published test data.
//!
//! The circuits stand in `tests/checks/`, sources and tolerances in `docs/checks.md`. Every check
//! prints its worst deviation: `cargo test --test it reference -- --nocapture`.
//!
//! - `weightings`: A and C weighting, record replay, mains networks
//! - `filters`: Butterworth and Chebyshev ladders, attenuator pads
//! - `coupled`: two coupled windings, resonators, links, k towards 1
//! - `transformers`: three and four windings, open- and short-circuit tests
//! - `feeders`: overhead line matrices, the four-node feeder
//! - `theorems`: two-port conversions, power, reciprocity, worked examples
//! - `trade`: bridges, nulls, three-phase and telephone circuits

use crate::support::{Solved, file, solve_with};
use num_complex::Complex64;

mod coupled;
mod feeders;
mod filters;
mod theorems;
mod trade;
mod transformers;
mod weightings;

/// The text of a check circuit.
#[track_caller]
fn circuit(name: &str) -> String {
    file(&format!("tests/checks/{name}.bfl"))
}

/// The text of a check circuit with the test gear of one measurement added to it.
#[track_caller]
fn with_gear(name: &str, gear: &str) -> String {
    format!("{}\n{gear}\n", circuit(name))
}

/// Solves a check circuit with values set, each written as the language writes it.
#[track_caller]
fn solve_set(name: &str, frequency_hz: f64, set: &[(&str, String)]) -> Solved {
    let set: Vec<(&str, &str)> = set.iter().map(|(n, v)| (*n, v.as_str())).collect();
    solve_with(&circuit(name), frequency_hz, &set)
}

/// A complex number from its parts.
fn c(re: f64, im: f64) -> Complex64 {
    Complex64::new(re, im)
}

/// A phasor from its magnitude and its angle in degrees.
fn polar(magnitude: f64, degrees: f64) -> Complex64 {
    Complex64::from_polar(magnitude, degrees.to_radians())
}

/// Magnitude in decibels.
fn db(ratio: Complex64) -> f64 {
    20.0 * ratio.norm().log10()
}

/// Angle in degrees.
fn degrees(phasor: Complex64) -> f64 {
    phasor.arg().to_degrees()
}

/// Angular frequency in radians per second.
fn omega(frequency_hz: f64) -> f64 {
    std::f64::consts::TAU * frequency_hz
}

/// Deviations of one check from its published values: collects them all, prints the worst, fails
/// where that is more than allowed.
#[must_use = "a check judges only when finished"]
struct Check {
    name: &'static str,
    unit: &'static str,
    allowed: f64,
    worst: f64,
    worst_at: String,
    compared: usize,
}

impl Check {
    /// A check whose deviations are in `unit` (`""` for relative ones).
    fn new(name: &'static str, unit: &'static str, allowed: f64) -> Self {
        Check { name, unit, allowed, worst: 0.0, worst_at: String::new(), compared: 0 }
    }

    fn deviation(&mut self, what: &str, deviation: f64, found: String, expected: String) {
        self.compared += 1;
        // A value that is no number must fail, and no comparison with NaN is ever true.
        let deviation = if deviation.is_nan() { f64::INFINITY } else { deviation };
        if deviation > self.worst || self.compared == 1 {
            self.worst = deviation;
            self.worst_at = format!("{what}: found {found}, expected {expected}");
        }
    }

    /// Difference of two real values, in the unit of the check.
    fn real(&mut self, what: &str, found: f64, expected: f64) {
        self.deviation(what, (found - expected).abs(), found.to_string(), expected.to_string());
    }

    /// Difference of two angles in degrees, a full turn being none.
    fn angle(&mut self, what: &str, found: f64, expected: f64) {
        let turns = (found - expected) / 360.0;
        let difference = (turns - turns.round()).abs() * 360.0;
        self.deviation(what, difference, found.to_string(), expected.to_string());
    }

    /// Distance of two phasors, in the unit of the check.
    fn phasor(&mut self, what: &str, found: Complex64, expected: Complex64) {
        self.deviation(what, (found - expected).norm(), found.to_string(), expected.to_string());
    }

    /// Distance of two phasors as a share of the expected one.
    fn relative(&mut self, what: &str, found: Complex64, expected: Complex64) {
        let share = (found - expected).norm() / expected.norm();
        self.deviation(what, share, found.to_string(), expected.to_string());
    }

    /// Difference of two real values as a share of the expected one.
    fn share(&mut self, what: &str, found: f64, expected: f64) {
        let share = (found - expected).abs() / expected.abs();
        self.deviation(what, share, found.to_string(), expected.to_string());
    }

    /// Prints the worst deviation and judges it.
    #[track_caller]
    fn finish(self) {
        let Check { name, unit, allowed, worst, worst_at, compared } = self;
        assert!(compared > 0, "{name}: nothing was compared");
        let gap = if unit.is_empty() { "" } else { " " };
        println!(
            "{name}: worst {worst:.2e}{gap}{unit} of {allowed:e}{gap}{unit} allowed, {compared} values"
        );
        assert!(worst <= allowed, "{name}: off by {worst:e}{gap}{unit} at {worst_at}");
    }
}

#[test]
fn every_check_circuit_names_its_source_and_stands_in_the_list() {
    let list = file("docs/checks.md");
    let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/checks");
    let mut seen = 0;
    for entry in std::fs::read_dir(folder).expect("the folder of checks") {
        let name = entry.expect("a readable entry").file_name();
        let name = name.to_str().expect("a plain name").strip_suffix(".bfl").expect("a circuit");
        assert!(circuit(name).contains("\n# Source: "), "{name} names no source");
        assert!(list.contains(&format!("`{name}`")), "{name} is missing in docs/checks.md");
        seen += 1;
    }
    assert!(seen > 0, "no check circuits found");
}
