//! Expressions: how they group, and what they are made of.

use crate::source::Span;
use crate::text::tests::{ID, read, shown};
use crate::text::{parse_expression, parse_read};

#[test]
fn operators_group_by_their_strength() {
    let table = [
        ("1 + 2 - 3", "(- (+ 1 2) 3)"),
        ("a - b * c / d", "(- a (/ (* b c) d))"),
        ("-a^2", "(neg (^ a 2))"),
        ("2^-3", "(^ 2 (neg 3))"),
        ("a^b^c", "(^ a (^ b c))"),
        ("- -a", "(neg (neg a))"),
        ("2 * -a", "(* 2 (neg a))"),
        ("(a + b) * c", "(* (+ a b) c)"),
        ("1/((2*pi*f0)^2 * L_dock)", "(/ 1 (* (^ (* (* 2 pi) f0) 2) L_dock))"),
        ("48 V ∠ 30°", "(∠ 48[V] 30[°])"),
        ("48 V ang 30 deg", "(∠ 48[V] 30[°])"),
        ("48V∠-30°", "(∠ 48[V] (neg 30[°]))"),
        ("-48 V ∠ 0.5 rad", "(neg (∠ 48[V] 0.5))"),
        ("2 ∠ 30° ^ 2", "(^ (∠ 2 30[°]) 2)"),
        ("a ∠ 30° * b", "(* (∠ a 30[°]) b)"),
        ("a ∠ phi", "(∠ a phi)"),
        ("(3 + 4j) Ω", "(+ 3 4j)[Ω]"),
        ("4j Ω", "4j[Ω]"),
        ("2 - (3)-1", "(- (- 2 3) 1)"),
        ("(2) V^2/m", "2[V^2/m]"),
        ("a # words\n + b", "(+ a b)"),
    ];
    for (text, expected) in table {
        // The radian is a plain number.
        assert_eq!(read(text), expected.replace("0.5)", "0.5[])"), "{text}");
    }
}

#[test]
fn calls_take_expressions_and_readings_take_names() {
    let table = [
        ("sqrt(2)", "(sqrt 2)"),
        ("parallel(a, b, 3 Ω)", "(parallel a b 3[Ω])"),
        ("atan2(1, 2)", "(atan2 1 2)"),
        ("table(\"r-of-f.csv\", f) Ω", "(table \"r-of-f.csv\" f)[Ω]"),
        ("sqrt (2) V", "(sqrt 2)[V]"),
        ("volts(bus)", "(volts bus)"),
        ("volts(bus to keel)", "(volts bus keel)"),
        ("volts(0 to 1st)", "(volts 0 1st)"),
        ("volts(to to to)", "(volts to to)"),
        ("drop(cm1.La)", "(drop cm1.La)"),
        ("amps(dock) / power( load )", "(/ (amps dock) (power load))"),
        ("volts(in) / amps(dock)", "(/ (volts in) (amps dock))"),
        ("j*omega", "(* j omega)"),
        ("letter + at_1 + mHx", "(+ (+ letter at_1) mHx)"),
    ];
    for (text, expected) in table {
        assert_eq!(read(text), expected, "{text}");
    }
}

#[test]
fn every_expression_knows_its_place() {
    let table = [
        ("  1 + 2 ", 2..7),
        (" (3 + 4j) Ω ", 1..12),
        ("-x", 0..2),
        ("( a )", 0..5),
        ("48 V ∠ -30°", 0..14),
        ("sqrt( 2 )", 0..9),
        ("4j", 0..2),
    ];
    for (text, range) in table {
        let expr = parse_expression(ID, text).expect("an expression");
        assert_eq!(expr.span, Span::new(ID, range.start, range.end), "{text}");
    }
}

#[test]
fn names_are_compared_in_one_normal_form() {
    assert_eq!(read("e\u{301}"), "\u{e9}");
    assert_eq!(read("Größe_1"), "Größe_1");
    assert_eq!(read("磁束"), "磁束");
}

#[test]
fn a_reading_may_have_a_name_of_its_own() {
    let (name, value) = parse_read(ID, "out = volts(a)").expect("a reading");
    let name = name.expect("a name");
    assert_eq!((&*name.text, name.span.range(), &*shown(&value)), ("out", 0..3, "(volts a)"));
    let (name, value) = parse_read(ID, " volts(a)").expect("a reading");
    assert_eq!((name, &*shown(&value)), (None, "(volts a)"));
    // The name of a reading is no name of a value, so it may be a word of the language.
    assert!(parse_read(ID, "power = power(load)").is_ok());
    assert!(parse_read(ID, "out = ").is_err());
    assert!(parse_read(ID, "").is_err());
    assert!(parse_expression(ID, "1 2").is_err());
    assert!(parse_expression(ID, "1; 2").is_err());
    let error = parse_expression(ID, "5 f").expect_err("no unit");
    assert_eq!(error.to_string(), "expected a unit or an operator, found `f`");
    assert_eq!(error.diagnostic().help, ["write `*` to multiply"]);
}
