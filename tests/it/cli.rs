//! The program as it is called: exit codes, what goes where, and the shapes of its outputs.

use serde_json::Value;
use std::io::{BufRead, BufReader, Write};
use std::path::PathBuf;
use std::process::{Command, Stdio};

/// A divider with a coupled side, low voltages, one limit that holds.
const DIVIDER: &str = "\
title \"Small link\"
let R = 3 kΩ
gnd -( u: 9 V +)- in -( top: R )- mid -( low: 6 kΩ )( shunt: 10 nF )- gnd
mid -(* first: 10 mH, q 50 )- gnd
far -(* second: 40 mH, q 50 )( load: 5 kΩ )- near
couple first, second : k 0.5
reference near
read mid = volts(mid)
read lost = re(power(top)), most 1 W
";

/// The same with a limit that does not hold.
fn missing_a_limit() -> String {
    DIVIDER.replace("most 1 W", "most 1 nW")
}

struct Ran {
    code: Option<i32>,
    out: String,
    err: String,
}

fn command(arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_bifilar"));
    command.args(arguments).current_dir(env!("CARGO_MANIFEST_DIR"));
    command.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped());
    command
}

/// Runs the program with a text on its standard input.
fn piped(input: &[u8], arguments: &[&str]) -> Ran {
    let mut child = command(arguments).spawn().expect("the program starts");
    // A program that refuses its arguments may end before it reads.
    let _ = child.stdin.take().expect("a pipe").write_all(input);
    let output = child.wait_with_output().expect("the program ends");
    let text = |bytes| String::from_utf8(bytes).expect("the output is UTF-8");
    Ran { code: output.status.code(), out: text(output.stdout), err: text(output.stderr) }
}

/// Runs the program on the divider.
fn on_divider(arguments: &[&str]) -> Ran {
    piped(DIVIDER.as_bytes(), arguments)
}

/// A run that must succeed and say nothing beside its output.
#[track_caller]
fn quiet(ran: Ran) -> String {
    assert_eq!((ran.code, ran.err.as_str()), (Some(0), ""), "{}", ran.out);
    ran.out
}

/// A file for one test.
fn file(name: &str, bytes: &[u8]) -> String {
    let path = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join(name);
    std::fs::write(&path, bytes).expect("a file can be written");
    path.display().to_string()
}

#[track_caller]
fn lines(text: &str) -> Vec<Vec<f64>> {
    let row = |line: &str| line.split(',').map(|cell| cell.parse().expect("a number")).collect();
    text.lines().skip(1).map(row).collect()
}

#[track_caller]
fn near(found: f64, expected: f64) {
    assert!((found - expected).abs() <= 1e-12 * expected.abs(), "{found} is not {expected}");
}

#[track_caller]
fn refused(ran: &Ran, words: &str) {
    assert_eq!((ran.code, ran.out.as_str()), (Some(2), ""), "{}", ran.err);
    assert!(ran.err.contains(words), "`{words}` is missing in:\n{}", ran.err);
}

#[test]
fn a_circuit_that_meets_its_limits_exits_0() {
    quiet(on_divider(&["check", "-"]));
    quiet(on_divider(&["solve", "-", "--at", "1kHz"]));
    quiet(on_divider(&["sweep", "-", "--at", "1kHz,2kHz"]));
}

#[test]
fn a_missed_limit_exits_1_and_is_said_beside_the_output() {
    let text = missing_a_limit();
    for (arguments, words) in [
        (&["solve", "-", "--at", "1kHz", "--as", "csv"][..], "limit missed: lost: most"),
        (&["solve", "-", "--at", "1kHz", "--as", "json"], "limit missed: lost: most"),
        (&["sweep", "-", "--at", "1kHz,2kHz"], "limit missed: lost in 2 of 2 rows, first at 1 kHz"),
    ] {
        let ran = piped(text.as_bytes(), arguments);
        assert_eq!(ran.code, Some(1), "{}", ran.err);
        assert!(ran.err.contains(words), "{}", ran.err);
        assert!(!ran.out.contains("missed"), "{}", ran.out);
    }
    let table = piped(text.as_bytes(), &["solve", "-", "--at", "1kHz"]);
    assert_eq!((table.code, table.err.as_str()), (Some(1), ""));
    assert!(table.out.contains("MISSED: most"), "{}", table.out);
}

#[test]
fn a_file_that_is_no_circuit_exits_2() {
    for command in [&["check"][..], &["solve", "--at", "50Hz"], &["sweep", "--at", "50Hz"]] {
        let on = |file: &str| piped(b"", &[command, &[file]].concat());
        refused(&on("no/such.bfl"), "`no/such.bfl`: there is no such file");
        refused(&on("src"), "it is a folder");
        refused(&on(&file("latin1.bfl", b"gnd -( r: 1 \xb5 )- a\n")), "is not UTF-8: byte 12");
        refused(&on(&file("empty.bfl", b"")), "is empty");
        refused(&on(&file("blank.bfl", b"\n \n")), "is empty");
        refused(&on("circuits/bad/let_cycle.bfl"), "circuits/bad/let_cycle.bfl");
    }
    refused(&piped(b"\xff", &["check", "-"]), "`<stdin>` is not UTF-8");
    refused(&piped(b"", &["check", "-"]), "`<stdin>` is empty");
}

#[test]
fn a_call_that_makes_no_sense_exits_2() {
    for (arguments, words) in [
        (&[][..], "Usage"),
        (&["melt", "-"], "melt"),
        (&["check"], "FILE"),
        (&["solve", "-"], "`--at 85kHz`"),
        (&["solve", "-", "--at", "1kHz", "--frob"], "--frob"),
        (&["solve", "-", "--at", "1kHz", "--as", "xml"], "xml"),
        (&["solve", "-", "--at", "1kHz", "--form", "cube"], "cube"),
        (&["solve", "-", "--at", "1kHz", "--digits", "0"], "1..=17"),
        (&["solve", "-", "--at", "1000"], "takes a frequency"),
        (&["solve", "-", "--at", "5 V"], "takes a frequency"),
        (&["solve", "-", "--at", "-5kHz"], "negative"),
        (&["solve", "-", "--at", "1/0 Hz"], "--at"),
        (&["solve", "-", "--at", "1kHz +"], "--at"),
        (&["solve", "-", "--at", "1kHz", "--set", "R"], "name=value"),
        (&["solve", "-", "--at", "1kHz", "--set", "R=volts"], "R"),
        (&["solve", "-", "--at", "1kHz", "--set", "R=3 V"], "R"),
        (&["solve", "-", "--at", "1kHz", "--set", "Q=3 kΩ"], "`Q`"),
        (&["solve", "-", "--at", "1kHz", "--read", "volts(nowhere)"], "nowhere"),
        (&["solve", "-", "--at", "1kHz", "--read", "volts(mid to far)"], "island"),
        (&["sweep", "-"], "has to know the frequencies"),
        (&["sweep", "-", "--from", "1kHz"], "where does the band end"),
        (&["sweep", "-", "--to", "1kHz"], "where does the band begin"),
        (&["sweep", "-", "--from", "2kHz", "--to", "1kHz"], "swap the two"),
        (&["sweep", "-", "--from", "1kHz", "--to", "2kHz", "--points", "0"], "at least one point"),
        (&["sweep", "-", "--from", "0Hz", "--to", "2kHz"], "0 Hz"),
        (&["sweep", "-", "--from", "1kHz", "--to", "2kHz", "--points", "99999999"], "points"),
        (&["sweep", "-", "--at", "1kHz,,2kHz"], "a frequency is missing"),
        (&["sweep", "-", "--at", "1kHz", "--vary", "R"], "first..last:count"),
        (&["sweep", "-", "--at", "1kHz", "--vary", "R=1..2:0"], "at least one value"),
        (&["sweep", "-", "--at", "1kHz", "--vary", "R=1kΩ..2V:3"], "not of one kind"),
        (&["sweep", "-", "--at", "1kHz", "--vary", "R=1V..2V:3"], "R"),
        (&["sweep", "-", "--at", "1kHz", "--vary", "Q=1Ω..2Ω:3"], "`Q`"),
        (
            &["sweep", "-", "--at", "1kHz", "--set", "R=1Ω", "--vary", "R=1Ω..2Ω:3"],
            "`R` is given by `--set` and by `--vary`",
        ),
        (
            &["sweep", "-", "--at", "1kHz", "--vary", "R=1Ω..2Ω:3", "--vary", "R=1Ω..2Ω:3"],
            "`R` is given twice",
        ),
    ] {
        let ran = on_divider(arguments);
        assert_eq!((ran.code, ran.out.as_str()), (Some(2), ""), "{arguments:?}\n{}", ran.err);
        assert!(ran.err.contains(words), "{arguments:?}: no `{words}` in:\n{}", ran.err);
        assert!(!ran.err.contains("panicked"), "{}", ran.err);
    }
    let silent = "gnd -( u: 9 V +)- a -( r: 3 Ω )- gnd\n";
    refused(&piped(silent.as_bytes(), &["sweep", "-", "--at", "1kHz"]), "has no reading");
}

#[test]
fn a_circuit_without_a_single_solution_exits_3() {
    let singular = |arguments: &[&str], words: &str| {
        let ran = piped(b"", arguments);
        assert_eq!((ran.code, ran.out.as_str()), (Some(3), ""), "{}", ran.err);
        assert!(ran.err.contains(words), "{}", ran.err);
    };
    let sources = "circuits/bad/voltage_source_loop.bfl";
    singular(&["check", sources], "`drive` and `spare`");
    singular(&["solve", sources, "--at", "50Hz"], "`drive` and `spare`");
    singular(&["sweep", sources, "--at", "50Hz", "--read", "volts(in)"], "`drive` and `spare`");
    let resonance = "circuits/bad/resonance_without_loss.bfl";
    singular(&["solve", resonance, "--at", "50Hz"], "`coil` and `tune` ring without loss");
    let beside = piped(b"", &["solve", resonance, "--at", "50.0001Hz"]);
    assert_eq!(beside.code, Some(0), "{}", beside.err);
}

#[test]
fn help_and_version_are_output_and_no_error() {
    for arguments in [&["--help"][..], &["--version"], &["solve", "--help"], &["sweep", "--help"]] {
        let out = quiet(piped(b"", arguments));
        assert!(out.to_lowercase().contains("bifilar"), "{out}");
        assert!(out.lines().all(|line| line.chars().count() <= 80), "{out}");
    }
}

#[test]
fn a_closed_pipe_ends_a_sweep_quietly() {
    let arguments = ["sweep", "-", "--from", "1Hz", "--to", "1MHz", "--points", "1000000"];
    let mut child = command(&arguments).spawn().expect("the program starts");
    let written = child.stdin.take().expect("a pipe").write_all(DIVIDER.as_bytes());
    written.expect("the circuit is taken");
    let mut rows = BufReader::new(child.stdout.take().expect("a pipe"));
    for _ in 0..3 {
        let mut row = String::new();
        rows.read_line(&mut row).expect("a row comes");
        assert!(row.ends_with('\n'));
    }
    drop(rows);
    let output = child.wait_with_output().expect("the program ends");
    assert_eq!(output.status.code(), Some(0));
    assert_eq!(String::from_utf8_lossy(&output.stderr), "");
}

#[track_caller]
fn has_exactly(value: &Value, keys: &[&str]) {
    let object = value.as_object().unwrap_or_else(|| panic!("no object: {value}"));
    let mut wanted: Vec<_> = keys.to_vec();
    wanted.sort_unstable();
    let mut found: Vec<_> = object.keys().map(String::as_str).collect();
    found.sort_unstable();
    assert_eq!(found, wanted);
}

/// Asserts that the names come one after the other in the text.
#[track_caller]
fn in_order(text: &str, keys: &[&str]) {
    let mut rest = text;
    for key in keys {
        let quoted = format!("\"{key}\":");
        let at = rest.find(&quoted).unwrap_or_else(|| panic!("no {key} in: {rest}"));
        rest = &rest[at + quoted.len()..];
    }
}

const COMPLEX: [&str; 2] = ["re", "im"];

#[test]
fn a_solution_in_json_has_the_documented_names_in_their_order() {
    let text = quiet(on_divider(&["solve", "-", "--at", "85kHz", "--as", "json"]));
    let json: Value = serde_json::from_str(&text).expect("JSON");
    let top = [
        "schema",
        "circuit",
        "title",
        "frequency",
        "amplitude",
        "nodes",
        "elements",
        "readings",
        "balance",
        "notes",
    ];
    has_exactly(&json, &top);
    in_order(&text, &top);
    assert_eq!(json["schema"], "bifilar.solve.1");
    assert_eq!(json["circuit"], "<stdin>");
    assert_eq!(json["title"], "Small link");
    assert_eq!(json["frequency"], 85000.0);
    assert_eq!(json["amplitude"], "rms");
    assert_eq!(json["notes"], serde_json::json!([]));
    let list = |key: &str| json[key].as_array().expect("a list").clone();
    for node in list("nodes") {
        has_exactly(&node, &["name", "reference", "re", "im", "error"]);
        let side = node["name"] == "far" || node["name"] == "near";
        assert_eq!(node["reference"], if side { "near" } else { "gnd" });
    }
    assert_eq!(list("elements").len(), 7);
    for element in list("elements") {
        has_exactly(&element, &["name", "kind", "left", "right", "drop", "current", "power"]);
        ["drop", "current", "power"].iter().for_each(|part| has_exactly(&element[part], &COMPLEX));
    }
    for reading in list("readings") {
        has_exactly(&reading, &["name", "unit", "re", "im", "error"]);
    }
    assert_eq!(
        (&json["readings"][0]["unit"], &json["readings"][1]["unit"]),
        (&"V".into(), &"W".into())
    );
    has_exactly(&json["balance"], &["delivered", "absorbed", "mismatch"]);
    has_exactly(&json["balance"]["delivered"], &COMPLEX);
    has_exactly(&json["balance"]["absorbed"], &COMPLEX);
    in_order(&text, &["nodes", "name", "reference", "re", "im", "error"]);
    in_order(&text, &["elements", "name", "kind", "left", "right", "drop", "current", "power"]);
    in_order(&text, &["readings", "name", "unit", "re", "im", "error"]);
    in_order(&text, &["balance", "delivered", "re", "im", "absorbed", "re", "im", "mismatch"]);
}

#[test]
fn a_sweep_in_json_is_one_object_a_line() {
    let arguments = ["sweep", "-", "--at", "1kHz,2kHz", "--vary", "R=1kΩ..2kΩ:2", "--as", "json"];
    let text = quiet(on_divider(&arguments));
    let rows: Vec<Value> =
        text.lines().map(|line| serde_json::from_str(line).expect("JSON")).collect();
    let found: Vec<_> =
        rows.iter().map(|r| (r["R"].as_f64().unwrap(), r["frequency"].as_f64().unwrap())).collect();
    assert_eq!(found, [(1e3, 1e3), (1e3, 2e3), (2e3, 1e3), (2e3, 2e3)]);
    for row in &rows {
        has_exactly(row, &["frequency", "R", "readings"]);
        let readings = row["readings"].as_array().expect("a list");
        assert_eq!(readings.len(), 2);
        readings.iter().for_each(|r| has_exactly(r, &["name", "re", "im", "error"]));
    }
}

#[test]
fn a_check_in_json_lists_errors_and_remarks() {
    let good: Value =
        serde_json::from_str(&quiet(on_divider(&["check", "-", "--as", "json"]))).expect("JSON");
    let top = ["schema", "circuit", "title", "counts", "errors", "remarks"];
    has_exactly(&good, &top);
    assert_eq!(good["schema"], "bifilar.check.1");
    has_exactly(&good["counts"], &["nodes", "elements", "couplings", "islands"]);
    assert_eq!((&good["counts"]["couplings"], &good["counts"]["islands"]), (&1.into(), &2.into()));
    let bad = piped(b"gnd -( r: 3 )- a\nb -( c: 2 q )- gnd\n", &["check", "-", "--as", "json"]);
    assert_eq!((bad.code, bad.err.as_str()), (Some(2), ""));
    let bad: Value = serde_json::from_str(&bad.out).expect("JSON");
    has_exactly(&bad, &top);
    let errors = bad["errors"].as_array().expect("a list");
    assert!(errors.len() >= 2, "{bad}");
    errors.iter().for_each(|e| has_exactly(e, &["message", "file", "line", "column", "help"]));
    for line in [1, 2] {
        assert!(errors.iter().any(|error| error["line"] == line), "{bad}");
    }
    assert_eq!(bad["counts"], Value::Null);
}

#[test]
fn a_sweep_into_a_pipe_is_csv_with_a_heading_for_each_form() {
    let heading = |form: &str| {
        let text = quiet(on_divider(&["sweep", "-", "--at", "1kHz", "--form", form]));
        text.lines().next().expect("a heading").to_owned()
    };
    assert_eq!(heading("polar"), "frequency_Hz,mid_V,mid_deg,lost_W,lost_deg");
    assert_eq!(heading("rect"), "frequency_Hz,mid_re_V,mid_im_V,lost_re_W,lost_im_W");
    assert_eq!(heading("dB"), "frequency_Hz,mid_dB,mid_deg,lost_dB,lost_deg");
}

#[test]
fn the_three_forms_say_the_same() {
    let row = |form: &str| {
        lines(&quiet(on_divider(&["sweep", "-", "--at", "7kHz", "--form", form]))).remove(0)
    };
    let (polar, rect, decibels) = (row("polar"), row("rect"), row("dB"));
    near(polar[1], rect[1].hypot(rect[2]));
    near(polar[2], rect[2].atan2(rect[1]).to_degrees());
    near(decibels[1], 20.0 * polar[1].log10());
    near(decibels[3], 10.0 * polar[3].log10());
}

#[test]
fn amplitudes_are_root_two_times_rms_and_powers_stay() {
    let plain = ["sweep", "-", "--at", "7kHz", "--read", "amps(top)"];
    let rms = lines(&quiet(on_divider(&plain))).remove(0);
    let ran = on_divider(&[&plain[..], &["--peak"]].concat());
    assert_eq!(ran.code, Some(0));
    assert!(ran.err.contains("amplitudes"), "{}", ran.err);
    let peak = lines(&ran.out).remove(0);
    near(peak[1], rms[1] * std::f64::consts::SQRT_2);
    near(peak[5], rms[5] * std::f64::consts::SQRT_2);
    assert_eq!((peak[2], peak[3]), (rms[2], rms[3]));
    let json = quiet(on_divider(&["solve", "-", "--at", "7kHz", "--as", "json", "--peak"]));
    let json: Value = serde_json::from_str(&json).expect("JSON");
    assert_eq!(json["amplitude"], "peak");
    assert!(
        quiet(on_divider(&["solve", "-", "--at", "7kHz", "--peak"])).contains("peak amplitudes")
    );
}

#[test]
fn tables_have_the_digits_asked_for_and_none_that_may_be_wrong() {
    let circuit = b"gnd -( u: 1 V +)- a -( r: 2 \xce\xa9 )- third -( s: 1 \xce\xa9 )- gnd\n";
    let shown = |digits: &str| {
        let arguments = ["solve", "-", "--at", "50Hz", "--digits", digits];
        let table = quiet(piped(circuit, &arguments));
        let line = table.lines().find(|line| line.trim().starts_with("third")).expect("a line");
        line.split_whitespace().nth(1).expect("a number").to_owned()
    };
    assert_eq!(shown("2"), "0.33");
    assert_eq!(shown("3"), "333");
    assert_eq!(shown("6"), "333.333");
    // A double holds no seventeen digits of a third.
    let most = shown("17");
    let digits = most.bytes().filter(u8::is_ascii_digit).count();
    assert!((15..=16).contains(&digits), "{most}");
    assert!(most.bytes().all(|b| b == b'3' || b == b'.'), "{most}");
}

#[test]
fn the_first_parameter_to_vary_is_the_outermost() {
    let circuit = "let a = 1 Ω\nlet b = 1 Ω\n\
                   gnd -( u: 1 V +)- x -( r: a )( s: b )- gnd\nread i = amps(u)\n";
    let arguments =
        ["sweep", "-", "--at", "1Hz,2Hz", "--vary", "b=1Ω..3Ω:3", "--vary", "a=10Ω..20Ω:2"];
    let text = quiet(piped(circuit.as_bytes(), &arguments));
    assert!(text.starts_with("frequency_Hz,b_ohm,a_ohm,i_A,i_deg\n"), "{text}");
    let found: Vec<_> = lines(&text).iter().map(|row| (row[1], row[2], row[0])).collect();
    let mut expected = Vec::new();
    for b in [1.0, 2.0, 3.0] {
        for a in [10.0, 20.0] {
            expected.extend([(b, a, 1.0), (b, a, 2.0)]);
        }
    }
    assert_eq!(found, expected);
    for row in lines(&text) {
        near(row[3], 1.0 / row[1] + 1.0 / row[2]);
    }
}

#[test]
fn readings_are_added_on_the_command_line_with_a_name_or_without() {
    let reads = ["--read", "volts(mid)/volts(in)", "--read", "share = abs(volts(mid)) / 9 V"];
    let text = quiet(on_divider(&[&["sweep", "-", "--at", "1kHz"], &reads[..]].concat()));
    let heading = text.lines().next().expect("a heading");
    assert!(heading.ends_with(",volts(mid)/volts(in),volts(mid)/volts(in)_deg,share,share_deg"));
    let row = lines(&text).remove(0);
    near(row[5], row[1] / 9.0);
    near(row[7], row[1] / 9.0);
}

#[test]
fn set_gives_a_let_another_value() {
    let circuit = b"let R = 3 \xce\xa9\nlet twice = 2 * R\n\
                    gnd -( u: 6 V +)- a -( r: twice )- gnd\nread i = -amps(u)\n";
    let amps = |more: &[&str]| {
        lines(&quiet(piped(circuit, &[&["sweep", "-", "--at", "1Hz"], more].concat())))[0][1]
    };
    near(amps(&[]), 1.0);
    near(amps(&["--set", "R=1.5 Ω"]), 2.0);
    near(amps(&["--set", "R = 1k5"]), 2e-3);
    near(amps(&["--set", "twice=12 ohm"]), 0.5);
}

#[test]
fn direct_current_opens_capacitors_and_shorts_windings() {
    let circuit = "gnd -( u: 9 V +)- in -( r: 3 Ω )- a -( coil: 1 mH )- b -( s: 6 Ω )- gnd\n\
                   b -( block: 10 µF )- out -( load: 50 Ω )- gnd\n\
                   in -( bridge: 1 nF )- island -( t: 1 Ω )- end\n\
                   read b = volts(b)\nread out = volts(out)\n";
    let ran = piped(circuit.as_bytes(), &["solve", "-", "--at", "0Hz"]);
    assert_eq!(ran.code, Some(0), "{}", ran.err);
    assert!(ran.err.contains("capacitors are open"), "{}", ran.err);
    assert!(ran.out.contains("direct current"), "{}", ran.out);
    assert!(ran.out.contains("undetermined"), "{}", ran.out);
    let row = lines(&quiet(piped(circuit.as_bytes(), &["sweep", "-", "--at", "0Hz"]))).remove(0);
    near(row[1], 6.0);
    assert_eq!(row[3], 0.0);
}

#[test]
fn a_circuit_above_extra_low_voltage_gets_one_line_beside_its_output() {
    let at = |volts: &str, frequency: &str, command: &str| {
        let format = if command == "solve" { "json" } else { "csv" };
        let circuit = format!("gnd -( u: {volts} V +)- a -( r: 1 kΩ )- gnd\nread a = volts(a)\n");
        let ran = piped(circuit.as_bytes(), &[command, "-", "--at", frequency]);
        let data = piped(circuit.as_bytes(), &[command, "-", "--at", frequency, "--as", format]);
        assert_eq!((ran.code, data.code, &data.err), (Some(0), Some(0), &ran.err));
        assert!(!ran.out.contains("60364"), "{}", ran.out);
        ran.err
    };
    for command in ["solve", "sweep"] {
        let words = at("193.06", "50Hz", command);
        assert_eq!(words.matches("IEC 60364-4-41").count(), 1, "{words}");
        assert!(words.starts_with("note: 193.1 V is above"), "{words}");
        assert_eq!(words.lines().count(), 1, "{words}");
        assert_eq!(at("49.9", "50Hz", command), "");
        assert_eq!(at("119", "0Hz", command), "");
        assert!(at("121", "0Hz", command).contains("120 V d.c."));
    }
}

#[test]
fn a_table_into_a_pipe_has_no_colours_and_fits_a_terminal() {
    for arguments in [
        &["solve", "-", "--at", "1kHz"][..],
        &["solve", "-", "--at", "1kHz", "--form", "rect", "--digits", "12"],
        &["sweep", "-", "--at", "1kHz,2kHz", "--as", "table", "--read", "volts(mid)/amps(top)"],
    ] {
        let out = quiet(on_divider(arguments));
        assert!(!out.contains('\u{1b}'), "{out}");
        assert!(out.lines().all(|line| line.chars().count() <= 80), "{out}");
    }
    let long = "long_name_".repeat(200_000);
    let circuit = format!("gnd -( {long}: 1 V +)- {long} -( r: 3 Ω )- gnd\n");
    let out = quiet(piped(circuit.as_bytes(), &["solve", "-", "--at", "1kHz"]));
    let table = out.lines().filter(|line| line.starts_with("  "));
    assert!(table.clone().count() > 10 && table.clone().all(|line| line.chars().count() <= 80));
    let ran = piped(b"gnd -( r: 3 )- a\n", &["check", "-"]);
    assert!(ran.code == Some(2) && !ran.err.contains('\u{1b}'), "{}", ran.err);
}
