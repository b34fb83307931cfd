//! Sweeps in lanes: against the exact solution of drawn circuits, against frequencies solved one by
//! one, and whatever the number of threads.

use crate::exact::draw;
use crate::support;
use bifilar::circuit::program::{Call, Program};
use bifilar::study::sweep::{self, Event, Plan, Tally};
use bifilar::study::{StudyError, SweepRow, point};
use std::ops::ControlFlow;
use std::path::Path;

const CIRCUITS: u64 = 150;

/// Frequencies swept: enough for lanes, with a batch that is not full.
const POINTS: usize = 11;

struct Swept {
    rows: Vec<SweepRow>,
    tally: Option<Tally>,
    unsolved: usize,
}

fn program(text: &str, reads: Vec<String>) -> Program {
    let call = Call { set: Vec::new(), reads };
    let read = |path: &Path| std::fs::read(Path::new(env!("CARGO_MANIFEST_DIR")).join(path));
    let (program, found) =
        Program::load("x.bfl", text.to_owned(), Path::new("circuits"), &call, &read);
    assert!(found.is_empty(), "{text}\n{found:?}");
    program
}

fn sweep(mut program: Program, frequencies_hz: &[f64]) -> Result<Swept, StudyError> {
    let plan = Plan { frequencies_hz: frequencies_hz.to_vec(), vary: Vec::new() };
    let mut swept = Swept { rows: Vec::new(), tally: None, unsolved: 0 };
    sweep::run(&mut program, &plan, &mut |event| {
        match event {
            Event::Row(row) => swept.rows.push(row.clone()),
            Event::Tally(tally) => swept.tally = Some(*tally),
            Event::Unsolved { .. } => swept.unsolved += 1,
            _ => {}
        }
        ControlFlow::Continue(())
    })?;
    Ok(swept)
}

/// Frequencies around one, which is the fourth of them.
fn around(frequency_hz: f64) -> Vec<f64> {
    (0..POINTS).map(|i| frequency_hz * (0.7 + 0.1 * i as f64)).map(f64::round).collect()
}

#[test]
fn sweeps_in_lanes_agree_with_the_exact_solution_within_their_bounds() {
    let mut in_lanes = 0;
    for seed in 0..CIRCUITS {
        let drawn = draw(seed);
        let exact = drawn.solve();
        let nodes: Vec<&String> = exact.volts.keys().collect();
        let reads = nodes.iter().enumerate().map(|(i, n)| format!("v{i} = volts({n})")).collect();
        let frequencies = around(drawn.frequency_hz);
        let at = frequencies.iter().position(|f| *f == drawn.frequency_hz);
        let at = at.expect("the drawn frequency is one of them");
        let swept = match sweep(program(&drawn.text, reads), &frequencies) {
            Ok(swept) => swept,
            Err(error) => panic!("seed {seed}: {error:?}\n{}", drawn.text),
        };
        let tally = swept.tally.expect("a sweep of this length is solved in lanes");
        in_lanes += tally.in_lanes;
        // Readings of the text itself come first.
        let own = swept.rows[at].values.len() - nodes.len();
        for (value, node) in swept.rows[at].values[own..].iter().zip(&nodes) {
            let exact = &exact.volts[*node];
            let last_digits = f64::EPSILON * value.value.re.abs().max(value.value.im.abs());
            let off = exact.distance(value.value);
            assert!(
                off <= value.error + last_digits,
                "seed {seed}, {node}: {} within {:e}, off by {off:e}\n{}",
                value.value,
                value.error,
                drawn.text
            );
            let size = value.value.norm();
            assert!(value.error <= 1e-9 * size + 1e-15, "seed {seed}, {node}: {value:?}");
        }
    }
    assert!(in_lanes > CIRCUITS as usize * POINTS / 2, "only {in_lanes} were solved in lanes");
}

#[test]
fn a_sweep_in_lanes_shows_what_each_frequency_alone_shows() {
    for (file, from_hz, to_hz) in [
        ("circuits/hull_charger.bfl", 60e3, 120e3),
        ("circuits/sea_cable.bfl", 40.0, 400.0),
        ("circuits/lamp_ballast.bfl", 40.0, 2000.0),
        ("circuits/coil_array.bfl", 1e3, 1e6),
    ] {
        let text = support::file(file);
        let step = (to_hz - from_hz) / 20.0;
        let frequencies: Vec<f64> = (0..=20).map(|i| from_hz + step * f64::from(i)).collect();
        let (circuit, _) = support::circuit(&text, Path::new("circuits"), &[]).expect("read");
        let swept = sweep(program(&text, Vec::new()), &frequencies).expect("swept");
        for row in &swept.rows {
            let alone = point::solve(&circuit, row.frequency_hz).expect("solved");
            for (value, reading) in row.values.iter().zip(&alone.readings) {
                let apart = (value.value - reading.value.value).norm();
                let allowed = value.error + reading.value.error;
                assert!(apart <= allowed, "{file} {}: {value:?} {reading:?}", reading.name);
            }
        }
    }
}

#[test]
fn the_number_of_threads_changes_no_bit() {
    let text = support::file("circuits/inverter_filter.bfl");
    let frequencies: Vec<f64> = (1..=1500).map(|i| 1e3 * f64::from(i)).collect();
    let with = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().expect("a pool");
        let swept = pool.install(|| sweep(program(&text, Vec::new()), &frequencies));
        swept.expect("swept").rows
    };
    let (one, three) = (with(1), with(3));
    assert_eq!(one.len(), 1500);
    for (a, b) in one.iter().zip(&three) {
        let bits = |row: &SweepRow| -> Vec<[u64; 3]> {
            let parts = row.values.iter().map(|v| [v.value.re, v.value.im, v.error]);
            parts.map(|parts| parts.map(f64::to_bits)).collect()
        };
        assert_eq!(bits(a), bits(b), "at {} Hz", a.frequency_hz);
    }
}

#[test]
fn a_resonance_without_loss_spoils_only_its_own_row() {
    let text = "let f0 = 1 kHz\ngnd -(> drive: 1 mA )- in -( coil: 10 mH )\
                ( tune: 1/((2*pi*f0)^2 * 10 mH) )- gnd\nread v = volts(in)\n";
    let frequencies: Vec<f64> = (0..16).map(|i| 925.0 + 25.0 * f64::from(i)).collect();
    let swept = sweep(program(text, Vec::new()), &frequencies).expect("swept");
    assert_eq!(swept.unsolved, 1);
    for row in &swept.rows {
        let value = row.values[0].value.norm();
        assert_eq!(value.is_finite(), row.frequency_hz != 1000.0, "at {} Hz", row.frequency_hz);
    }
}
