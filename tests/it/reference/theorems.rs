//! Two-port conversions, theorems of networks, and worked examples.

use crate::reference::{Check, c, circuit, degrees, omega, polar, solve_set, with_gear};
use crate::support::{Solved, close, solve};
use num_complex::Complex64;

const ANY_HZ: f64 = 1000.0;

type TwoByTwo = [[Complex64; 2]; 2];

#[track_caller]
fn measure(name: &str, gear: &str) -> Solved {
    solve(&with_gear(name, gear), ANY_HZ)
}

#[track_caller]
fn compare(check: &mut Check, what: &str, found: TwoByTwo, expected: TwoByTwo) {
    for (i, j) in [(0, 0), (0, 1), (1, 0), (1, 1)] {
        check.phasor(&format!("{what} {}{}", i + 1, j + 1), found[i][j], expected[i][j]);
    }
}

const DRIVE_LEFT: &str = "gnd -(> i1: 1 A )- left";
const DRIVE_RIGHT: &str = "gnd -(> i2: 1 A )- right";

/// Z: one port driven with 1 A, the other open.
#[track_caller]
fn impedance_matrix(name: &str) -> TwoByTwo {
    let (first, second) = (measure(name, DRIVE_LEFT), measure(name, DRIVE_RIGHT));
    [[first.volts("left"), second.volts("left")], [first.volts("right"), second.volts("right")]]
}

/// Y: one port at 1 V, the other shorted; the sources' currents run into the ports.
#[track_caller]
fn admittance_matrix(name: &str) -> TwoByTwo {
    let first = measure(name, "gnd -( v1: 1 V +)- left\ngnd -( v2: 0 V +)- right");
    let second = measure(name, "gnd -( v1: 0 V +)- left\ngnd -( v2: 1 V +)- right");
    [[first.amps("v1"), second.amps("v1")], [first.amps("v2"), second.amps("v2")]]
}

/// h: V1, I2 from I1, V2.
#[track_caller]
fn hybrid_matrix(name: &str) -> TwoByTwo {
    let shorted = measure(name, &format!("{DRIVE_LEFT}\ngnd -( v2: 0 V +)- right"));
    let open = measure(name, "gnd -( v2: 1 V +)- right");
    [[shorted.volts("left"), open.volts("left")], [shorted.amps("v2"), open.amps("v2")]]
}

/// g: I1, V2 from V1, I2.
#[track_caller]
fn inverse_hybrid_matrix(name: &str) -> TwoByTwo {
    let open = measure(name, "gnd -( v1: 1 V +)- left");
    let shorted = measure(name, &format!("gnd -( v1: 0 V +)- left\n{DRIVE_RIGHT}"));
    [[open.amps("v1"), shorted.amps("v1")], [open.volts("right"), shorted.volts("right")]]
}

/// ABCD: V1, I1 from V2 and the current out of the second port.
#[track_caller]
fn chain_matrix(name: &str) -> TwoByTwo {
    let open = measure(name, "gnd -( v1: 1 V +)- left");
    let shorted = measure(name, "gnd -( v1: 1 V +)- left\ngnd -( v2: 0 V +)- right");
    let (v2, i2) = (open.volts("right"), -shorted.amps("v2"));
    [[1.0 / v2, 1.0 / i2], [open.amps("v1") / v2, shorted.amps("v1") / i2]]
}

/// S at 50 Ω: sources of 2 V behind 50 Ω make incident waves of 1 V.
#[track_caller]
fn scattering_matrix(name: &str) -> TwoByTwo {
    let between = |left: f64, right: f64| {
        measure(
            name,
            &format!(
                "gnd -( e1: {left} V +)- s1 -( r1: 50 Ω )- left\n\
                 gnd -( e2: {right} V +)- s2 -( r2: 50 Ω )- right"
            ),
        )
    };
    let (first, second) = (between(2.0, 0.0), between(0.0, 2.0));
    [
        [first.volts("left") - 1.0, second.volts("left")],
        [first.volts("right"), second.volts("right") - 1.0],
    ]
}

#[test]
fn a_tee_and_its_pi_have_every_published_two_port_matrix() {
    let third = 1.0 / 3.0;
    let mut exact = Check::new("G4 Z, h, g and ABCD of tee and pi", "", 1e-9);
    let mut printed = Check::new("G4 Y and S of tee and pi", "", 1e-6);
    for name in ["g4_tee", "g4_pi"] {
        let at = |matrix: &str| format!("{name} {matrix}");
        let z = impedance_matrix(name);
        compare(
            &mut exact,
            &at("Z"),
            z,
            [[c(10.0, -10.0), c(0.0, -15.0)], [c(0.0, -15.0), c(20.0, -15.0)]],
        );
        let h = [[c(17.2, -4.6), c(0.36, -0.48)], [c(-0.36, 0.48), c(0.032, 0.024)]];
        compare(&mut exact, &at("h"), hybrid_matrix(name), h);
        let g = [[c(0.05, 0.05), c(-0.75, 0.75)], [c(0.75, -0.75), c(31.25, -3.75)]];
        compare(&mut exact, &at("g"), inverse_hybrid_matrix(name), g);
        let a = [
            [c(2.0 * third, 2.0 * third), c(70.0 * third, 55.0 * third)],
            [c(0.0, third / 5.0), c(1.0, 4.0 * third)],
        ];
        let chain = chain_matrix(name);
        compare(&mut exact, &at("ABCD"), chain, a);
        let determinant = chain[0][0] * chain[1][1] - chain[0][1] * chain[1][0];
        exact.phasor(&at("AD - BC"), determinant, c(1.0, 0.0));
        let y12 = c(-0.026498, 0.020820);
        let y = [[c(0.054259, 0.014511), y12], [y12, c(0.031546, 0.003785)]];
        compare(&mut printed, &at("Y"), admittance_matrix(name), y);
        let s12 = c(0.115187, -0.307766);
        let s = [[c(-0.551429, -0.229775), s12], [s12, c(-0.307856, -0.255572)]];
        compare(&mut printed, &at("S"), scattering_matrix(name), s);
    }
    exact.finish();
    printed.finish();
}

/// Smaller and larger eigenvalue of I - SᴴS.
fn dissipation(s: TwoByTwo) -> (f64, f64) {
    let [[s11, s12], [s21, s22]] = s;
    let (a, d) = (1.0 - s11.norm_sqr() - s21.norm_sqr(), 1.0 - s12.norm_sqr() - s22.norm_sqr());
    let b = -(s11.conj() * s12 + s21.conj() * s22);
    let (middle, spread) = ((a + d) / 2.0, (((a - d) / 2.0).powi(2) + b.norm_sqr()).sqrt());
    (middle - spread, middle + spread)
}

#[test]
fn passive_two_ports_absorb_and_lossless_ones_do_not() {
    let mut lossy = Check::new("H dissipation of the tee", "", 5.1e-6);
    let (smaller, larger) = dissipation(scattering_matrix("g4_tee"));
    lossy.real("smaller eigenvalue", smaller, 0.50161);
    lossy.real("larger eigenvalue", larger, 0.76545);
    lossy.finish();
    let coils = "left -(* a: 9 mH )- gnd\nright -(* b: 4 mH )- gnd\ncouple a, b : k 0.8\n\
                 left -( trim: 220 nF )- right";
    let between = |left: f64, right: f64| {
        solve(
            &format!(
                "{coils}\ngnd -( e1: {left} V +)- s1 -( r1: 50 Ω )- left\n\
                 gnd -( e2: {right} V +)- s2 -( r2: 50 Ω )- right"
            ),
            ANY_HZ,
        )
    };
    let (first, second) = (between(2.0, 0.0), between(0.0, 2.0));
    let s = [
        [first.volts("left") - 1.0, second.volts("left")],
        [first.volts("right"), second.volts("right") - 1.0],
    ];
    let mut lossless = Check::new("H lossless coupled coils dissipate nothing", "", 1e-12);
    let (smaller, larger) = dissipation(s);
    lossless.real("smaller eigenvalue", smaller, 0.0);
    lossless.real("larger eigenvalue", larger, 0.0);
    lossless.phasor("S12 = S21", s[0][1], s[1][0]);
    lossless.finish();
}

#[test]
fn single_elements_have_their_published_scattering() {
    let mut check = Check::new("G4 S of single elements", "", 1e-9);
    for (what, element, s11, s21, s22) in [
        (
            "series 30+j40 Ω",
            "left -( z: (30 + 40j) Ω )- right",
            c(0.297_297_297_297, 0.216_216_216_216),
            c(0.702_702_702_703, -0.216_216_216_216),
            c(0.297_297_297_297, 0.216_216_216_216),
        ),
        (
            "shunt 10+j20 mS",
            "left == right\nleft -( y: (10 + 20j) mS )- gnd",
            c(-0.310_344_827_586, -0.275_862_068_966),
            c(0.689_655_172_414, -0.275_862_068_966),
            c(-0.310_344_827_586, -0.275_862_068_966),
        ),
        (
            "ideal 2 : 1",
            "ideal step : left gnd | right gnd, turns 2 : 1",
            c(0.6, 0.0),
            c(0.8, 0.0),
            c(-0.6, 0.0),
        ),
    ] {
        let ports = "gnd -( e1: first +)- s1 -( r1: 50 Ω )- left\n\
                     gnd -( e2: second +)- s2 -( r2: 50 Ω )- right";
        let driven = |first: f64, second: f64| {
            let text =
                format!("let first = {first} V\nlet second = {second} V\n{element}\n{ports}\n");
            solve(&text, ANY_HZ)
        };
        let (from_left, from_right) = (driven(2.0, 0.0), driven(0.0, 2.0));
        check.phasor(&format!("{what} S11"), from_left.volts("left") - 1.0, s11);
        check.phasor(&format!("{what} S21"), from_left.volts("right"), s21);
        check.phasor(&format!("{what} S12"), from_right.volts("left"), s21);
        check.phasor(&format!("{what} S22"), from_right.volts("right") - 1.0, s22);
    }
    check.finish();
}

/// Network X with its source and the source in its detector branch.
#[track_caller]
fn network_x(frequency_hz: f64, excitation: &str, detector: &str) -> Solved {
    let set = [("excitation", excitation.to_owned()), ("detector", detector.to_owned())];
    solve_set("h_network_x", frequency_hz, &set)
}

#[test]
fn network_x_has_its_published_voltages_and_power() {
    let solved = network_x(400.0, "100 V", "0 V");
    let mut check = Check::new("H network X", "", 1e-9);
    check.relative("V2", solved.volts("n2"), c(92.987_988_561, 14.802_297_370));
    check.relative("V3", solved.volts("n3"), c(50.553_057_434, 6.023_777_025));
    check.relative("V4", solved.volts("n4"), c(35.195_887_057, 19.222_891_529));
    check.relative("I", solved.amps("r12"), c(0.584_334_287, -1.233_524_781));
    check.relative("S", -solved.power("source"), c(58.433_428_660, 123.352_478_087));
    let pair = solved.power("coil2") + solved.power("coil3");
    check.relative("coil pair", pair, c(0.0, 177.366_954_156));
    check.finish();
}

#[test]
fn tellegens_theorem_holds_across_two_solutions() {
    let (first, second) = (network_x(400.0, "100 V", "0 V"), network_x(1e3, "(3 - 4j) V", "0 V"));
    let names = ["source", "r12", "coil2", "coil3", "c3", "c24", "r34", "r4", "ammeter"];
    let terms = names.map(|name| first.drop(name) * second.amps(name));
    let sum: Complex64 = terms.iter().sum();
    let largest = terms.iter().map(|term| term.norm()).fold(0.0, f64::max);
    assert!(largest > 1.0, "the terms are no zeros: {largest}");
    let mut check = Check::new("H Tellegen across two frequencies", "VA", 1e-13);
    check.phasor("sum", sum, c(0.0, 0.0));
    check.finish();
}

#[test]
fn source_and_ammeter_may_change_places_unless_a_dependent_source_is_present() {
    let there = network_x(400.0, "100 V", "0 V").amps("ammeter");
    let back = network_x(400.0, "0 V", "100 V").amps("source");
    let mut check = Check::new("H reciprocity with coupled coils", "", 1e-12);
    check.relative("transfer current", there, back);
    check.finish();
    let gear = "gnd -(> gm: 20 mS * volts(n2) )- n4";
    let at = |excitation: &str, detector: &str| {
        let set = [("excitation", excitation), ("detector", detector)];
        crate::support::solve_with(&with_gear("h_network_x", gear), 400.0, &set)
    };
    let (there, back) = (at("100 V", "0 V").amps("ammeter"), at("0 V", "100 V").amps("source"));
    assert!((there - back).norm() > 0.1 * there.norm(), "{there} and {back} should differ");
}

#[test]
fn the_conjugate_load_takes_the_most_power() {
    let power = |load: &str| {
        let set = [("load_z", load.to_owned())];
        solve_set("h_conjugate_match", ANY_HZ, &set).power("load").re
    };
    let mut check = Check::new("H conjugate match", "", 1e-10);
    check.share("conjugate", power("(50 - 30j) ohm"), 0.5);
    check.share("best resistance", power("sqrt(50^2 + 30^2) * 1 ohm"), 0.461_639_941_572);
    check.finish();
    for other in ["(51 - 30j) ohm", "(50 - 31j) ohm", "(49 - 29j) ohm", "58.3095 ohm"] {
        assert!(power(other) < 0.5, "{other} takes less");
    }
    for other in ["58 ohm", "58.6 ohm"] {
        assert!(power(other) < 0.461_639_941_572, "{other} takes less");
    }
}

#[test]
fn worked_examples_of_reactance_have_their_published_answers() {
    let solved = solve(&circuit("e1_series_parallel"), 60.0);
    let mut printed = Check::new("E1 worked examples, printed", "half digits", 1.0);
    let mut exact = Check::new("E1 worked examples, computed", "", 1e-8);
    let branch = |name| solved.amps(name).norm();
    let total = branch("supply");
    // Found, printed, half a unit of the last digit of the print, computed.
    for (what, found, print, half, computed) in [
        ("series Z", solved.volts("series").norm(), 11.66, 0.005, 11.661_903_8),
        ("parallel IR", branch("r2"), 0.6, 0.05, 0.6),
        ("parallel IL", branch("l2"), 1.2, 0.05, 1.2),
        ("parallel IC", branch("c2"), 1.5, 0.05, 1.5),
        ("parallel IT", total, 0.671, 0.0005, 0.670_820_39),
        ("parallel Z", 120.0 / total, 178.9, 0.05, 178.885_438),
        ("40 mH X", 120.0 / branch("coil"), 15.1, 0.05, 15.079_644_7),
        ("40 mH I", branch("coil"), 7.96, 0.005, 7.957_747_15),
        ("10 µF X", 120.0 / branch("capacitor"), 265.26, 0.005, 265.258_238),
        ("10 µF I", branch("capacitor"), 0.452, 0.0005, 0.452_389_342),
    ] {
        // In halves of the last printed digit.
        printed.real(what, found / half, print / half);
        exact.share(what, found, computed);
    }
    printed.finish();
    exact.finish();
    let mut phase = Check::new("E1 phase of the series example", "°", 1e-9);
    let z = c(6.0, 10.0);
    phase.angle("series", degrees(solved.volts("series")), degrees(z));
    phase.angle("coil", degrees(solved.amps("coil")), -90.0);
    phase.finish();
    let x = omega(60.0) * 40e-3;
    close(solved.amps("coil"), polar(120.0 / x, -90.0), 1e-12);
}
