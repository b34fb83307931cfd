//! What cannot be replaced, with the reason and the way out.

use crate::swap::agree::{refusal, twin_of};
use bifilar::swap::{Kind, Options, Ratio};

const PAIR: &str = "gnd -( e: 10 V +)- in -( r: 2 Ω )- a -(* w1: 24 mH )- gnd\n\
                    b -(* w2: 19 mH )- gnd; b -( load: 12 Ω )- gnd\n";

const THREE: &str = "gnd -( e: 10 V +)- a -(* w1: 2 mH )- gnd; b -(* w2: 3 mH )- gnd\n\
                     c -(* w3: 4 mH )- gnd; b -( rb: 2 Ω )- gnd; c -( rc: 2 Ω )- gnd\n\
                     couple w1, w2, w3 : k 0.4\n";

/// Asserts the words of a refusal: what is wrong, and the way out.
#[track_caller]
fn assert_refused(text: &str, options: &Options, message: &str, help: &str) {
    let diagnostic = refusal(text, options).diagnostic();
    assert!(diagnostic.message.contains(message), "{}", diagnostic.message);
    assert!(diagnostic.help.iter().any(|line| line.contains(help)), "{:?}", diagnostic.help);
}

fn pair(coupling: &str) -> String {
    format!("{PAIR}couple w1, w2 : {coupling}\n")
}

fn only(names: &[&str]) -> Options {
    let only = names.iter().map(|name| (*name).to_owned()).collect();
    Options { only, ..Options::new(Kind::Tee) }
}

#[test]
fn a_circuit_without_couplings_has_no_twin() {
    assert_refused(PAIR, &Options::new(Kind::Tee), "nothing to replace", "`couple`");
}

#[test]
fn a_tee_or_pi_of_three_windings_is_refused() {
    for kind in [Kind::Tee, Kind::Pi] {
        let message = format!("a {kind} replaces two windings, but this set has 3");
        assert_refused(THREE, &Options::new(kind), &message, "`mesh`, `leakage` or `dependent`");
    }
}

#[test]
fn a_pi_or_mesh_of_fully_coupled_windings_is_refused() {
    for coupling in ["k 1", "k -1", "leakage 0 H at w2"] {
        let pi = Options::new(Kind::Pi);
        assert_refused(&pair(coupling), &pi, "fully coupled (k = 1)", "use `tee`");
        let mesh = Options::new(Kind::Mesh);
        assert_refused(&pair(coupling), &mesh, "fully coupled (k = 1)", "no inverse");
        for kind in [Kind::Tee, Kind::Leakage, Kind::Dependent] {
            twin_of(&pair(coupling), &Options::new(kind));
        }
    }
    let three = THREE.replace("k 0.4", "k 1");
    assert_refused(&three, &Options::new(Kind::Mesh), "fully coupled", "`leakage`");
    twin_of(&three, &Options::new(Kind::Leakage));
}

#[test]
fn a_choice_of_windings_must_be_two_or_more_of_one_set() {
    let text = pair("k 0.3");
    assert_refused(&text, &only(&["w1"]), "one winding is not enough", "`--only dock,buoy`");
    assert_refused(&text, &only(&["w1", "lod"]), "no winding `lod`", "did you mean `load`");
    assert_refused(&text, &only(&["w1", "load"]), "coupled to nothing", "of one set");
    let more = format!(
        "{text}x -(* w3: 1 mH )- gnd; y -(* w4: 1 mH )- gnd; x -( rx: 1 Ω )- gnd\n\
         y -( ry: 1 Ω )- gnd; couple w3, w4 : k 0.1\n"
    );
    assert_refused(&more, &only(&["w1", "w3"]), "different sets", "of one set");
}

#[test]
fn options_that_do_not_fit_the_kind_are_refused() {
    let text = pair("k 0.3");
    for kind in [Kind::Mesh, Kind::Leakage, Kind::Dependent] {
        let options = Options { ratio: Some(Ratio::Auto), ..Options::new(kind) };
        assert_refused(&text, &options, "belongs to a tee or a pi", "ratios");
    }
    let options = Options { ratio: Some(Ratio::Turns(0.0)), ..Options::new(Kind::Tee) };
    assert_refused(&text, &options, "other than zero", "auto");
    let options = Options { keep_isolation: true, ..Options::new(Kind::Mesh) };
    assert_refused(&text, &options, "joins the islands", "`leakage`");
    let tie = Some(("gnd".into(), "b".into()));
    let options = Options { tie: tie.clone(), ..Options::new(Kind::Leakage) };
    assert_refused(&text, &options, "needs no tie", "leave");
    let options = Options { tie, ..Options::new(Kind::Tee) };
    assert_refused(&text, &options, "would close a loop", "leave `--tie` out");
    let options =
        Options { tie: Some(("gnd".into(), "nowhere".into())), ..Options::new(Kind::Tee) };
    assert!(refusal(&text, &options).to_string().contains("no node `nowhere`"));
}

#[test]
fn a_tie_that_meets_no_set_is_refused() {
    let text = "gnd -( e: 10 V +)- a -(* w1: 24 mH )- gnd\n\
                k -(* w2: 19 mH )- b -( load: 12 Ω )- c -( more: 1 Ω )- k\n\
                couple w1, w2 : k 0.3\n";
    let options = Options { tie: Some(("gnd".into(), "c".into())), ..Options::new(Kind::Tee) };
    assert_refused(text, &options, "no set that needs a tie", "one end of each winding");
}

#[test]
fn turns_that_depend_on_the_frequency_are_refused() {
    let text = format!("{PAIR}couple w1, w2 : M 3 mH / (1 + f / 1 kHz)\n");
    assert_refused(&text, &Options::new(Kind::Leakage), "depend on the frequency", "`dependent`");
    let options = Options { ratio: Some(Ratio::Auto), ..Options::new(Kind::Tee) };
    assert_refused(&text, &options, "depends on the frequency", "as a number");
    for kind in [Kind::Tee, Kind::Pi, Kind::Mesh, Kind::Dependent] {
        let twin = twin_of(&text, &Options::new(kind));
        let circuit = crate::swap::agree::read(&text);
        crate::swap::agree::assert_agrees(&circuit, &twin, 730.0, 1e-9);
    }
}

#[test]
fn a_leg_that_is_not_there_cannot_be_dropped() {
    let options = Options { drop: vec!["w1_lag".into()], ..Options::new(Kind::Tee) };
    assert_refused(&pair("k 0.3"), &options, "no leg `w1_lag`", "did you mean `w1_leg`");
}
