//! Every circuit under `circuits/bad` is refused, with the words kept beside it.
//!
//! A first line `# solve at 50 Hz` says that the fault shows only when the circuit is solved.
//! After a change of wording: `UPDATE_EXPECT=1 cargo test --test it bad`, and read the difference.

use bifilar::circuit::island::{Islands, Regime};
use bifilar::circuit::program::{Call, Program};
use bifilar::diag::{Diagnostic, Severity};
use bifilar::study::{self, StudyError};
use std::path::{Path, PathBuf};

const FOLDER: &str = "circuits/bad";

fn top() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

fn bad_circuits() -> Vec<PathBuf> {
    let mut found: Vec<_> = std::fs::read_dir(top().join(FOLDER))
        .expect("the folder can be listed")
        .map(|entry| entry.expect("an entry can be read").path())
        .filter(|path| path.extension().is_some_and(|e| e == "bfl"))
        .collect();
    found.sort();
    found
}

/// What the program says about a file, errors only, and whether it said so before solving.
fn words(path: &Path) -> Result<String, String> {
    let name = format!("{FOLDER}/{}", path.file_name().expect("a file").to_string_lossy());
    let text = std::fs::read_to_string(path).expect("a bad circuit can be read");
    let at = text.lines().next().and_then(|line| line.strip_prefix("# solve at "));
    let at = at.map(|words| {
        let (value, _) = Program::default().constant("at", words).expect("a frequency");
        value
    });
    let read = |path: &Path| std::fs::read(top().join(path));
    let call = Call::default();
    let (program, mut found) = Program::load(&name, text, Path::new(FOLDER), &call, &read);
    let errors = |list: &[Diagnostic]| list.iter().any(|d| d.severity == Severity::Error);
    if !errors(&found) {
        let (circuit, judged) = program.circuit();
        found = judged;
        if let (Some(circuit), None) = (&circuit, at) {
            let islands = Islands::find(circuit, Regime::Alternating);
            found = study::explain::graph(circuit, &islands, Regime::Alternating);
        }
        if let (Some(circuit), Some(at)) = (circuit, at) {
            found = match study::point::solve(&circuit, at) {
                Ok(_) => return Err(format!("{name} was solved")),
                Err(StudyError::Refused(found) | StudyError::NoSolution(found)) => found,
            };
        }
    }
    if !errors(&found) {
        return Err(format!("{name} was accepted"));
    }
    Ok(found
        .iter()
        .filter(|d| d.severity == Severity::Error)
        .map(|d| d.render(&program.sources, false).trim_end().to_owned() + "\n\n")
        .collect())
}

#[test]
fn every_bad_circuit_is_refused_in_the_words_kept_beside_it() {
    let files = bad_circuits();
    assert!(files.len() >= 30, "only {} bad circuits were found", files.len());
    let mut taken = Vec::new();
    for path in files {
        match words(&path) {
            Ok(words) => expect_test::expect_file![path.with_extension("txt")].assert_eq(&words),
            Err(name) => taken.push(name),
        }
    }
    assert!(taken.is_empty(), "not refused:\n{}", taken.join("\n"));
}
