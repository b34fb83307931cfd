//! Proofs: circuits that agree at every frequency are proved to, all others are told apart, and
//! what cannot be decided is called undecided.

use bifilar::circuit::Circuit;
use bifilar::study::pair::{Correspondence, Matching};
use bifilar::study::prove::{self, Difference, Options, Proof, Verdict};

#[track_caller]
fn circuit(text: &str) -> Circuit {
    let made = crate::support::circuit(text, std::path::Path::new("circuits"), &[]);
    made.unwrap_or_else(|words| panic!("{words}\n{text}")).0
}

/// The proof for two texts, by names.
#[track_caller]
fn prove(first: &str, second: &str) -> Proof {
    let (first, second) = (circuit(first), circuit(second));
    let same = Correspondence::by_names(&first, &second);
    let matching = Matching::new(&first, &second, &same);
    let options = Options { seed: Some(5), frequencies_hz: Vec::new() };
    prove::decide(&first, &second, &matching.matched, &options)
}

#[track_caller]
fn identical(first: &str, second: &str) -> Proof {
    let proof = prove(first, second);
    assert!(matches!(proof.verdict, Verdict::Identical { .. }), "{proof:#?}");
    assert!(proof.log2_error_bound <= -100.0 && proof.rounds >= 2, "{proof:?}");
    proof
}

#[track_caller]
fn different(first: &str, second: &str) -> Difference {
    match prove(first, second).verdict {
        Verdict::Different(difference) => difference,
        other => panic!("{other:?}"),
    }
}

#[track_caller]
fn undecided(first: &str, second: &str) -> String {
    match prove(first, second).verdict {
        Verdict::Undecided(why) => why,
        other => panic!("{other:?}"),
    }
}

/// A pair with like ends at `gnd`, L1 = 8 H, L2 = 4.5 H, M = 2 H, driven and loaded.
const COUPLED: &str = "
gnd -( drive: 10 V +)- in -( inner: 3 Ω )- a -(* one: 8 H )- gnd
b -(* two: 4.5 H )- gnd
b -( load: 50 Ω )- gnd
couple one, two : M 2 H
read transfer = volts(b) / volts(in)
read loss = re(power(load))
read size = abs(volts(b))
";

fn tee(la: &str, lb: &str, lm: &str) -> String {
    format!(
        "
gnd -( drive: 10 V +)- in -( inner: 3 Ω )- a -( la: {la} )- star -( lm: {lm} )- gnd
star -( lb: {lb} )- b -( load: 50 Ω )- gnd
read transfer = volts(b) / volts(in)
read loss = re(power(load))
read size = abs(volts(b))
"
    )
}

#[test]
fn a_tee_of_the_right_legs_is_identical() {
    let proof = identical(COUPLED, &tee("6 H", "2.5 H", "2 H"));
    assert_eq!(proof.verdict, Verdict::Identical { for_any_sources: true });
}

#[test]
fn a_pi_of_the_right_legs_is_identical() {
    // D = 8·4.5 − 4 = 32; legs D/(L2 − M), D/(L1 − M), D/M
    let pi = "
gnd -( drive: 10 V +)- in -( inner: 3 Ω )- a -( pa: (32/2.5) H )- gnd
a -( pm: 16 H )- b -( pb: (32/6) H )- gnd
b -( load: 50 Ω )- gnd
read transfer = volts(b) / volts(in)
read loss = re(power(load))
read size = abs(volts(b))
";
    identical(COUPLED, pi);
}

#[test]
fn the_handbook_tee_and_pi_of_a_pair_are_identical_to_it() {
    // L1 = 4, L2 = 9, M = 3 mH: tee 1, 6, 3 mH and pi 4.5, 9, 27 mH (Terman; Guillemin).
    let ends = "gnd -( drive: 10 V +)- in -( inner: 5 Ω )- a\nb -( load: 20 Ω )- gnd\n";
    let pair = "a -(* one: 4 mH )- gnd\nb -(* two: 9 mH )- gnd\ncouple one, two : M 3 mH\n";
    let tee = "a -( la: 1 mH )- star -( lb: 6 mH )- b\nstar -( lm: 3 mH )- gnd\n";
    let pi = "a -( pa: 4.5 mH )- gnd\na -( pm: 9 mH )- b\nb -( pb: 27 mH )- gnd\n";
    let [pair, tee, pi] = [pair, tee, pi].map(|middle| format!("{ends}{middle}"));
    identical(&pair, &tee);
    identical(&pair, &pi);
    identical(&tee, &pi);
}

#[test]
fn a_leg_moved_by_a_millionth_is_told_apart() {
    for (la, lb, lm) in [
        ("6.000006 H", "2.5 H", "2 H"),
        ("6 H", "2.4999975 H", "2 H"),
        ("6 H", "2.5 H", "2.000002 H"),
    ] {
        let Difference::Quantity { shows_best: Some(showing), .. } =
            different(COUPLED, &tee(la, lb, lm))
        else {
            panic!("no frequency is shown");
        };
        assert!(showing.relative > 1e-8 && showing.relative < 1e-4, "{showing:?}");
        assert!(showing.beyond_error, "{showing:?}");
    }
}

#[test]
fn a_leg_moved_by_less_than_doubles_can_tell_is_told_apart() {
    different(COUPLED, &tee("6.0000000000000000000000000001 H", "2.5 H", "2 H"));
}

#[test]
fn a_difference_of_one_dot_is_told_apart() {
    let turned = COUPLED.replace("b -(* two: 4.5 H )- gnd", "b -( two: 4.5 H *)- gnd");
    different(COUPLED, &turned);
    identical(&turned, &tee("10 H", "6.5 H", "-2 H"));
}

#[test]
fn k_of_a_perfect_square_is_identical_to_its_mutual_inductance() {
    // √(8·4.5) = 6
    identical(COUPLED, &COUPLED.replace("M 2 H", "k 1/3"));
    different(COUPLED, &COUPLED.replace("M 2 H", "k 0.3333333333333333333"));
}

#[test]
fn roots_that_are_not_rational_are_followed() {
    let by_k = COUPLED.replace("8 H", "7 H").replace("M 2 H", "k 0.31");
    let legs = |k: &str| {
        let m = format!("{k}*sqrt(7 H * 4.5 H)");
        tee(&format!("7 H - {m}"), &format!("4.5 H - {m}"), &m)
    };
    identical(&by_k, &legs("0.31"));
    different(&by_k, &legs("0.3100001"));
    different(&by_k, &legs("-0.31"));
    // √(7·4.5) = √7·√4.5 = 3·√14/2
    let apart = "0.31 * sqrt(7 H) * sqrt(4.5 H)";
    identical(&by_k, &tee(&format!("7 H - {apart}"), &format!("4.5 H - {apart}"), apart));
    let merged = "0.31 * 1.5 H * sqrt(14)";
    identical(&by_k, &tee(&format!("7 H - {merged}"), &format!("4.5 H - {merged}"), merged));
}

#[test]
fn a_leakage_reading_is_followed_through_its_root() {
    let stated = COUPLED.replace("M 2 H", "leakage 7.1 H at one");
    let m = "sqrt(4.5 H * (8 H - 7.1 H))";
    identical(&stated, &tee(&format!("8 H - {m}"), &format!("4.5 H - {m}"), m));
}

#[test]
fn inductances_computed_with_pi_have_roots_too() {
    let l = "(4e-7 * pi * 2500) H";
    let by_k = COUPLED.replace("8 H", l).replace("4.5 H", "(pi / 700) H").replace("M 2 H", "k 0.4");
    let m = "0.4 * pi * sqrt(4e-7 * 2500 / 700) * 1 H";
    identical(&by_k, &tee(&format!("{l} - {m}"), &format!("(pi / 700) H - {m}"), m));
}

#[test]
fn a_root_of_the_frequency_is_followed() {
    let skin = |r: &str| COUPLED.replace("3 Ω", r);
    identical(&skin("3 Ω * sqrt(f / 1 kHz)"), &skin("3 Ω * sqrt(f) / sqrt(1 kHz)"));
    different(&skin("3 Ω * sqrt(f / 1 kHz)"), &skin("3.00001 Ω * sqrt(f / 1 kHz)"));
}

#[test]
fn losses_are_followed() {
    let lossy = |q: &str| {
        COUPLED.replace("one: 8 H", &format!("one: 8 H{q}"))
            + "in -( shunt: 4 µF, tand 0.002 )- gnd\nb -( block: 3 µF, esr 20 mΩ )- gnd\n"
    };
    let hand = |r: &str| {
        tee("6 H", "2.5 H", "2 H").replace("a -( la", &format!("a -( ra: {r} )- mid -( la"))
            + "in -( shunt: (0.002 - 1j)/(2*pi*f*4 µF) )- gnd\n"
            + "b -( esr: 20 mΩ )- c -( block: 3 µF )- gnd\n"
    };
    let pair = [lossy(", q 80"), hand("2*pi*f*8 H/80")];
    // The drop of the capacitor alone is not that of the lossy one.
    let named = |text: &str| text.replace("block", "blocker");
    identical(&pair[0], &named(&pair[1]));
    different(&pair[0], &named(&hand("2*pi*f*8 H/80.0001")));
    identical(&lossy(", q 80 at 1 kHz"), &named(&hand("2*pi*1 kHz*8 H/80")));
    identical(&lossy(", esr 5 Ω"), &named(&hand("5 Ω")));
}

#[test]
fn phasor_sources_stay_inside() {
    let phasor = |text: &str| text.replace("10 V", "10 V ∠ 30°");
    identical(&phasor(COUPLED), &phasor(&tee("6 H", "2.5 H", "2 H")));
    different(&phasor(COUPLED), &phasor(&tee("6 H", "2.500001 H", "2 H")));
}

#[test]
fn sources_of_one_name_and_other_values_are_different() {
    different(COUPLED, &COUPLED.replace("10 V", "10.001 V"));
    different(COUPLED, &COUPLED.replace("10 V", "10 Vpk"));
    identical(COUPLED, &COUPLED.replace("10 V", "20 V / 2"));
}

#[test]
fn sources_of_other_names_count_with_their_values() {
    let renamed = COUPLED.replace("drive", "feed");
    let proof = identical(COUPLED, &renamed);
    assert_eq!(proof.verdict, Verdict::Identical { for_any_sources: false });
    different(COUPLED, &renamed.replace("10 V", "11 V"));
}

#[test]
fn what_holds_for_the_sources_written_only_is_said() {
    let two = |r: &str| {
        format!(
            "gnd -( u: 5 V +)- a -( ra: 1 Ω )- m -( rm: 7 Ω )- gnd
gnd -( w: 5 V +)- b -( rb: 1 Ω )- m
a -( bridge: {r} )- b
read middle = volts(m)"
        )
    };
    // No current flows in the bridge while both sources are equal; the sources' own would change.
    let proof = prove(&two("1 Ω"), &two("2 Ω"));
    assert_eq!(proof.verdict, Verdict::Identical { for_any_sources: false }, "{proof:?}");
}

#[test]
fn measured_data_is_undecided_and_named() {
    let ballast = crate::support::file("circuits/lamp_ballast.bfl");
    let why = undecided(&ballast, &ballast);
    assert!(why.contains("choke"), "{why}");
}

#[test]
fn other_functions_prove_equality_and_never_difference() {
    let with = |r: &str| COUPLED.replace("3 Ω", r);
    identical(&with("3 Ω * exp(-0.5)"), &with("3 Ω * exp(1/2 - 1)"));
    identical(&with("abs(3 Ω + 4j Ω * f / 1 kHz)"), &with("abs(4j Ω * f / 1 kHz + 3 Ω)"));
    let why = undecided(&with("3 Ω * exp(-0.5)"), &with("3 Ω * exp(-0.51)"));
    assert!(why.contains("functions"), "{why}");
    // Equal in truth, which the field does not know.
    undecided(&with("3 Ω * sin(0.3)"), &with("3 Ω * cos(pi/2 - 0.3)"));
    undecided(&with("3 Ω"), &with("3 Ω * exp(0)"));
}

#[test]
fn a_circuit_without_any_solution_is_told_from_one_with() {
    // Two ideal sources across one node pair, equal at every frequency, share no definite current.
    let one = "gnd -( u: 5 V +)- a -( r: 1 Ω )- gnd";
    let proof = prove(&format!("{one}\ngnd -( w: 5 V +)- a"), one);
    let difference = Verdict::Different(Difference::Solvable { first: false });
    assert_eq!(proof.verdict, difference, "{proof:?}");
    assert!(proof.log2_error_bound <= -100.0);
}

#[test]
fn thirty_windings_coupled_by_k_are_proved_quickly() {
    let mut text = String::from("gnd -( drive: 1 V +)- n0 -( w0r: 1 Ω )- m0 -(* w0: 1 mH )- gnd\n");
    for i in 1..30 {
        text += &format!("n{i} -(* w{i}: {}.{i} mH )- gnd\nn{i} -( r{i}: 10 Ω )- gnd\n", 1 + i % 7);
    }
    let names: Vec<_> = (0..30).map(|i| format!("w{i}")).collect();
    text += &format!("couple {} : k 0.3\n", names.join(", "));
    let start = std::time::Instant::now();
    identical(&text, &text.replace("k 0.3", "k 3/10"));
    assert!(start.elapsed().as_secs() < 10, "{:?}", start.elapsed());
}

#[test]
fn five_hundred_elements_are_proved_quickly() {
    let ladder = |order: &dyn Fn(usize) -> usize| {
        let mut text = String::from("gnd -( drive: 1 V +)- n0\n");
        for i in (0..125).map(order) {
            let j = i + 1;
            text += &format!(
                "n{i} -(* p{i}: {}.{i} µH )- x{i} -( r{i}: 0.{j} Ω )- n{j}
n{j} -(* s{i}: 33 µH )- gnd
n{j} -( c{i}: {j}00 pF )- gnd
couple p{i}, s{i} : k 0.4\n",
                10 + i % 13
            );
        }
        text
    };
    let start = std::time::Instant::now();
    identical(&ladder(&|i| i), &ladder(&|i| 124 - i));
    assert!(start.elapsed().as_secs() < 10, "{:?}", start.elapsed());
}
