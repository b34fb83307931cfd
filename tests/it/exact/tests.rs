//! The reference against circuits solved by hand, and the library against the reference.

use crate::exact::network::{Branch, Law, Mutual, Network};
use crate::exact::number::Exact;
use crate::exact::{Drawn, ExactSolution, draw, tableau};
use crate::support;
use bifilar::study::Value;
use std::collections::BTreeMap;

/// How many circuits are drawn for each test.
const CIRCUITS: u64 = 400;

/// Results may differ by this much of the larger one …
const AGREEMENT: f64 = 1e-9;
/// … or by a few roundings of the largest result of the same kind in the circuit: a drop, say, is a
/// difference of two node voltages, and doubles carry no more of it.
const ROUNDINGS_OF_LARGEST: f64 = 4.0 * f64::EPSILON;

/// Shows the circuit if the test fails while it is in hand.
struct Shown<'a>(u64, &'a Drawn);

impl Drop for Shown<'_> {
    fn drop(&mut self) {
        if std::thread::panicking() {
            println!("seed {}, at {} Hz:\n{}", self.0, self.1.frequency_hz, self.1.text);
        }
    }
}

/// A network of branches between nodes by number; node 0 is the reference.
fn network(nodes: &[&str], branches: Vec<(&str, usize, usize, Law)>) -> Network {
    let branch = |(name, left, right, law): (&str, usize, usize, Law)| Branch {
        name: (!name.is_empty()).then(|| name.to_owned()),
        left,
        right,
        law,
    };
    Network {
        nodes: nodes.iter().map(|name| (*name).to_owned()).collect(),
        branches: branches.into_iter().map(branch).collect(),
        mutuals: Vec::new(),
        reference_order: (0..nodes.len()).collect(),
    }
}

/// `(re + j·im) / over`
fn ratio(re: i64, im: i64, over: i64) -> Exact {
    &Exact::whole(re, im) * &Exact::whole(over, 0).inverse()
}

fn ohms(re: i64, im: i64) -> Law {
    Law::Impedance(Exact::whole(re, im))
}

#[test]
fn reference_solves_a_voltage_divider_as_by_hand() {
    let source = Law::Voltage(Exact::whole(-10, 0));
    let branches = vec![
        ("source", 0, 1, source),
        ("upper", 1, 2, ohms(3, 0)),
        ("lower", 2, 0, Law::Admittance(ratio(0, -1, 4))),
    ];
    let solution = tableau::solve(&network(&["gnd", "in", "mid"], branches)).expect("regular");
    assert_eq!(solution.volts["in"], Exact::whole(10, 0));
    assert_eq!(solution.amps["lower"], ratio(30, -40, 25));
    assert_eq!(solution.volts["mid"], ratio(160, 120, 25));
    assert_eq!(solution.powers["upper"], Exact::whole(12, 0));
    assert_eq!(solution.powers["lower"], Exact::whole(0, 16));
    assert_eq!(solution.powers["source"], Exact::whole(-12, -16));
}

#[test]
fn reference_solves_two_coupled_windings_on_two_islands_as_by_hand() {
    let winding = |re, im, dot_left| Law::Winding { own: Exact::whole(re, im), dot_left };
    let branches = vec![
        ("source", 1, 0, Law::Voltage(Exact::whole(10, 0))),
        ("first", 1, 0, winding(1, 5, true)),
        ("second", 2, 3, winding(0, 5, false)),
        ("load", 2, 3, ohms(4, 0)),
    ];
    let mut network = network(&["gnd", "in", "s", "t"], branches);
    network.mutuals = vec![Mutual { first: 1, second: 2, impedance: Exact::whole(0, 3) }];
    // Second loop: (4 + 5j)·i2 = 3j·i1, the dots being at unlike ends; then
    // 10 = (1 + 5j)·i1 − 3j·i2 gives i1 = 10·(4 + 5j)/(−12 + 25j), and |−12 + 25j|² = 769.
    let solution = tableau::solve(&network).expect("regular");
    assert_eq!(solution.amps["first"], ratio(770, -1600, 769));
    assert_eq!(solution.amps["second"], ratio(750, -360, 769));
    assert_eq!(solution.drops["load"], ratio(-3000, 1440, 769));
    assert_eq!(solution.volts["t"], ratio(3000, -1440, 769));
    assert_eq!(solution.references["t"], "s");
    assert!(solution.imbalance.is_zero());
}

#[test]
fn reference_solves_an_amplifier_on_an_ideal_transformer_as_by_hand() {
    let turns = |turns| Law::Turns { transformer: 0, turns: Exact::whole(turns, 0) };
    let branches = vec![
        ("source", 1, 0, Law::Voltage(Exact::whole(1, 0))),
        ("into", 1, 2, ohms(1000, 0)),
        ("feedback", 2, 3, ohms(5000, 0)),
        ("", 0, 2, Law::AmplifierInput),
        ("amplifier", 3, 0, Law::AmplifierOutput),
        ("step.1", 3, 0, turns(10)),
        ("step.2", 4, 0, turns(-2)),
        ("load", 4, 0, ohms(4, 0)),
    ];
    let nodes = ["gnd", "in", "minus", "out", "second"];
    let solution = tableau::solve(&network(&nodes, branches)).expect("regular");
    assert_eq!(solution.volts["out"], Exact::whole(-5, 0));
    assert_eq!(solution.volts["second"], Exact::whole(1, 0));
    assert_eq!(solution.amps["load"], ratio(1, 0, 4));
    assert_eq!(solution.amps["step.1"], ratio(-1, 0, 20));
    assert_eq!(solution.amps["amplifier"], ratio(51, 0, 1000));
    assert!(solution.imbalance.is_zero());
}

#[test]
fn reference_refuses_a_loop_of_voltages_and_a_node_of_currents() {
    let volts = |value| Law::Voltage(Exact::whole(value, 0));
    let parallel = network(&["gnd", "a"], vec![("x", 1, 0, volts(1)), ("y", 1, 0, volts(2))]);
    assert!(tableau::solve(&parallel).is_none());
    let amps = Law::Current(Exact::whole(1, 0));
    let shorted = network(&["gnd", "a"], vec![("x", 1, 0, amps.clone()), ("", 1, 0, Law::Wire)]);
    assert!(tableau::solve(&shorted).is_some());
    let open = network(&["gnd", "a"], vec![("x", 1, 0, amps)]);
    assert!(tableau::solve(&open).is_none());
}

#[test]
fn drawn_powers_balance_exactly_and_few_draws_are_singular() {
    let mut singular = 0;
    for seed in 0..CIRCUITS {
        let drawn = draw(seed);
        let _shown = Shown(seed, &drawn);
        assert!(drawn.solve().imbalance.is_zero(), "powers do not balance");
        assert_eq!(drawn.solve().drops.len(), drawn.elements());
        singular += drawn.singular;
    }
    assert!(singular < CIRCUITS / 10, "{singular} of {CIRCUITS} draws were singular");
}

#[test]
fn drawn_circuits_are_the_same_each_time_and_cover_the_language() {
    assert_eq!(draw(7).text, draw(7).text);
    let wanted = [
        "Ω",
        "ohm",
        "S",
        "j) ",
        "H",
        "F",
        "k7",
        "n7",
        "esr",
        "tand",
        "%",
        "q 180",
        "q 180 at",
        "∠ 90°",
        "ang 180 deg",
        "(+",
        "+)",
        "(>",
        ">)",
        "(<",
        "<)",
        "(*",
        "*)",
        "volts(",
        " to ",
        "drop(",
        "amps(",
        "ideal",
        "opamp",
        "==",
        ")(",
        "couple",
        ": k ",
        ": M ",
        ": M -",
        ", R ",
        "leakage",
        "aiding",
        "reference",
        "parallel(",
        "omega",
        "* f",
        "let",
        ";",
        "#",
        "\n    -(",
    ];
    let texts: Vec<String> = (0..CIRCUITS).map(|seed| draw(seed).text).collect();
    for piece in wanted {
        let count = texts.iter().filter(|text| text.contains(piece)).count();
        assert!(count >= 3, "{piece:?} stands in {count} of {CIRCUITS} circuits");
    }
    let three = texts.iter().filter(|text| {
        text.lines().any(|line| line.contains("ideal") && line.matches('|').count() == 2)
    });
    assert!(three.count() >= 3, "ideal transformers of three windings");
}

/// One result of the library and its exact value.
struct Pair<'a> {
    what: String,
    kind: &'static str,
    found: Value,
    exact: &'a Exact,
}

/// Solves a drawn circuit with the library and pairs every result with the exact one.
fn pairs<'a>(drawn: &Drawn, exact: &'a ExactSolution) -> Vec<Pair<'a>> {
    let solved = support::solve(&drawn.text, drawn.frequency_hz).solution;
    assert_eq!(solved.nodes.len(), exact.volts.len(), "number of nodes");
    assert_eq!(solved.elements.len(), exact.drops.len(), "number of elements");
    let mut all = Vec::new();
    let mut push = |what: &str, kind, found, values: &'a BTreeMap<String, Exact>| {
        let exact = values.get(what).unwrap_or_else(|| panic!("{what} is not in the circuit"));
        all.push(Pair { what: format!("{kind} of {what}"), kind, found, exact });
    };
    for node in &solved.nodes {
        assert_eq!(Some(&node.reference), exact.references.get(&node.name), "of {}", node.name);
        push(&node.name, "voltage", node.voltage, &exact.volts);
    }
    for element in &solved.elements {
        let drop = element.drop.unwrap_or_else(|| panic!("{} has no drop", element.name));
        push(&element.name, "drop", drop, &exact.drops);
        push(&element.name, "current", element.current, &exact.amps);
        push(&element.name, "power", element.power, &exact.powers);
    }
    all
}

#[test]
fn library_agrees_with_the_exact_solution_of_drawn_circuits() {
    for seed in 0..CIRCUITS {
        let drawn = draw(seed);
        let _shown = Shown(seed, &drawn);
        let pairs = pairs(&drawn, drawn.solve());
        for pair in &pairs {
            let same_kind = pairs.iter().filter(|other| other.kind == pair.kind);
            let largest = largest(same_kind.map(|other| other.exact));
            let size = pair.exact.to_c64().norm().max(pair.found.value.norm());
            let off = pair.exact.distance(pair.found.value);
            let allowed = allowed(size, largest);
            assert!(
                off <= allowed,
                "{}: found {}, exactly {}, off by {off:e}, allowed {allowed:e}",
                pair.what,
                pair.found.value,
                pair.exact.to_c64()
            );
        }
    }
}

#[test]
fn claimed_error_bounds_cover_the_true_errors_of_drawn_circuits() {
    for seed in 0..CIRCUITS {
        let drawn = draw(seed);
        let _shown = Shown(seed, &drawn);
        for pair in pairs(&drawn, drawn.solve()) {
            let value = pair.found.value;
            let last_digits = f64::EPSILON * value.re.abs().max(value.im.abs());
            let off = pair.exact.distance(value);
            assert!(
                off <= pair.found.error + last_digits,
                "{}: found {value} claimed within {:e}, exactly {}, off by {off:e}",
                pair.what,
                pair.found.error,
                pair.exact.to_c64()
            );
        }
    }
}

/// Volts, amperes or volt-amperes below any that exist: where every voltage of a circuit is exactly
/// zero, there is no largest one to measure roundings by.
const NOTHING: f64 = 1e-40;

/// How far a result may be off, the largest of its kind in the circuit being given.
fn allowed(size: f64, largest: f64) -> f64 {
    (AGREEMENT * size).max(ROUNDINGS_OF_LARGEST * largest).max(NOTHING)
}

fn largest<'a>(values: impl Iterator<Item = &'a Exact>) -> f64 {
    values.map(|value| value.to_c64().norm()).fold(0.0, f64::max)
}

/// So a disagreement is the fault of the library, not of values that no double can hold.
#[test]
fn drawn_circuits_hardly_change_when_their_values_are_rounded_to_doubles() {
    for seed in 0..CIRCUITS {
        let drawn = draw(seed);
        let _shown = Shown(seed, &drawn);
        let exact = drawn.solve();
        let rounded = tableau::solve(&drawn.network.rounded()).expect("regular");
        let kinds = [
            (&exact.volts, &rounded.volts),
            (&exact.drops, &rounded.drops),
            (&exact.amps, &rounded.amps),
            (&exact.powers, &rounded.powers),
        ];
        for (values, others) in kinds {
            let largest = largest(values.values());
            for (name, value) in values {
                let off = value.distance(others[name].to_c64());
                let allowed = 1e-3 * allowed(value.to_c64().norm(), largest);
                assert!(off <= allowed.max(f64::EPSILON * largest), "{name} moves by {off:e}");
            }
        }
    }
}
