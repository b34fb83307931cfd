//! Large and deep texts: read in linear time, refused without harm.

use crate::text::tests::{ID, errors, good};
use crate::text::{TextError, parse, parse_expression};

#[test]
fn nesting_is_capped_in_every_way_it_can_grow() {
    let deep = |open: &str, close: &str, count: usize| {
        format!("{}1{}", open.repeat(count), close.repeat(count))
    };
    for (open, close) in
        [("(", ")"), ("sqrt(", ")"), ("-", ""), ("2^", ""), ("-2^(", ")"), ("-(", ")")]
    {
        assert!(parse_expression(ID, &deep(open, close, 60)).is_ok(), "{open}");
        let error = parse_expression(ID, &deep(open, close, 100_000)).expect_err("too deep");
        assert!(matches!(error, TextError::TooDeep { .. }), "{open}: {error:?}");
    }
    let error = parse_expression(ID, &deep("(", ")", 201)).expect_err("too deep");
    assert_eq!(error.span().range(), 200..201);
    assert!(parse_expression(ID, &deep("(", ")", 200)).is_ok());
}

#[test]
fn the_deepest_text_fits_a_small_stack() {
    let work = || {
        let text = format!("let x = {}1{}", "-2^sqrt(".repeat(66), ")".repeat(66));
        good(&text);
        let text = format!("let x = {}1{}", "sqrt(".repeat(200), ")".repeat(200));
        good(&text);
    };
    let thread = std::thread::Builder::new().stack_size(1 << 20).spawn(work);
    thread.expect("a thread").join().expect("no overflow");
}

#[test]
fn a_hundred_thousand_brackets_give_one_error() {
    for text in ["(".repeat(100_000), format!("let x = {}", "(".repeat(100_000))] {
        let found = errors(&text);
        assert!(matches!(found.as_slice(), [TextError::UnclosedBracket { .. }]), "{}", found.len());
    }
    let text = format!("let x = {}1{}", "(".repeat(100_000), ")".repeat(100_000));
    assert!(matches!(errors(&text).as_slice(), [TextError::TooDeep { .. }]));
    let found = errors(&")".repeat(100_000));
    assert!(matches!(found.as_slice(), [TextError::StrayBracket { .. }]));
}

#[test]
fn every_line_with_an_open_bracket_is_reported() {
    let found = errors(&"let x = (1\n".repeat(10_000));
    assert_eq!(found.len(), 10_000);
    assert!(found.iter().all(|e| matches!(e, TextError::UnclosedBracket { .. })));
}

#[test]
fn blocks_too_deep_are_refused_and_still_read() {
    let text = format!("{}let x = Q(1){}", "block b () {\n".repeat(5000), "\n}".repeat(5000));
    let found = errors(&text);
    assert_eq!(found.len(), 2, "{found:?}");
    assert!(found.iter().any(|e| matches!(e, TextError::TooDeep { .. })));
    assert!(found.iter().any(|e| matches!(e, TextError::UnknownFunction { .. })));
}

#[test]
fn long_lines_long_sums_and_many_elements_are_read() {
    let line: String = (0..60_000).map(|i| format!("n{i} -( r{i}: 4.7 kΩ )- m{i}; ")).collect();
    assert!(line.len() > 2_000_000);
    assert_eq!(good(&line).statements.len(), 60_000);
    let path: String = (0..50_000).map(|i| format!(" -( r{i}: 4.7 kΩ )- m{i}")).collect();
    assert_eq!(good(&format!("gnd{path}")).statements.len(), 1);
    let sum = format!("let x = 1{}", " + 2 * 3".repeat(100_000));
    assert_eq!(good(&sum).statements.len(), 1);
    let name = "a".repeat(2_000_000);
    let (_, found) = parse(ID, &name);
    assert!(found[0].to_string().len() < 200);
    assert!(found[0].diagnostic().message.len() < 200);
}

#[test]
fn no_text_makes_the_reader_panic() {
    let alphabet: Vec<char> =
        "ab1 .,:;=-()()*+><[]{}\"#\n\r\t^∠°%Ωµjk/let read\u{feff}\u{301}é²４".chars().collect();
    let words =
        ["let ", "a -( ", ")-", "couple ", "k ", "read ", "4k7", "1e-3", "block b (a) {", "}"];
    let mut random = fastrand::Rng::with_seed(7);
    for _ in 0..20_000 {
        let length = random.usize(0..40);
        let mut text = String::new();
        for _ in 0..length {
            if random.u8(0..4) == 0 {
                text.push_str(words[random.usize(0..words.len())]);
            } else {
                text.push(alphabet[random.usize(0..alphabet.len())]);
            }
        }
        for error in parse(ID, &text).1 {
            assert!(text.get(error.span().range()).is_some(), "{text:?}: {error:?}");
            error.diagnostic();
        }
        let _ = parse_expression(ID, &text);
    }
}
