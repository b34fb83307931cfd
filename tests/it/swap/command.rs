//! The command itself: its text, its warnings and its exit codes.

use std::io::Write;
use std::process::{Command, Output, Stdio};

fn run(arguments: &[&str], input: &[u8]) -> Output {
    let mut child = Command::new(env!("CARGO_BIN_EXE_bifilar"))
        .args(arguments)
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program starts");
    child.stdin.take().expect("a pipe").write_all(input).expect("the input is taken");
    child.wait_with_output().expect("the program ends")
}

#[test]
fn a_twin_can_be_piped_on() {
    for kind in ["tee", "pi", "mesh", "leakage", "dependent"] {
        let twin = run(&["swap", "circuits/inverter_choke.bfl", "--into", kind, "--explain"], b"");
        assert_eq!(twin.status.code(), Some(0));
        assert!(twin.stdout.starts_with(b"# Twin of inverter_choke.bfl:"));
        assert!(twin.stderr.is_empty(), "{}", String::from_utf8_lossy(&twin.stderr));
        let checked = run(&["check", "-"], &twin.stdout);
        assert_eq!(checked.status.code(), Some(0), "{}", String::from_utf8_lossy(&checked.stderr));
    }
}

#[test]
fn the_caution_about_isolation_appears_where_islands_are_joined_and_only_there() {
    let caution = |more: &[&str]| {
        let base = ["swap", "circuits/hull_charger.bfl", "--into"];
        let twin = run(&[&base, more].concat(), b"");
        assert_eq!(twin.status.code(), Some(0));
        String::from_utf8_lossy(&twin.stderr).contains("never build it in place of an isolating")
    };
    assert!(caution(&["tee"]));
    assert!(caution(&["mesh"]));
    assert!(caution(&["pi", "--tie", "gnd,keel"]));
    assert!(!caution(&["tee", "--keep-isolation"]));
    assert!(!caution(&["pi", "--ratio", "auto"]));
    assert!(!caution(&["leakage"]));
    assert!(!caution(&["dependent"]));
}

#[test]
fn what_is_refused_ends_with_code_two_and_the_way_out() {
    let refused = run(&["swap", "circuits/isolating_supply.bfl", "--into", "tee"], b"");
    assert_eq!(refused.status.code(), Some(2));
    assert!(refused.stdout.is_empty());
    let words = String::from_utf8_lossy(&refused.stderr).into_owned();
    assert!(words.contains("this set has 3") && words.contains("help: use `mesh`"), "{words}");
    let unknown = run(&["swap", "circuits/isolating_supply.bfl", "--into", "delta"], b"");
    assert_eq!(unknown.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&unknown.stderr).contains("tee, pi, mesh"));
}
