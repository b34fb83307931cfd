//! When islands may be joined, and what is said about it.

use crate::swap::agree::{assert_agrees, read, refusal, twin_of, written};
use bifilar::circuit::Circuit;
use bifilar::circuit::island::{Islands, Regime};
use bifilar::swap::{Condition, Kind, Options, Reason, SwapError};

/// Two windings on two islands.
const LINK: &str = "gnd -( e: 10 V +)- in -( r: 2 Ω )- a -(* dock: 24 µH )- gnd\n\
                    keel -(* buoy: 19 µH )- bus -( load: 12 Ω )- keel\n\
                    couple dock, buoy : k 0.3\nreference keel\n\
                    read v = volts(bus)\nread i = amps(buoy)\n";

fn islands(circuit: &Circuit) -> usize {
    let islands = Islands::find(circuit, Regime::Alternating);
    let mut tied = vec![false; islands.reference.len()];
    for element in &circuit.elements {
        tied[islands.of_node[element.left.index()]] = true;
    }
    tied.iter().filter(|tied| **tied).count()
}

#[test]
fn two_islands_are_joined_once_and_the_reader_is_warned() {
    for kind in [Kind::Tee, Kind::Pi, Kind::Mesh] {
        let twin = twin_of(LINK, &Options::new(kind));
        assert!(matches!(&twin.records[0].condition, Condition::Tied(ties) if ties.len() == 1));
        assert!(twin.records[0].isolation_lost);
        assert!(twin.warnings.iter().any(|w| w.contains("never build it")), "{:?}", twin.warnings);
        assert_eq!(islands(&twin.circuit), 1);
        assert_agrees(&read(LINK), &twin, 85e3, 1e-9);
    }
}

#[test]
fn what_keeps_islands_apart_is_not_warned_about() {
    for kind in [Kind::Leakage, Kind::Dependent] {
        let twin = twin_of(LINK, &Options::new(kind));
        assert!(twin.warnings.is_empty(), "{:?}", twin.warnings);
        assert!(!twin.records[0].isolation_lost);
        assert_eq!(islands(&twin.circuit), 2);
        assert!(written(&twin).contains("reference keel"));
    }
    for kind in [Kind::Tee, Kind::Pi] {
        let options = Options { keep_isolation: true, ..Options::new(kind) };
        let twin = twin_of(LINK, &options);
        let expected = Condition::Transformer(Reason::KeepIsolation);
        assert_eq!(twin.records[0].condition, expected);
        assert!(twin.warnings.is_empty(), "{:?}", twin.warnings);
        assert_eq!(islands(&twin.circuit), 2);
        assert_agrees(&read(LINK), &twin, 85e3, 1e-9);
    }
    let joined = LINK.replace("keel", "gnd").replace("reference gnd\n", "");
    let twin = twin_of(&joined, &Options::new(Kind::Tee));
    assert_eq!(twin.records[0].condition, Condition::Shared("gnd".into()));
    assert!(twin.warnings.is_empty());
}

#[test]
fn the_tie_can_be_chosen() {
    for (tie, common) in [(("gnd", "keel"), -1.0), (("bus", "gnd"), 1.0), (("a", "keel"), 1.0)] {
        let options =
            Options { tie: Some((tie.0.into(), tie.1.into())), ..Options::new(Kind::Tee) };
        let twin = twin_of(LINK, &options);
        let leg = twin.records[0].legs.iter().find(|leg| leg.name == "dock_buoy_common");
        let value = leg.and_then(|leg| leg.value).expect("a constant leg");
        assert_eq!(value.signum(), common, "{tie:?}");
        assert_agrees(&read(LINK), &twin, 85e3, 1e-9);
        let mesh = twin_of(LINK, &Options { into: Kind::Mesh, ..options });
        assert_agrees(&read(LINK), &mesh, 85e3, 1e-9);
    }
}

#[test]
fn a_reading_keeps_its_reference_where_islands_are_joined_elsewhere() {
    let options = Options { tie: Some(("bus".into(), "gnd".into())), ..Options::new(Kind::Tee) };
    let text = written(&twin_of(LINK, &options));
    assert!(text.contains("= volts(gnd to keel)"), "{text}");
    assert!(text.contains("gnd == bus"), "{text}");
}

/// Two transformers between the same two islands, with no node in common.
const TWO_SETS: &str = "gnd -( e: 10 V +)- in -( r: 2 Ω )- a -(* w1: 24 mH )- b -( rb: 7 Ω )- gnd\n\
                        b -(* w3: 3 mH )- c -( rc: 11 Ω )- gnd\n\
                        k -(* w2: 19 mH )- l -( load: 12 Ω )- k\n\
                        l -( rm: 5 Ω )- m -(* w4: 8 mH )- n -( rn: 9 Ω )- k\n\
                        couple w1, w2 : k 0.6\ncouple w3, w4 : k -0.7\n";

#[test]
fn a_second_tie_between_the_same_islands_is_never_made() {
    for kind in [Kind::Tee, Kind::Pi] {
        let twin = twin_of(TWO_SETS, &Options::new(kind));
        let conditions: Vec<_> = twin.records.iter().map(|r| &r.condition).collect();
        assert!(matches!(conditions[0], Condition::Tied(_)), "{conditions:?}");
        assert_eq!(*conditions[1], Condition::Transformer(Reason::Loop));
        for frequency_hz in [50.0, 700.0] {
            assert_agrees(&read(TWO_SETS), &twin, frequency_hz, 1e-9);
        }
    }
    let twin = twin_of(TWO_SETS, &Options::new(Kind::Mesh));
    let ties = twin.records.iter().map(|record| match &record.condition {
        Condition::Tied(ties) => ties.len(),
        _ => 0,
    });
    assert_eq!(ties.sum::<usize>(), 1);
    assert_agrees(&read(TWO_SETS), &twin, 700.0, 1e-9);
}

#[test]
fn a_second_set_may_use_the_node_that_was_joined() {
    // Both secondaries begin at k, both primaries at gnd.
    let text = "gnd -( e: 10 V +)- in -( r: 2 Ω )- a -(* w1: 24 mH )- gnd\n\
                in -( r3: 5 Ω )- c -(* w3: 3 mH )- gnd\n\
                l -(* w2: 19 mH )- k -( load: 12 Ω )- l\nm -(* w4: 8 mH )- k; m -( rm: 9 Ω )- l\n\
                couple w1, w2 : k 0.6\ncouple w3, w4 : k 0.7\nreference k\n";
    let twin = twin_of(text, &Options::new(Kind::Tee));
    assert_eq!(twin.records[0].condition, Condition::Tied(vec![("gnd".into(), "k".into())]));
    assert!(matches!(twin.records[1].condition, Condition::Shared(_)));
    assert_agrees(&read(text), &twin, 700.0, 1e-9);
}

#[test]
fn a_capacitor_between_the_islands_makes_a_tie_a_loop() {
    let text = format!("{LINK}keel -( stray: 100 pF )- in\n").replace("reference keel\n", "");
    let twin = twin_of(&text, &Options::new(Kind::Tee));
    assert_eq!(twin.records[0].condition, Condition::Transformer(Reason::Loop));
    assert!(twin.warnings.is_empty(), "{:?}", twin.warnings);
    assert_agrees(&read(&text), &twin, 85e3, 1e-9);
    let options = Options { tie: Some(("gnd".into(), "keel".into())), ..Options::new(Kind::Tee) };
    assert_eq!(
        refusal(&text, &options),
        SwapError::TieMakesLoop { first: "gnd".into(), second: "keel".into() }
    );
}
