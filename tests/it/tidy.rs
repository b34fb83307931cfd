//! Rules of the house that a program can check: who may import whom, and how long a file may be.

use std::fs;
use std::path::{Path, PathBuf};

/// Each room with the rooms it may import from. `cli` may import everything.
const MAY_IMPORT: [(&str, &[&str]); 12] = [
    ("source", &[]),
    ("diag", &["source"]),
    ("quantity", &[]),
    ("number", &["quantity"]),
    ("solve", &["number"]),
    ("text", &["source", "diag", "quantity"]),
    ("circuit", &["source", "diag", "quantity", "number", "text"]),
    ("swap", &["source", "diag", "quantity", "number", "circuit"]),
    ("system", &["source", "quantity", "number", "circuit"]),
    (
        "study",
        &["source", "diag", "quantity", "number", "text", "circuit", "swap", "system", "solve"],
    ),
    ("render", &["diag", "source", "quantity", "number", "swap", "study"]),
    (
        "cli",
        &[
            "source", "diag", "quantity", "number", "text", "circuit", "swap", "system", "solve",
            "study", "render",
        ],
    ),
];

/// One idea a file.
const MOST_LINES: usize = 500;

fn sources() -> Vec<PathBuf> {
    let mut waiting = vec![Path::new(env!("CARGO_MANIFEST_DIR")).join("src")];
    let mut found = Vec::new();
    while let Some(folder) = waiting.pop() {
        for entry in fs::read_dir(folder).expect("src can be listed") {
            let path = entry.expect("an entry of src can be read").path();
            if path.is_dir() {
                waiting.push(path);
            } else if path.extension().is_some_and(|e| e == "rs") {
                found.push(path);
            }
        }
    }
    found
}

fn room(path: &Path) -> String {
    let inside = path.strip_prefix(Path::new(env!("CARGO_MANIFEST_DIR")).join("src"));
    let first = inside.expect("a source lies in src").components().next();
    let first = first.expect("a source has a name").as_os_str().to_string_lossy().into_owned();
    first.trim_end_matches(".rs").to_owned()
}

#[test]
fn each_room_imports_only_from_the_rooms_before_it() {
    let mut wrong = Vec::new();
    for path in sources() {
        let room = room(&path);
        if room == "main" || room == "lib" {
            continue;
        }
        let rule = MAY_IMPORT.iter().find(|(name, _)| *name == room);
        let (_, allowed) = rule.unwrap_or_else(|| panic!("no rule for the room `{room}`"));
        let text = fs::read_to_string(&path).expect("a source can be read");
        for (number, line) in text.lines().enumerate() {
            for piece in line.split("crate::").skip(1) {
                let end = piece.find(|c: char| !c.is_alphanumeric() && c != '_');
                let target = &piece[..end.unwrap_or(piece.len())];
                let known = MAY_IMPORT.iter().any(|(name, _)| *name == target);
                if known && target != room && !allowed.contains(&target) {
                    wrong.push(format!("{}:{}: {target}", path.display(), number + 1));
                }
            }
        }
    }
    assert!(wrong.is_empty(), "imports against the order of the house:\n{}", wrong.join("\n"));
}

#[test]
fn only_the_command_line_prints_and_only_one_file_names_the_linear_algebra() {
    let mut wrong = Vec::new();
    for path in sources() {
        let text = fs::read_to_string(&path).expect("a source can be read");
        let room = room(&path);
        let prints = ["println!", "eprintln!", "print!("].iter().any(|p| text.contains(p));
        if prints && room != "cli" && room != "main" {
            wrong.push(format!("{} prints", path.display()));
        }
        let lu = path.ends_with("src/solve/lu.rs");
        if text.contains("faer::") && !lu && room != "solve" {
            wrong.push(format!("{} names faer", path.display()));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn no_source_file_is_longer_than_one_idea() {
    let long: Vec<_> = sources()
        .into_iter()
        .filter_map(|path| {
            let lines = fs::read_to_string(&path).expect("a source can be read").lines().count();
            (lines > MOST_LINES).then(|| format!("{} has {lines} lines", path.display()))
        })
        .collect();
    assert!(long.is_empty(), "split these:\n{}", long.join("\n"));
}
