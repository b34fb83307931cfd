//! Twins against values from outside the project; sources stand in `docs/checks.md`.

use crate::support::{close, solve};
use crate::swap::agree::{twin_of, written};
use bifilar::swap::{Kind, Options, Twin};
use num_complex::Complex64;
use std::f64::consts::TAU;

/// The value of a leg, in henries or turns.
#[track_caller]
fn leg(twin: &Twin, name: &str) -> f64 {
    let legs = &twin.records[0].legs;
    let found = legs.iter().find(|leg| leg.name == name);
    let value = found.and_then(|leg| leg.value);
    value.unwrap_or_else(|| panic!("no leg {name}: {legs:?}"))
}

#[track_caller]
fn assert_near(found: f64, expected: f64, relative: f64) {
    let off = (found - expected).abs();
    assert!(off <= relative * expected.abs(), "{found} is not {expected}");
}

/// Two coils with a common node: L1 = 4, L2 = 9, M = 3 mH, 10 V behind 5 Ω, 20 Ω at port 2.
const COILS: &str = "gnd -( e: 10 V +)- in -( source: 5 Ω )- p -(* w1: 4 mH )- gnd\n\
                     q -(* w2: 9 mH )- gnd; q -( load: 20 Ω )- gnd\n";

#[test]
fn two_coupled_coils_have_the_tee_and_pi_of_the_handbooks() {
    let text = format!("{COILS}couple w1, w2 : M 3 mH\n");
    let tee = twin_of(&text, &Options::new(Kind::Tee));
    assert_near(leg(&tee, "w1_leg"), 1e-3, 1e-15);
    assert_near(leg(&tee, "w2_leg"), 6e-3, 1e-15);
    assert_near(leg(&tee, "w1_w2_common"), 3e-3, 1e-15);
    let pi = twin_of(&text, &Options::new(Kind::Pi));
    assert_near(leg(&pi, "w1_shunt"), 4.5e-3, 1e-15);
    assert_near(leg(&pi, "w1_w2_between"), 9e-3, 1e-15);
    assert_near(leg(&pi, "w2_shunt"), 27e-3, 1e-15);
    let v1 = Complex64::new(3.831_726_639_305, 4.397_728_357_354);
    let v2 = Complex64::new(3.579_268_874_678, 2.090_293_022_812);
    for kind in Kind::ALL {
        for coupling in ["M 3 mH", "k 0.5", "aiding 19 mH, opposing 7 mH", "leakage 3 mH at w1"] {
            let text = format!("{COILS}couple w1, w2 : {coupling}\n");
            let twin = written(&twin_of(&text, &Options::new(kind)));
            let solved = solve(&twin, 1000.0 / TAU);
            close(solved.volts("p"), v1, 1e-12);
            close(solved.volts("q"), v2, 1e-12);
        }
    }
}

#[test]
fn the_opposite_sense_turns_the_tee_into_seven_twelve_and_minus_three() {
    for coupling in ["M -3 mH", "k -0.5"] {
        let text = format!("{COILS}couple w1, w2 : {coupling}\n");
        let tee = twin_of(&text, &Options::new(Kind::Tee));
        assert_near(leg(&tee, "w1_leg"), 7e-3, 1e-14);
        assert_near(leg(&tee, "w2_leg"), 12e-3, 1e-14);
        assert_near(leg(&tee, "w1_w2_common"), -3e-3, 1e-14);
    }
    // The same with the dot of one coil at its other end.
    let text = COILS.replace("q -(* w2: 9 mH )-", "q -( w2: 9 mH *)-");
    let tee = twin_of(&format!("{text}couple w1, w2 : M 3 mH\n"), &Options::new(Kind::Tee));
    assert_near(leg(&tee, "w1_leg"), 7e-3, 1e-14);
    assert_near(leg(&tee, "w1_w2_common"), -3e-3, 1e-14);
}

#[test]
fn a_pair_has_the_cantilever_of_the_coupling_factor() {
    let text = "gnd -( e: 1 V +)- p -(* w1: 2 mH )- gnd\nq -(* w2: 0.5 mH )- r -( load: 5 Ω )- q\n\
                couple w1, w2 : k 0.8\n";
    let twin = twin_of(text, &Options::new(Kind::Leakage));
    assert_near(leg(&twin, "w1_magnetizing"), 2e-3, 1e-14);
    assert_near(leg(&twin, "n_w2_w1"), 0.4, 1e-14);
    assert_near(leg(&twin, "w2_leakage"), 0.18e-3, 1e-14);
    assert_near(twin.records[0].leakage[0].expect("constant"), 0.72e-3, 1e-14);
    assert_near(twin.records[0].k[1].expect("constant"), 0.8, 1e-14);
}

#[test]
fn k_towards_one_approaches_the_ideal_transformer() {
    let text = |k: &str| {
        format!(
            "gnd -( e: 10 V +)- in -( source: 50 Ω )- p -(* w1: 1 H )- gnd\n\
             q -(* w2: 0.01 H )- gnd; q -( load: 0.5 Ω )- gnd\ncouple w1, w2 : k {k}\n"
        )
    };
    let expected = [
        ("0.9999", Complex64::new(0.492_226_983, -0.061_656_123)),
        ("1 - 1e-9", Complex64::new(0.499_999_921, 0.000_198_315)),
    ];
    for (k, v2) in expected {
        for kind in Kind::ALL {
            let twin = written(&twin_of(&text(k), &Options::new(kind)));
            let found = solve(&twin, 1e4).volts("q");
            assert!((found - v2).norm() < 1e-9, "{kind}, k {k}: {found}");
        }
    }
    // At k = 1 only the magnetising current is left to differ from the ideal transformer.
    for kind in [Kind::Tee, Kind::Leakage, Kind::Dependent] {
        let original = solve(&text("1"), 1e4).volts("q");
        let twin = written(&twin_of(&text("1"), &Options::new(kind)));
        close(solve(&twin, 1e4).volts("q"), original, 1e-12);
        assert!((original.norm() - 0.5).abs() < 1e-6);
    }
}

#[test]
fn a_three_winding_star_keeps_its_short_circuit_readings() {
    // 0.2298, −0.0217, 0.7747 at a star point with 100: per unit, read as henries at 1 rad/s.
    let own = ["100.2298 H", "99.9783 H", "100.7747 H"];
    let windings = "gnd -(* p: {p} )- a\nk1 -(* s: {s} )- b\nk2 -(* t: {t} )- c\n"
        .replace("{p}", own[0])
        .replace("{s}", own[1])
        .replace("{t}", own[2]);
    let set = "couple p, s, t : M 100 H\n";
    let tests = [
        ("gnd -(> i: 1 A )- a; k1 -( short: 0 Ω )- b\nread x = drop(p)", 0.208_095_290),
        ("gnd -(> i: 1 A )- a; k2 -( short: 0 Ω )- c\nread x = drop(p)", 0.998_544_536),
        ("k1 -(> i: 1 A )- b; k2 -( short: 0 Ω )- c\nread x = drop(s)", 0.747_044_536),
    ];
    for (gear, reactance) in tests {
        let text = format!("{windings}{set}{gear}\n");
        for kind in [Kind::Mesh, Kind::Leakage, Kind::Dependent] {
            let twin = written(&twin_of(&text, &Options::new(kind)));
            let found = solve(&twin, 1.0 / TAU).read("x");
            assert!((found.norm() - reactance).abs() < 2e-9, "{kind}: {found}, {reactance}");
        }
    }
}

/// Inductances in µH of a four-winding transformer.
const FOUR: [[f64; 4]; 4] = [
    [250.0, 125.0, 500.0, 62.5],
    [125.0, 63.1, 251.6, 31.4],
    [500.0, 251.6, 1009.6, 125.75],
    [62.5, 31.4, 125.75, 15.775],
];

/// Driven winding, shorted winding, read winding over driven winding: the published ratio.
const FOUR_TESTS: [(usize, Option<usize>, usize, f64); 14] = [
    (1, None, 2, 0.5),
    (1, None, 3, 2.0),
    (1, None, 4, 0.25),
    (1, Some(4), 2, 0.25),
    (1, Some(4), 3, 0.75),
    (1, Some(3), 2, 1.0 / 6.0),
    (1, Some(3), 4, 0.093_75),
    (1, Some(2), 3, 2.0 / 3.0),
    (1, Some(2), 4, 0.125),
    (2, Some(1), 3, 8.0 / 3.0),
    (2, Some(1), 4, 0.25),
    (3, Some(1), 2, 1.0 / 6.0),
    (3, Some(1), 4, 0.078_125),
    (4, Some(1), 2, 1.0),
];

/// Driven winding, shorted winding, the inductance seen in µH.
const FOUR_INDUCTANCES: [(usize, Option<usize>, f64); 4] =
    [(1, None, 250.0), (2, Some(1), 0.6), (3, Some(1), 9.6), (4, Some(1), 0.15)];

fn four(driven: usize, shorted: Option<usize>) -> String {
    let mut text = String::new();
    for (i, row) in FOUR.iter().enumerate() {
        let low = if i == 0 { "gnd".into() } else { format!("k{}", i + 1) };
        let own = row[i];
        text += &format!("a{n} -(* w{n}: {own} µH )- {low}\n", n = i + 1);
        for (j, mutual) in row.iter().enumerate().skip(i + 1) {
            text += &format!("couple w{}, w{} : M {mutual} µH\n", i + 1, j + 1);
        }
    }
    text += &format!("a{driven} -( short_test: 0 Ω )- x\n");
    let low = |n: usize| if n == 1 { "gnd".to_owned() } else { format!("k{n}") };
    text += &format!("{} -( drive: 1 V +)- x\n", low(driven));
    if let Some(n) = shorted {
        text += &format!("a{n} -( short: 0 Ω )- {}\n", low(n));
    }
    text += &format!("read i = amps(w{driven})\n");
    (1..=4).for_each(|n| text += &format!("read v{n} = drop(w{n})\n"));
    text
}

#[test]
fn a_four_winding_transformer_meets_its_eighteen_published_tests() {
    let kinds = [Kind::Mesh, Kind::Leakage, Kind::Dependent];
    for kind in kinds {
        for (driven, shorted, read, ratio) in FOUR_TESTS {
            let twin = written(&twin_of(&four(driven, shorted), &Options::new(kind)));
            let found = solve(&twin, 1e5).read(&format!("v{read}"));
            assert!((found - ratio).norm() < 1e-9, "{kind}: {driven} {shorted:?} {read}: {found}");
        }
        for (driven, shorted, microhenries) in FOUR_INDUCTANCES {
            let twin = written(&twin_of(&four(driven, shorted), &Options::new(kind)));
            let current = solve(&twin, 1e5).read("i");
            let seen = 1.0 / (TAU * 1e5 * current.norm()) * 1e6;
            assert_near(seen, microhenries, 1e-9);
        }
    }
}
