//! Solve a circuit text and read values by name.

use bifilar::circuit::Circuit;
use bifilar::circuit::program::{Call, Program};
use bifilar::diag::{Diagnostic, Severity};
use bifilar::study::{self, Solution, StudyError};
use num_complex::Complex64;
use std::path::Path;

/// A solved circuit.
pub struct Solved {
    pub solution: Solution,
}

impl Solved {
    /// Node voltage against its reference, in volts.
    #[track_caller]
    pub fn volts(&self, node: &str) -> Complex64 {
        let found = self.solution.nodes.iter().find(|n| n.name == node);
        found.unwrap_or_else(|| panic!("no node {node}")).voltage.value
    }

    #[track_caller]
    fn element(&self, name: &str) -> &study::ElementResult {
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
    match try_solve(text, frequency_hz, set) {
        Ok(solution) => Solved { solution },
        Err(words) => panic!("{words}\n{text}"),
    }
}

/// Solves, or gives the rendered diagnostics.
pub fn try_solve(text: &str, frequency_hz: f64, set: &[(&str, &str)]) -> Result<Solution, String> {
    let (circuit, program) = circuit(text, Path::new("."), set)?;
    study::point::solve(&circuit, frequency_hz).map_err(|error| match error {
        StudyError::Refused(found) | StudyError::NoSolution(found) => render(&program, &found),
    })
}

/// Reads and judges a circuit text; files it names are looked for in `folder`, relative to the
/// top of the project.
pub fn circuit(
    text: &str,
    folder: &Path,
    set: &[(&str, &str)],
) -> Result<(Circuit, Program), String> {
    let set = set.iter().map(|(n, v)| ((*n).to_owned(), (*v).to_owned())).collect();
    let call = Call { set, reads: Vec::new() };
    let read = |path: &Path| std::fs::read(Path::new(env!("CARGO_MANIFEST_DIR")).join(path));
    let (program, found) = Program::load("circuit.bfl", text.to_owned(), folder, &call, &read);
    if found.iter().any(|d| d.severity == Severity::Error) {
        return Err(render(&program, &found));
    }
    match program.circuit() {
        (Some(circuit), _) => Ok((circuit, program)),
        (None, found) => Err(render(&program, &found)),
    }
}

fn render(program: &Program, found: &[Diagnostic]) -> String {
    found.iter().map(|d| d.render(&program.sources, false)).collect()
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
