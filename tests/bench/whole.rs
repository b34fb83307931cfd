//! How long a large circuit takes from its text to its solution at one frequency.
//!
//! `cargo bench --bench whole` prints one line a circuit: reading and judging, solving, and the
//! peak memory of the process so far.

use bifilar::circuit::program::{Call, Program};
use bifilar::study;
use std::fmt::Write;
use std::path::Path;
use std::time::Instant;

/// A low-pass ladder with one inductor and one capacitor a step.
fn ladder(steps: usize) -> String {
    let mut text = String::from("gnd -( drive: 10 V +)- n0\n");
    for i in 0..steps {
        let next = i + 1;
        let _ = writeln!(text, "n{i} -( l{i}: 1 µH, esr 10 mΩ )- n{next} -( c{i}: 1 nF )- gnd");
    }
    let _ = writeln!(text, "n{steps} -( load: 50 Ω )- gnd\nread out = volts(n{steps})");
    text
}

/// A square of resistors one way and inductors the other, a capacitor at each node.
fn grid(edge: usize) -> String {
    let mut text = String::from("gnd -( drive: 10 V +)- x0_0\n");
    for i in 0..edge {
        for j in 0..edge {
            if j + 1 < edge {
                let _ = writeln!(text, "x{i}_{j} -( r{i}_{j}: 10 Ω )- x{i}_{}", j + 1);
            }
            if i + 1 < edge {
                let _ = writeln!(text, "x{i}_{j} -( l{i}_{j}: 1 µH )- x{}_{j}", i + 1);
            }
            let _ = writeln!(text, "x{i}_{j} -( c{i}_{j}: 100 pF )- gnd");
        }
    }
    let last = edge - 1;
    let _ = writeln!(text, "x{last}_{last} -( load: 50 Ω )- gnd\nread out = volts(x{last}_{last})");
    text
}

/// Windings in series, every pair coupled by a list in a file, a capacitor at each tap.
fn coil(windings: usize) -> (String, String) {
    let mut text = String::from("gnd -( drive: 1 V +)- n0\n");
    let mut pairs = String::from("a,b,M\n");
    for i in 0..windings {
        let next = i + 1;
        let _ = writeln!(text, "n{i} -(* w{i}: 10 µH, esr 10 mΩ )- n{next} -( c{i}: 10 pF )- gnd");
        for j in 0..i {
            let mutual = 9e-6 * 0.95f64.powi((i - j) as i32);
            let _ = writeln!(pairs, "w{i},w{j},{mutual:.6e}");
        }
    }
    let _ = writeln!(text, "n{windings} -( load: 50 Ω )- gnd\ncouple from \"pairs.csv\"");
    let _ = writeln!(text, "read out = volts(n{windings})");
    (text, pairs)
}

/// Peak resident memory of this process in megabytes, where the system tells.
fn peak_memory_mb() -> Option<f64> {
    let status = std::fs::read_to_string("/proc/self/status").ok()?;
    let line = status.lines().find(|line| line.starts_with("VmHWM"))?;
    line.split_whitespace().nth(1)?.parse::<f64>().ok().map(|kib| kib / 1024.0)
}

fn time(name: &str, text: String, pairs: &str) {
    let start = Instant::now();
    let read = |_: &Path| Ok(pairs.as_bytes().to_vec());
    let (program, found) = Program::load(name, text, Path::new("."), &Call::default(), &read);
    assert!(found.is_empty(), "{name} is faulty");
    let (circuit, _) = program.circuit();
    let circuit = circuit.expect("the circuit is right");
    let judged = start.elapsed();
    let solution = study::point::solve(&circuit, 100e3).expect("the circuit has a solution");
    let solved = start.elapsed();
    println!(
        "{name:<8} {:>7} elements {:>7} couplings   read and judged {:>6.0} ms   solved {:>6.0} ms   \
         balance {:.1e}   peak {:>5.0} MB",
        circuit.elements.len(),
        circuit.couplings.len(),
        judged.as_secs_f64() * 1e3,
        (solved - judged).as_secs_f64() * 1e3,
        solution.balance.mismatch,
        peak_memory_mb().unwrap_or(f64::NAN),
    );
}

fn main() {
    time("tiny", ladder(10), "");
    time("ladder", ladder(10_000), "");
    time("grid", grid(82), "");
    let (text, pairs) = coil(400);
    time("coil", text, &pairs);
}
