//! Every circuit of the scenario, and every circuit in the docs, is read, solved and swept.

use crate::support;
use bifilar::study::sweep::{self, Event, Plan};
use std::ops::ControlFlow;
use std::path::{Path, PathBuf};

/// Where each circuit works, in hertz; a circuit without an entry fails the test.
const AT_HZ: &[(&str, f64)] = &[
    ("battery_sense", 100.0),
    ("coil_array", 125e3),
    ("fog_signal", 660.0),
    ("hull_charger", 85e3),
    ("inverter_choke", 150e3),
    ("inverter_filter", 150e3),
    ("inverter_gate", 100e3),
    ("isolating_supply", 50.0),
    ("lamp_ballast", 50.0),
    ("metering_ct", 50.0),
    ("radio_input", 1.85e6),
    ("radio_matching", 1.85e6),
    ("sea_cable", 50.0),
    ("tuning_bank", 492e3),
];

fn files(folder: &str) -> Vec<PathBuf> {
    let mut found: Vec<_> = std::fs::read_dir(Path::new(env!("CARGO_MANIFEST_DIR")).join(folder))
        .expect("the folder can be listed")
        .map(|entry| entry.expect("an entry can be read").path())
        .filter(|path| path.extension().is_some_and(|e| e == "bfl"))
        .collect();
    found.sort();
    found
}

#[test]
fn every_circuit_of_the_scenario_balances_and_meets_its_limits() {
    let found = files("circuits");
    assert!(found.len() >= 8);
    for path in found {
        let name = path.file_stem().expect("a name").to_string_lossy().into_owned();
        let at = AT_HZ.iter().find(|(n, _)| *n == name);
        let (_, at) = at.unwrap_or_else(|| panic!("where does `{name}` work?"));
        let text = std::fs::read_to_string(&path).expect("a circuit can be read");
        let (circuit, mut program) =
            support::circuit(&text, Path::new("circuits"), &[]).unwrap_or_else(|e| panic!("{e}"));
        let solution =
            bifilar::study::point::solve(&circuit, *at).unwrap_or_else(|e| panic!("{name}: {e:?}"));
        assert!(solution.balance.mismatch < 1e-12, "{name}: {:?}", solution.balance);
        for reading in &solution.readings {
            assert!(reading.missed.is_empty(), "{name}: {} {:?}", reading.name, reading.missed);
            let size = reading.value.value.norm();
            assert!(size.is_finite(), "{name}: {} has no value", reading.name);
            assert!(reading.value.error <= 1e-9 * size, "{name}: {}", reading.name);
        }
        let plan = Plan {
            frequencies_hz: (0..25).map(|i| at * (0.9 + 0.05 * f64::from(i))).collect(),
            vary: Vec::new(),
        };
        let mut rows = 0;
        let swept = sweep::run(&mut program, &plan, &mut |event| {
            rows += usize::from(matches!(event, Event::Row(_)));
            ControlFlow::Continue(())
        });
        assert!(swept.is_ok(), "{name}: {swept:?}");
        assert_eq!(rows, 25, "{name}");
    }
}

/// The fenced blocks of a page that start with a given tag.
fn blocks(page: &str, tag: &str) -> Vec<String> {
    let fence = format!("```{tag}\n");
    page.split(&fence)
        .skip(1)
        .map(|rest| rest.split("```").next().unwrap_or("").to_owned())
        .collect()
}

#[test]
fn every_circuit_in_the_docs_is_accepted_and_every_wrong_one_refused() {
    let mut good = 0;
    for page in ["docs/language.md", "README.md"] {
        let text = support::file(page);
        for block in blocks(&text, "bfl") {
            good += 1;
            let read = support::circuit(&block, Path::new("circuits"), &[]);
            assert!(read.is_ok(), "{page}:\n{block}\n{}", read.err().unwrap_or_default());
        }
        for block in blocks(&text, "bfl-error") {
            assert!(support::circuit(&block, Path::new("circuits"), &[]).is_err(), "{block}");
        }
    }
    assert!(good >= 10, "only {good} circuits were found in the docs");
}
