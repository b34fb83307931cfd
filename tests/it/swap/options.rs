//! Ratio, rounding, dropping, choosing a set; special values.

use crate::support::solve;
use crate::swap::agree::{assert_agrees, read, twin_of, written};
use bifilar::swap::{Fate, Kind, Options, Purchase, Ratio, Series};

/// A pair closer coupled than √(L2/L1): its tee has a negative leg.
const CLOSE: &str = "gnd -( e: 10 V +)- in -( r: 2 Ω )- a -(* w1: 24 mH, esr 1 Ω )- gnd\n\
                     k -( w2: 3 mH, q 40 at 1 kHz *)- b -( load: 12 Ω )- k\n\
                     read v = drop(w2)\nread s = power(w1) + power(w2)\n";

fn close(coupling: &str) -> String {
    format!("{CLOSE}couple w1, w2 : {coupling}\n")
}

#[test]
fn a_ratio_takes_the_negative_leg_away() {
    for coupling in ["k 0.8", "k -0.8", "M 6 mH", "M 5 mH, R 30 mΩ", "k 1", "k -1"] {
        let text = close(coupling);
        let plain = twin_of(&text, &Options::new(Kind::Tee));
        let negative = |twin: &bifilar::swap::Twin| {
            let legs = &twin.records[0].legs;
            legs.iter().filter(|leg| leg.purchase == Purchase::Negative).count()
        };
        assert!(negative(&plain) > 0, "{coupling}");
        for kind in [Kind::Tee, Kind::Pi] {
            if kind == Kind::Pi && coupling.contains('1') {
                continue;
            }
            let options = Options { ratio: Some(Ratio::Auto), ..Options::new(kind) };
            let twin = twin_of(&text, &options);
            assert_eq!(negative(&twin), 0, "{coupling}: {:?}", twin.records[0].legs);
            assert!(twin.warnings.is_empty());
            assert_agrees(&read(&text), &twin, 1.3e3, 1e-9);
        }
    }
}

#[test]
fn any_ratio_is_exact_and_one_outside_its_range_is_said() {
    for (n, warned) in [(3.0, false), (1.0, true), (-3.0, true), (20.0, true)] {
        for kind in [Kind::Tee, Kind::Pi] {
            let options = Options { ratio: Some(Ratio::Turns(n)), ..Options::new(kind) };
            let twin = twin_of(&close("k 0.8"), &options);
            assert_eq!(!twin.warnings.is_empty(), warned, "{n}: {:?}", twin.warnings);
            assert_agrees(&read(&close("k 0.8")), &twin, 1.3e3, 1e-9);
        }
    }
}

#[test]
fn rounded_legs_are_preferred_values_and_say_what_they_were() {
    let options = Options { round: Some(Series::E24), ..Options::new(Kind::Tee) };
    let twin = twin_of(&close("k 0.3"), &options);
    let legs = &twin.records[0].legs;
    // M = 0.3·√72 = 2.5456 mH; 24 − M and 3 − M.
    let values: Vec<_> = legs.iter().map(|leg| leg.value.expect("constant")).collect();
    assert_eq!(values, [22e-3, 0.47e-3, 2.4e-3], "{legs:?}");
    assert!(legs.iter().all(|leg| leg.rounded_from.is_some()));
    let text = written(&twin);
    assert!(text.contains("w1_leg: 22 mH"), "{text}");
    let exact = solve(&close("k 0.3"), 1e3).volts("b");
    let off = (solve(&text, 1e3).read("v") + exact).norm() / exact.norm();
    assert!(off > 1e-3 && off < 0.2, "{off}");
}

#[test]
fn a_dropped_leg_is_a_wire_or_open() {
    let drop = |name: &str| {
        let options = Options { drop: vec![name.into()], ..Options::new(Kind::Tee) };
        twin_of(&close("k 0.3"), &options)
    };
    assert_eq!(drop("w1_leg").records[0].legs[0].fate, Fate::DroppedWire);
    assert_eq!(drop("w1_w2_common").records[0].legs[2].fate, Fate::DroppedOpen);
    for name in ["w1_leg", "w2_leg", "w1_w2_common"] {
        let text = written(&drop(name));
        assert!(!text.contains(&format!("{name}:")), "{text}");
        solve(&text, 1e3);
    }
}

#[test]
fn one_set_of_several_can_be_chosen() {
    let text = format!(
        "{}x -(* w3: 1 mH )- gnd; y -(* w4: 1 mH )- gnd; a -( rx: 1 Ω )- x\n\
         y -( ry: 1 Ω )- gnd; couple w3, w4 : leakage 0.4 mH at w4\n",
        close("k 0.3")
    );
    let options = Options { only: vec!["w2".into(), "w1".into()], ..Options::new(Kind::Leakage) };
    let twin = twin_of(&text, &options);
    assert_eq!(twin.circuit.couplings.len(), 1);
    assert!(written(&twin).contains("couple w3, w4 : leakage 400 µH at w4"));
    assert_agrees(&read(&text), &twin, 1e3, 1e-9);
}

#[test]
fn windings_at_the_same_nodes_and_special_values_have_twins() {
    let parallel = "gnd -( e: 10 V +)- in -( r: 2 Ω )- a -(* w1: 24 mH )- gnd\n\
                    a -(* w2: 3 mH )- gnd\ncouple w1, w2 : k 0.5\nread i = amps(w1) / amps(w2)\n";
    let crossed = parallel.replace("a -(* w2", "gnd -(* w2").replace("3 mH )- gnd", "3 mH )- a");
    let shorted = "gnd -( e: 10 V +)- in -( r: 2 Ω )- a -(* w1: 24 mH )- gnd\n\
                   b -(* w2: 3 mH )- b; b -( rb: 1 Ω )- gnd\ncouple w1, w2 : k 0.5\n\
                   read i = amps(w2)\n";
    let equal = "gnd -( e: 10 V +)- in -( r: 2 Ω )- a -(* w1: 4 mH )- gnd\n\
                 b -(* w2: 9 mH )- gnd; b -( rb: 3 Ω )- gnd\ncouple w1, w2 : M 4 mH\n\
                 read i = amps(w1) + amps(w2)\n";
    let zero = equal.replace("M 4 mH", "M 0 H");
    let resistive = equal.replace("M 4 mH", "M 0 H, R 10 mΩ");
    let full = equal.replace("w2: 9 mH", "w2: 4 mH");
    let cases = [parallel, &crossed, shorted, equal, &zero, &resistive, &full];
    for (number, text) in cases.into_iter().enumerate() {
        for kind in Kind::ALL {
            if number == 6 && matches!(kind, Kind::Pi | Kind::Mesh) {
                continue;
            }
            let twin = twin_of(text, &Options::new(kind));
            for frequency_hz in [50.0, 3e3] {
                assert_agrees(&read(text), &twin, frequency_hz, 1e-9);
            }
        }
    }
    let twin = twin_of(equal, &Options::new(Kind::Tee));
    assert_eq!(twin.records[0].legs[0].fate, Fate::Wire);
    let twin = twin_of(equal, &Options::new(Kind::Pi));
    assert_eq!(twin.records[0].legs[1].fate, Fate::Open);
}

#[test]
fn the_text_of_a_twin_states_every_leg_as_a_formula_of_named_values() {
    let text = written(&twin_of(&close("k 0.8"), &Options::new(Kind::Tee)));
    for part in [
        "let L_w1    = 24 mH",
        "let M_w1_w2 = 0.8 * sqrt(L_w1 * L_w2)",
        "w1_R: 1 Ω",
        "w2_R: 2 * pi * 1 kHz * L_w2 / 40",
        "w1_leg: L_w1 - M_w1_w2",
        "w1_w2_common: M_w1_w2",
    ] {
        assert!(text.contains(part), "{part} in\n{text}");
    }
}
