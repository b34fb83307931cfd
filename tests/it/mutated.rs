//! Nothing that can be typed makes the program panic: circuits with random faults are refused in
//! words or solved.

use bifilar::circuit::program::{Call, Program};
use bifilar::diag::{Diagnostic, Severity};
use bifilar::study::{StudyError, point};
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};

/// Mutants of each circuit.
const MUTANTS: usize = 200;
/// The large circuits are copies of small ones as far as faults go.
const MOST_BYTES: usize = 10_000;

fn circuits() -> Vec<PathBuf> {
    let top = Path::new(env!("CARGO_MANIFEST_DIR"));
    let entries = ["circuits", "circuits/bad"].map(|folder| std::fs::read_dir(top.join(folder)));
    let mut found: Vec<_> = entries
        .into_iter()
        .flat_map(|entries| entries.expect("the folder can be listed"))
        .map(|entry| entry.expect("an entry can be read").path())
        .filter(|path| path.extension().is_some_and(|e| e == "bfl"))
        .collect();
    found.sort();
    found
}

/// Pieces of a text: words, numbers, single signs and blanks.
fn tokens(text: &str) -> Vec<String> {
    let mut found: Vec<String> = Vec::new();
    let class = |c: char| match c {
        c if c.is_alphanumeric() || c == '_' || c == '.' => 0,
        ' ' => 1,
        _ => 2,
    };
    let mut last = 3;
    for letter in text.chars() {
        let now = class(letter);
        match found.last_mut() {
            Some(token) if now == last && now != 2 => token.push(letter),
            _ => found.push(letter.to_string()),
        }
        last = now;
    }
    found
}

/// Pieces that are likely to be taken for something.
const STRANGE: &[&str] = &[
    "0",
    "-",
    "1e308",
    "1e-308",
    "1e999999999",
    "gnd",
    "f",
    "(",
    ")",
    "{",
    "}",
    "∠ 90°",
    "j",
    "*",
    "^",
    "-1",
    "1e30 Ω",
    "\u{0301}",
    "\u{202e}",
    "\"",
    "table(\"x.csv\", f)",
    ": k 1",
    "q 0",
    "amps(load)",
    "\t",
    "\r\n",
    "use",
    "block",
    "include \"hull_charger.bfl\"",
];

/// A text with one to four random faults.
fn mutant(text: &str, random: &mut fastrand::Rng) -> String {
    let mut tokens = tokens(text);
    for _ in 0..random.usize(1..=4) {
        if tokens.is_empty() {
            break;
        }
        let (a, b) = (random.usize(..tokens.len()), random.usize(..tokens.len()));
        match random.u8(..7) {
            0 => drop(tokens.remove(a)),
            1 => tokens.insert(b, tokens[a].clone()),
            2 => tokens.swap(a, b),
            3 => tokens[a] = STRANGE[random.usize(..STRANGE.len())].to_owned(),
            4 => tokens.insert(a, STRANGE[random.usize(..STRANGE.len())].to_owned()),
            5 => tokens.truncate(a.max(1)),
            _ => drop(tokens.drain(a.min(b)..a.max(b).min(a.min(b) + 12))),
        }
    }
    let mut bytes = tokens.concat().into_bytes();
    if random.u8(..3) == 0 && !bytes.is_empty() {
        let at = random.usize(..bytes.len());
        bytes[at] = random.u8(..128);
    }
    String::from_utf8_lossy(&bytes).into_owned()
}

/// Reads, judges and solves; gives the words of a refusal.
fn run(text: &str, folder: &Path) -> Result<(), String> {
    let read = |path: &Path| std::fs::read(Path::new(env!("CARGO_MANIFEST_DIR")).join(path));
    let (program, found) =
        Program::load("mutant.bfl", text.to_owned(), folder, &Call::default(), &read);
    let words = |found: &[Diagnostic]| -> String {
        found.iter().map(|d| d.render(&program.sources, false)).collect()
    };
    if found.iter().any(|d| d.severity == Severity::Error) {
        return Err(words(&found));
    }
    let (circuit, found) = program.circuit();
    let Some(circuit) = circuit else { return Err(words(&found)) };
    let mut refused = None;
    for frequency_hz in [1e3, 0.0] {
        match point::solve(&circuit, frequency_hz) {
            Ok(solution) => assert_eq!(solution.elements.len(), circuit.elements.len()),
            Err(StudyError::Refused(found) | StudyError::NoSolution(found)) => {
                refused = Some(words(&found));
            }
        }
    }
    refused.map_or(Ok(()), Err)
}

#[test]
fn no_random_fault_in_a_circuit_makes_anything_panic() {
    let mut random = fastrand::Rng::with_seed(0xB1F1);
    let (mut solved, mut refused) = (0, 0);
    let mut wrong = Vec::new();
    for path in circuits() {
        let text = std::fs::read_to_string(&path).expect("a circuit can be read");
        if text.len() > MOST_BYTES {
            continue;
        }
        let folder = path.parent().expect("a folder").strip_prefix(env!("CARGO_MANIFEST_DIR"));
        let folder = folder.expect("a folder of the project");
        let scenario = folder == Path::new("circuits");
        for _ in 0..if scenario { MUTANTS } else { MUTANTS / 10 } {
            let text = mutant(&text, &mut random);
            match catch_unwind(AssertUnwindSafe(|| run(&text, folder))) {
                Ok(Ok(())) => solved += 1,
                Ok(Err(words)) if words.contains("error") => refused += 1,
                Ok(Err(words)) => wrong.push(format!("refused without an error: {words}\n{text}")),
                Err(_) => wrong.push(format!("panicked:\n{text}")),
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n\n"));
    // Both ways are walked, or the faults are too coarse or too fine.
    assert!(solved >= 50 && refused >= 100, "{solved} solved, {refused} refused");
}
