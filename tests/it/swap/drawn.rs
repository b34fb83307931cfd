//! Circuits drawn at random: every kind of twin agrees with the original, and reads back.

use crate::exact;
use crate::swap::agree::{assert_agrees, assert_same_reads, read, solvable};
use bifilar::circuit::island::{Islands, Regime};
use bifilar::circuit::print::Printer;
use bifilar::circuit::{Circuit, ElementId, Law, Measure, Operation};
use bifilar::quantity::{Decimal, Dimension};
use bifilar::study::pair::{Correspondence, Matching};
use bifilar::study::prove::{self, Difference, Verdict};
use bifilar::swap::{self, Condition, Kind, Options, SwapError, Swapped, Twin};
use fastrand::Rng;

/// Every twin agrees with its original to this fraction, beside the bounds of both solutions.
const WITHIN: f64 = 1e-9;

/// How many islands have elements.
fn islands(circuit: &Circuit) -> usize {
    let islands = Islands::find(circuit, Regime::Alternating);
    let mut tied = vec![false; islands.reference.len()];
    for element in &circuit.elements {
        tied[islands.of_node[element.left.index()]] = true;
    }
    tied.iter().filter(|tied| **tied).count()
}

/// How many ties were made: each must join two islands, or it would close a loop.
fn ties(twin: &Twin) -> usize {
    let of = |record: &Swapped| match &record.condition {
        Condition::Tied(ties) => ties.len(),
        _ => 0,
    };
    twin.records.iter().map(of).sum()
}

/// What the proof says of a circuit and another that its twin's names and readings fit.
fn verdict(circuit: &Circuit, twin: &Twin, other: &Circuit) -> Verdict {
    let same = Correspondence::of_twin(twin);
    let matching = Matching::new(circuit, other, &same);
    let options = prove::Options { seed: Some(1), frequencies_hz: vec![159.0, 1e3, 2e4] };
    prove::decide(circuit, other, &matching.matched, &options).verdict
}

/// Checks every kind of twin; how many there were of each.
fn check_all(circuit: &Circuit, frequencies_hz: &[f64], counts: &mut [usize; 5]) {
    for (place, kind) in Kind::ALL.into_iter().enumerate() {
        for keep_isolation in [false, true] {
            let options = Options { keep_isolation, ..Options::new(kind) };
            match swap::twin(circuit, &options) {
                Ok(twin) => {
                    counts[place] += 1;
                    let wrong = bifilar::circuit::judge::judge(&twin.circuit);
                    let wrong = wrong.iter().find(|d| d.severity == bifilar::diag::Severity::Error);
                    assert_eq!(wrong, None);
                    assert_eq!(islands(circuit), islands(&twin.circuit) + ties(&twin));
                    for &frequency_hz in frequencies_hz {
                        assert_agrees(circuit, &twin, frequency_hz, WITHIN);
                    }
                    let proof = verdict(circuit, &twin, &twin.circuit);
                    assert!(matches!(proof, Verdict::Identical { .. }), "{kind}: {proof:?}");
                }
                Err(
                    SwapError::TooMany { .. }
                    | SwapError::MeshKeepsNoIsolation
                    | SwapError::FullyCoupled { .. },
                ) => {}
                Err(error) => panic!("{kind}: {error}"),
            }
        }
    }
}

#[test]
fn printed_circuits_read_back() {
    for seed in 0..150 {
        let drawn = exact::draw(seed);
        let circuit = read(&drawn.text);
        let text = Printer::new(&circuit).text(&[]);
        let again = read(&text);
        assert_same_reads(&circuit, &again, drawn.frequency_hz, 1e-12, &text);
    }
}

#[test]
fn twins_of_circuits_drawn_with_all_sorts_of_parts_agree() {
    let mut counts = [0; 5];
    for seed in 1000..1150 {
        let drawn = exact::draw(seed);
        let circuit = read(&drawn.text);
        if circuit.couplings.is_empty() {
            continue;
        }
        check_all(&circuit, &[drawn.frequency_hz, drawn.frequency_hz * 1.37], &mut counts);
    }
    assert!(counts.iter().all(|count| *count > 20), "{counts:?}");
}

/// A text with several sets of windings, all kinds of sharing, blocks and losses.
fn draw(rng: &mut Rng) -> String {
    let mut text = String::from(
        "gnd -( drive: 10 V +)- n0\n\
         block pair (a b c d ; L = 2 mH, k = 0.9) {\n  a -(* La: L, esr 0.2 Ω )- b\n  \
         c -( Lb: L * 1.7, q 80 at 3 kHz *)- d\n  couple La, Lb : k k\n  \
         read inner = power(La)\n}\n",
    );
    // Two or three islands, each a ring of resistors so that every node is held.
    let islands = rng.usize(2..=3);
    let names: Vec<Vec<String>> = (0..islands)
        .map(|i| match i {
            0 => vec!["gnd".into(), "n0".into(), "n1".into(), "n2".into()],
            _ => (0..3).map(|k| format!("i{i}_{k}")).collect(),
        })
        .collect();
    for (i, nodes) in names.iter().enumerate() {
        for (k, node) in nodes.iter().enumerate() {
            let next = &nodes[(k + 1) % nodes.len()];
            let ohms = rng.u32(3..300);
            text += &format!("{node} -( hold{i}_{k}: {ohms} Ω )- {next}\n");
        }
        if i > 0 && rng.bool() {
            text += &format!("reference {}\n", nodes[rng.usize(0..nodes.len())]);
        }
    }
    let pick = |rng: &mut Rng, island: usize| {
        let nodes = &names[island];
        let a = rng.usize(0..nodes.len());
        let b = (a + rng.usize(1..nodes.len())) % nodes.len();
        (nodes[a].clone(), nodes[b].clone())
    };
    let sets = rng.usize(1..=3);
    for set in 0..sets {
        let size = [2, 2, 2, 3, 4, 6][rng.usize(0..6)];
        draw_set(rng, &mut text, set, size, islands, &pick);
    }
    let (a, b) = pick(rng, 0);
    let other = rng.usize(0..islands);
    let (c, d) = pick(rng, other);
    text += &format!("use pair as cm1 ({a} {b} {c} {d} ; k = {})\n", rng.f64() * 1.8 - 0.9);
    text += "gnd -( sense: 3 Ω * amps(w0_0) + 0.1 * drop(w0_1) +)- out -( r_out: 40 Ω )- gnd\n";
    text += "read a = amps(cm1.La) / 1 A\nread b = conj(power(w0_0))\n";
    text += "read c = volts(i1_0)\nread d = drop(w0_1) * 2 - volts(out)\n";
    text
}

fn draw_set(
    rng: &mut Rng,
    text: &mut String,
    set: usize,
    size: usize,
    islands: usize,
    pick: &impl Fn(&mut Rng, usize) -> (String, String),
) {
    let mut inductance = Vec::new();
    // One pair of ends for several windings now and then, the same way round or the other.
    let mut last: Option<(String, String)> = None;
    for w in 0..size {
        let island = rng.usize(0..islands);
        let (mut a, mut b) = pick(rng, island);
        if let (Some(ends), true) = (&last, rng.u8(0..5) == 0) {
            (a, b) = ends.clone();
        }
        last = Some((b.clone(), a.clone()));
        let henries = 0.2 + 3.0 * rng.f64();
        inductance.push(henries);
        let loss = ["", ", esr 0.7 Ω", ", q 60 at 5 kHz", ", q 90"][rng.usize(0..4)];
        let (left, right) = if rng.bool() { ("*", "") } else { ("", "*") };
        *text += &format!("{a} -({left} w{set}_{w}: {henries} mH{loss} {right})- {b}\n");
    }
    // Couplings of one common flux, of both signs, and below 1: positive definite.
    let share: Vec<f64> = (0..size).map(|_| 1.9 * rng.f64() - 0.95).collect();
    for i in 0..size {
        for j in i + 1..size {
            let k = share[i] * share[j];
            let m = k * (inductance[i] * inductance[j]).sqrt();
            *text += &match rng.u8(0..4) {
                0 => format!("couple w{set}_{i}, w{set}_{j} : M {m} mH, R 0.05 Ω\n"),
                1 => format!("couple w{set}_{i}, w{set}_{j} : M {m} mH\n"),
                2 if size > 2 && i > 0 => format!("couple w{set}_{i}, w{set}_{j} : k {k}\n"),
                _ => format!("couple w{set}_{i}, w{set}_{j} : k {k} + 0\n"),
            };
        }
    }
}

#[test]
fn twins_of_circuits_with_several_sets_and_blocks_agree() {
    let mut counts = [0; 5];
    for seed in 0..120 {
        let mut rng = Rng::with_seed(seed);
        let text = draw(&mut rng);
        let circuit = read(&text);
        let at = [900.0 * (1.0 + rng.f64()), 2e4 * (1.0 + rng.f64())];
        assert!(solvable(&circuit, at[0]), "seed {seed}");
        check_all(&circuit, &at, &mut counts);
    }
    assert!(counts.iter().all(|count| *count > 20), "{counts:?}");
}

/// The circuit with the inductance of one element a millionth larger.
fn moved_by_a_millionth(circuit: &Circuit, leg: ElementId) -> Circuit {
    let mut moved = circuit.clone();
    let element = &mut moved.elements[leg.index()];
    let Law::Winding { inductance, .. } = &mut element.law else {
        unreachable!("a leg is a winding")
    };
    let factor = Operation::Number(Decimal { mantissa: 1_000_001, exponent: -6 });
    let factor = moved.tape.push(factor, Dimension::NONE, element.span);
    let product = Operation::Product(factor, *inductance);
    *inductance = moved.tape.push(product, Dimension::INDUCTANCE, element.span);
    moved
}

#[test]
fn moved_legs_of_drawn_twins_are_told_apart_by_number_and_by_proof() {
    let (mut legs, mut told) = (0, 0);
    for seed in 0..12 {
        let circuit = read(&draw(&mut Rng::with_seed(seed)));
        for kind in [Kind::Tee, Kind::Pi, Kind::Mesh, Kind::Leakage] {
            let Ok(twin) = swap::twin(&circuit, &Options::new(kind)) else { continue };
            let names: Vec<&String> =
                twin.records.iter().flat_map(|r| r.legs.iter().map(|leg| &leg.name)).collect();
            let moved = twin.circuit.each_element().filter(|(_, element)| {
                matches!(element.law, Law::Winding { .. }) && names.contains(&&element.name)
            });
            for (id, element) in moved {
                legs += 1;
                match verdict(&circuit, &twin, &moved_by_a_millionth(&twin.circuit, id)) {
                    Verdict::Different(Difference::Quantity { shows_best: Some(_), .. }) => {
                        told += 1;
                    }
                    // A leg without influence: both ends at nodes that are one.
                    Verdict::Identical { .. } => {}
                    other => panic!("seed {seed}, {kind}, {}: {other:?}", element.name),
                }
            }
        }
    }
    assert!(legs > 60 && told * 20 >= legs * 19, "{told} of {legs} legs were told apart");
}

#[test]
fn any_leg_moved_by_one_part_in_a_million_is_noticed() {
    use bifilar::study::engine::Engine;
    let text = "gnd -( e: 10 V +)- a -( r: 5 Ω )- p -(* w1: 4 mH )- gnd\n\
                q -(* w2: 9 mH )- gnd; q -( load: 20 Ω )- gnd; couple w1, w2 : k 0.5\n";
    let circuit = read(text);
    for kind in [Kind::Tee, Kind::Pi] {
        let twin = swap::twin(&circuit, &Options::new(kind)).expect("a twin");
        let solve = |circuit: &Circuit, id| {
            let mut engine = Engine::new(circuit, bifilar::circuit::island::Regime::Alternating)
                .expect("system");
            engine.solve(159.0).expect("a solution");
            engine.measure(Measure::Drop(id)).expect("a drop").centre.to_complex()
        };
        let load = |circuit: &Circuit| {
            circuit.each_element().find(|(_, e)| e.name == "load").map(|(id, _)| id).expect("load")
        };
        let exact = solve(&circuit, load(&circuit));
        let legs: Vec<_> = twin
            .circuit
            .each_element()
            .filter(|(_, e)| matches!(e.law, Law::Winding { .. }))
            .map(|(id, _)| id)
            .collect();
        assert_eq!(legs.len(), 3);
        for leg in legs {
            let moved = moved_by_a_millionth(&twin.circuit, leg);
            let off = (solve(&moved, load(&moved)) - exact).norm() / exact.norm();
            assert!(off > 1e-8, "{kind}: {off:e}");
            let proof = verdict(&circuit, &twin, &moved);
            assert!(matches!(proof, Verdict::Different(_)), "{kind}: {proof:?}");
            let same = (solve(&twin.circuit, load(&twin.circuit)) - exact).norm() / exact.norm();
            assert!(same < 1e-14, "{kind}: {same:e}");
        }
    }
}
