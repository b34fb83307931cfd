//! Two circuits across a band: worst differences and the edges of bands against closed forms.

use bifilar::circuit::Circuit;
use bifilar::study::compare::{self, Comparison, Plan};
use bifilar::study::grid::{Spacing, band};
use bifilar::study::pair::{Correspondence, Matching};
use std::f64::consts::PI;

#[track_caller]
fn circuit(text: &str) -> Circuit {
    let made = crate::support::circuit(text, std::path::Path::new("."), &[]);
    made.unwrap_or_else(|words| panic!("{words}\n{text}")).0
}

#[track_caller]
fn compared(first: &str, second: &str, plan: &Plan) -> Comparison {
    let (first, second) = (circuit(first), circuit(second));
    let same = Correspondence::by_names(&first, &second);
    let matching = Matching::new(&first, &second, &same);
    let mut found = compare::run(&first, &second, &matching.matched, plan)
        .unwrap_or_else(|error| panic!("{error:?}"));
    found.unmatched = matching.unmatched;
    found
}

fn over(from_hz: f64, to_hz: f64, per_decade: usize, within: f64) -> Plan {
    let spacing = Spacing::PerDecade(per_decade);
    Plan { frequencies_hz: band(from_hz, to_hz, spacing).unwrap(), band: true, within }
}

/// 1 V through 1 kΩ into 1 kΩ beside a part.
fn divider(part: &str) -> String {
    format!(
        "gnd -( u: 1 V +)- in -( r: 1 kΩ )- out\nout -( load: 1 kΩ )- gnd\n{part}\n\
         read gain = volts(out) / volts(in)"
    )
}

#[test]
fn a_circuit_agrees_with_itself_exactly() {
    let text = divider("out -( c: 10 nF )- gnd");
    let found = compared(&text, &text, &over(10.0, 1e6, 10, 1e-9));
    assert!(found.pass && found.unmatched.is_empty() && found.notes.is_empty(), "{found:?}");
    assert_eq!(found.bands.len(), 1);
    assert_eq!((found.bands[0].from_hz, found.bands[0].to_hz), (10.0, 1e6));
    assert!(found.quantities.iter().all(|q| q.relative == 0.0));
    let names: Vec<_> = found.quantities.iter().map(|q| q.quantity.as_str()).collect();
    for name in ["volts(in)", "volts(out)", "amps(load)", "drop(c)", "gain"] {
        assert!(names.contains(&name), "{name} in {names:?}");
    }
}

#[test]
fn the_edge_of_the_band_over_which_a_dropped_part_does_not_matter_is_bisected() {
    // With C beside the load: out = 0.5/(1 + jωτ), τ = C·500 Ω. Without: 0.5. The larger is the
    // latter, so the relative difference of `out` is x/√(1 + x²), x = ωτ: 0.1 at x = 0.1/√0.99.
    let with = divider("out -( c: 10 nF )- gnd");
    let found = compared(&with, &divider(""), &over(10.0, 1e6, 3, 0.1));
    assert!(!found.pass);
    let of_out = |edge: f64| 0.1 / 0.99f64.sqrt() / (2.0 * PI * 5e-6) - edge;
    // The current of the source differs first: i = (1/2kΩ)(1 + jωCR)/(1 + jωτ) with R = 1 kΩ;
    // |Δ|/i = x/√(1 + 4x²) is 0.1 at x = 0.1/√0.96. `out` is first with x/√(1 + x²).
    assert_eq!(found.bands.len(), 2, "{:?}", found.bands);
    let edge = found.bands[0].to_hz;
    assert!(found.bands[0].pass && !found.bands[1].pass);
    assert_eq!(found.bands[1].from_hz, edge);
    assert!(of_out(edge).abs() < 1e-6 * edge, "{edge} is off by {}", of_out(edge));
    assert_eq!(found.unmatched, ["element `c` is in the first circuit only"]);
}

#[test]
fn a_narrow_band_between_two_listed_points_is_found() {
    // A trap at 1 kHz; at its resonance the load is shorted but for 1 Ω.
    let trap =
        |l: &str| divider(&format!("out -( l: {l} )- x -( c: 25.330296 nF )- y -( s: 1 Ω )- gnd"));
    let found = compared(&trap("1 H"), &trap("1.01 H"), &over(1.0, 1e6, 2, 0.5));
    assert!(!found.pass);
    assert_eq!(found.bands.iter().filter(|b| !b.pass).count(), 1, "{:?}", found.bands);
    let failing = found.bands.iter().find(|b| !b.pass).unwrap();
    assert!(failing.from_hz > 900.0 && failing.to_hz < 1100.0, "{failing:?}");
    let worst = &found.quantities[found.worst.unwrap()];
    assert!(worst.frequency_hz > 950.0 && worst.frequency_hz < 1050.0, "{worst:?}");
}

#[test]
fn differences_are_relative_to_the_larger_of_both() {
    let with = |r: &str| divider(&format!("out -( x: {r} )- gnd"));
    let plan = Plan { frequencies_hz: vec![1e3], band: false, within: 1e-3 };
    let found = compared(&with("1 kΩ"), &with("500 Ω"), &plan);
    let gain = found.quantities.iter().find(|q| q.quantity == "gain").unwrap();
    // 1/3 against 1/4
    assert!((gain.relative - 0.25).abs() < 1e-12, "{gain:?}");
    assert_eq!(found.bands.len(), 1);
    assert_eq!((found.bands[0].from_hz, found.bands[0].pass), (1e3, false));
}

#[test]
fn a_quantity_far_below_the_largest_of_its_kind_is_judged_against_the_floor() {
    let with = |tiny: &str| divider(&format!("out -( x: {tiny} )- far -( y: 1 Ω )- gnd"));
    let plan = Plan { frequencies_hz: vec![1e3], band: false, within: 1e-2 };
    // The drop of `y` is 0.5 pV or 1 pV: far below 1e-9 of a volt.
    let found = compared(&with("1e12 Ω"), &with("2e12 Ω"), &plan);
    let far = found.quantities.iter().find(|q| q.quantity == "volts(far)").unwrap();
    assert!((far.relative - 0.25e-12 / 1e-9).abs() < 1e-9, "{far:?}");
    assert!(far.pass);
}

#[test]
fn islands_are_compared_within_themselves() {
    let pair = |reference: &str| {
        format!(
            "gnd -( u: 1 V +)- in -(* one: 1 mH )- gnd\nkeel -(* two: 2 mH )- bus\n\
             bus -( load: 5 Ω )- keel\ncouple one, two : k 0.5\nreference {reference}"
        )
    };
    let found = compared(&pair("keel"), &pair("bus"), &over(1e3, 1e5, 5, 1e-9));
    assert!(found.pass, "{found:?}");
    let names: Vec<_> = found.quantities.iter().map(|q| q.quantity.as_str()).collect();
    assert!(names.contains(&"volts(bus)") && !names.contains(&"volts(keel)"), "{names:?}");
}

#[test]
fn a_frequency_only_one_circuit_can_be_solved_at_fails_and_is_said() {
    let loop_of_windings =
        "gnd -( u: 1 V +)- in -( r: 1 Ω )- a\na -( l: 1 H )- gnd\na -( m: 1 H )- gnd";
    let second = loop_of_windings.replace("m: 1 H", "m: 1 Ω");
    let plan = Plan { frequencies_hz: vec![0.0, 50.0], band: false, within: 10.0 };
    let found = compared(loop_of_windings, &second, &plan);
    assert!(!found.pass);
    assert!(!found.bands[0].pass && found.bands[1].pass, "{:?}", found.bands);
    assert!(found.notes[0].contains("first circuit alone has no solution at 0 Hz"));
}
