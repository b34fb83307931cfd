//! Solve a circuit text and read values by name.

use num_complex::Complex64;

/// A solved circuit.
pub struct Solved {
    pub solution: bifilar::study::Solution,
}

impl Solved {
    /// Node voltage against its reference, in volts.
    #[track_caller]
    pub fn volts(&self, node: &str) -> Complex64 {
        let found = self.solution.nodes.iter().find(|n| n.name == node);
        found.unwrap_or_else(|| panic!("no node {node}")).voltage.value
    }

    #[track_caller]
    fn element(&self, name: &str) -> &bifilar::study::ElementResult {
        let found = self.solution.elements.iter().find(|e| e.name == name);
        found.unwrap_or_else(|| panic!("no element {name}"))
    }

    /// Current from left to right, in amperes.
    #[track_caller]
    pub fn amps(&self, element: &str) -> Complex64 {
        self.element(element).current.value
    }

    /// Left minus right, in volts.
    #[track_caller]
    pub fn drop(&self, element: &str) -> Complex64 {
        self.element(element).drop.expect("the drop is determined").value
    }

    /// Absorbed complex power, in volt-amperes.
    #[track_caller]
    pub fn power(&self, element: &str) -> Complex64 {
        self.element(element).power.value
    }

    /// A reading of the circuit.
    #[track_caller]
    pub fn read(&self, name: &str) -> Complex64 {
        let found = self.solution.readings.iter().find(|r| r.name == name);
        found.unwrap_or_else(|| panic!("no reading {name}")).value.value
    }
}

/// Solves a circuit text at one frequency; panics with the rendered diagnostics where it cannot.
#[track_caller]
pub fn solve(text: &str, frequency_hz: f64) -> Solved {
    solve_with(text, frequency_hz, &[])
}

/// As [`solve`], with `--set` overrides: name and value text.
#[track_caller]
pub fn solve_with(text: &str, frequency_hz: f64, set: &[(&str, &str)]) -> Solved {
    let _ = (text, frequency_hz, set);
    todo!("wired to the library once the pipeline stands")
}

/// The text of a file under `circuits/` or `tests/`, by its path from the top of the project.
#[track_caller]
pub fn file(path: &str) -> String {
    let full = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join(path);
    std::fs::read_to_string(&full).unwrap_or_else(|e| panic!("{}: {e}", full.display()))
}

/// Asserts that two phasors agree to a relative tolerance of the larger one.
#[track_caller]
pub fn close(found: Complex64, expected: Complex64, relative: f64) {
    let size = found.norm().max(expected.norm());
    assert!(
        (found - expected).norm() <= relative * size,
        "found {found}, expected {expected}, off by {:e} relative",
        (found - expected).norm() / size
    );
}
