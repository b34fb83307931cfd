//! Time for one frequency of a sweep, engine by engine, on the same matrices, one thread.
//!
//! `cargo bench --bench engines [-- NAME…]`, and with `--features klu` against KLU too.

mod direct;
#[cfg(feature = "klu")]
mod klu;
mod networks;
mod peak;

use bifilar::solve::lanes::{Instructions, Plan, Uses};
use networks::Network;
use std::time::Instant;

/// Each engine is timed this often in turn, and its best time counts: noise only adds.
const ROUNDS: usize = 9;

/// Shortest time that is measured, in seconds.
const LEAST_SECONDS: f64 = 0.1;

/// Solves a network at each of some frequencies.
type Sweep<'a> = Box<dyn FnMut(&[f64]) + 'a>;

/// Something to be timed.
struct Engine<'a> {
    name: String,
    sweep: Sweep<'a>,
    best_seconds: f64,
}

fn lanes<'a>(network: &'a Network, name: &str, uses: Uses) -> (Engine<'a>, Plan) {
    let begun = Instant::now();
    let plan = Plan::new(&network.pattern, &network.equations, network.middle_hz(), &[], uses)
        .expect("a plan");
    let made = begun.elapsed();
    let mut workspace = plan.workspace(&network.equations);
    let own = plan.clone();
    let (mut worst, mut bad) = (0.0f64, 0);
    for batch in network.frequencies(64).chunks(own.lanes()) {
        for verdict in own.run(&mut workspace, batch) {
            worst = worst.max(verdict.backward_error);
            bad += usize::from(!verdict.is_good());
        }
    }
    println!(
        "  plan: {} multiply-adds, {} lanes, made in {made:.1?}; worst backward error {worst:.1e}, {bad} of 64 to be solved again",
        plan.work(),
        plan.lanes()
    );
    let sweep = Box::new(move |frequencies: &[f64]| {
        for batch in frequencies.chunks(own.lanes()) {
            let verdicts = own.run(&mut workspace, batch);
            std::hint::black_box(verdicts.iter().filter(|v| v.is_good()).count());
            std::hint::black_box(workspace.solution(0, 0));
        }
    });
    (Engine { name: name.into(), sweep, best_seconds: f64::INFINITY }, plan)
}

fn time(engine: &mut Engine, frequencies: &[f64]) {
    let begun = Instant::now();
    let mut sweeps = 0;
    while sweeps == 0 || begun.elapsed().as_secs_f64() < LEAST_SECONDS {
        (engine.sweep)(frequencies);
        sweeps += 1;
    }
    let seconds = begun.elapsed().as_secs_f64() / (sweeps * frequencies.len()) as f64;
    engine.best_seconds = engine.best_seconds.min(seconds);
}

fn measure(network: &Network, peak_gflops: f64) {
    println!(
        "{}: {} unknowns, {} entries",
        network.name,
        network.pattern.n,
        network.pattern.row.len()
    );
    let frequencies = network.frequencies(64);
    let mut engines = Vec::new();
    #[cfg(feature = "klu")]
    engines.push(klu::engine(network));
    engines.push(direct::engine(network));
    let (lanes_chosen, plan) = lanes(network, "lanes", Uses::default());
    let work = plan.work() as f64;
    engines.push(lanes_chosen);
    if Instructions::widest() > Instructions::Avx2 {
        let uses = Uses { instructions: Some(Instructions::Avx2), ..Uses::default() };
        engines.push(lanes(network, "lanes, AVX2 only", uses).0);
    }
    for _ in 0..ROUNDS {
        engines.iter_mut().for_each(|engine| time(engine, &frequencies));
    }
    let first = engines[0].best_seconds;
    println!("  | engine | µs per frequency | ratio | GFLOP/s | share of peak |");
    for engine in &engines {
        let seconds = engine.best_seconds;
        let mut line =
            format!("  | {} | {:.3} | {:.1} |", engine.name, seconds * 1e6, first / seconds);
        if engine.name.starts_with("lanes") {
            let gflops = 8.0 * work / seconds / 1e9;
            line += &format!(" {gflops:.1} | {:.0} % |", 100.0 * gflops / peak_gflops);
        } else {
            line += " | |";
        }
        println!("{line}");
    }
}

fn main() {
    let wanted: Vec<String> = std::env::args().skip(1).filter(|a| !a.starts_with('-')).collect();
    let peak = peak::measured_gflops();
    println!("peak of one thread, fused multiply-adds in registers: {peak:.1} GFLOP/s");
    let networks = [networks::ladder, networks::grid, networks::coil, networks::tiny];
    for network in networks.map(|make| make()) {
        if wanted.is_empty() || wanted.iter().any(|w| w == network.name) {
            measure(&network, peak);
        }
    }
}
