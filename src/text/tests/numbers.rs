//! Numbers, marks and units.

use crate::text::tests::{ID, read};
use crate::text::{TextError, parse_expression};

#[track_caller]
fn refused(text: &str) -> TextError {
    parse_expression(ID, text).expect_err(text)
}

#[test]
fn numbers_carry_the_longest_unit() {
    let table = [
        ("1e-3", "0.001"),
        ("4.7e3", "4700"),
        ("4.7E+3 V", "4700[V]"),
        ("240 µH", "240[He-6]"),
        ("240µH", "240[He-6]"),
        ("240 \u{3bc}H", "240[He-6]"),
        ("240uH", "240[He-6]"),
        ("85kHz", "85[Hze3]"),
        ("85 kHz", "85[Hze3]"),
        ("85\u{a0}kHz", "85[Hze3]"),
        ("4.7 k\u{3a9}", "4.7[Ωe3]"),
        ("4.7 k\u{2126}", "4.7[Ωe3]"),
        ("4.7kohm", "4.7[Ωe3]"),
        ("5 m", "5[m]"),
        ("5 mm", "5[me-3]"),
        ("5 F", "5[F]"),
        ("5 fF", "5[Fe-15]"),
        ("5%", "5[e-2]"),
        ("5 %", "5[e-2]"),
        ("30°", "30[°]"),
        ("325 Vpk", "325[Vpk]"),
        ("2Apk", "2[Apk]"),
        ("1e3m", "1000[m]"),
        ("2 VA + 3 var - 4 W", "(- (+ 2[W] 3[W]) 4[W])"),
        ("5 EV", "5[Ve18]"),
        ("5EV", "5[Ve18]"),
        ("0.3 Ω/m", "0.3[V/A/m]"),
        ("2 mm^2", "2[m^2e-6]"),
        ("3 nF/km", "3[A*s/V/me-12]"),
        ("3 V*s", "3[V*s]"),
        ("3 V^-1", "3[1/V]"),
        ("2 V/s", "2[V/s]"),
        ("3 V/2", "(/ 3[V] 2)"),
        ("3 V / s_1", "(/ 3[V] s_1)"),
        ("3 V/R_load", "(/ 3[V] R_load)"),
        ("3 m*x", "(* 3[m] x)"),
        ("5 mm^2.5", "(^ 5[me-3] 2.5)"),
        ("5 V^x", "(^ 5[V] x)"),
        ("4j", "4j"),
        ("2.5e-1j", "0.25j"),
        ("2 * 3 V", "(* 2 3[V])"),
        ("0e999999999999", "0"),
        ("00012", "12"),
    ];
    for (text, expected) in table {
        assert_eq!(read(text), expected, "{text}");
    }
}

#[test]
fn marks_stand_for_the_decimal_point() {
    let table = [
        ("4k7", "4.7[Ωe3]"),
        ("4K7", "4.7[Ωe3]"),
        ("2R2", "2.2[Ω]"),
        ("4M7", "4.7[Ωe6]"),
        ("4G7", "4.7[Ωe9]"),
        ("4n7", "4.7[Fe-9]"),
        ("2u2", "2.2[Fe-6]"),
        ("2µ2", "2.2[Fe-6]"),
        ("2p2", "2.2[Fe-12]"),
        ("4k7 Ω", "4.7[Ωe3]"),
        ("4k7Ω", "4.7[Ωe3]"),
        ("4u7 H", "4.7[He-6]"),
        ("4m7 H", "4.7[He-3]"),
        ("4m7Ω", "4.7[Ωe-3]"),
        ("2R2 Ω", "2.2[Ω]"),
        ("4k7 + 1", "(+ 4.7[Ωe3] 1)"),
        ("0R05", "0.05[Ω]"),
        ("R47", "R47"),
    ];
    for (text, expected) in table {
        assert_eq!(read(text), expected, "{text}");
    }
}

#[test]
fn a_mark_that_reads_in_two_ways_is_refused() {
    let error = refused("4m7");
    assert_eq!(error.to_string(), "`4m7` could be milliohms or millifarads");
    assert_eq!(error.diagnostic().help, ["write `4.7 mΩ` or `4.7 mF`"]);
    assert_eq!(error.span().range(), 0..3);
    for text in ["2R2 H", "4k7 kΩ", "4n7 nF"] {
        assert!(matches!(refused(text), TextError::MarkDisagrees { .. }), "{text}");
    }
    for text in ["4k7x", "4k7k", "4x7"] {
        assert!(matches!(refused(text), TextError::UnknownUnit { .. }), "{text}");
    }
}

#[test]
fn an_unknown_unit_is_marked_and_a_likely_one_named() {
    let table = [
        ("85 KHz", 3..6, Some("kHz")),
        ("85Khz", 2..5, Some("kHz")),
        ("2 mhz", 2..5, Some("mHz")),
        ("5 Ohm", 2..5, Some("ohm")),
        ("3 dB", 2..4, None),
        ("3 Pa", 2..4, None),
        ("30 °C", 3..6, None),
        ("(3) Ohm", 4..7, Some("ohm")),
        ("sqrt(3) volts", 8..13, Some("V")),
        ("10 Ohmz", 3..7, Some("ohm")),
        ("4.7 k", 4..5, Some("kΩ")),
    ];
    for (text, range, likely) in table {
        let TextError::UnknownUnit { suggestion, span, .. } = refused(text) else {
            panic!("{text}: {:?}", refused(text));
        };
        assert_eq!((span.range(), suggestion.as_deref()), (range, likely), "{text}");
    }
}

#[test]
fn numbers_beyond_what_is_kept_are_refused() {
    let digits = "1234567890123456789012345678901234567890";
    assert!(parse_expression(ID, &digits[..38]).is_ok());
    assert!(matches!(refused(&digits[..39]), TextError::TooManyDigits { .. }));
    for text in ["1e309", "1e999999999999", "1e300 QV", "99999999999999999999e9999"] {
        assert!(matches!(refused(text), TextError::TooLarge { .. }), "{text}");
    }
    for text in ["1e-400", "1e-999999999999", "1e-300 qV"] {
        assert!(matches!(refused(text), TextError::TooSmall { .. }), "{text}");
    }
    assert_eq!(read("5e-324"), "5e-324".parse::<f64>().expect("a number").to_string());
    // Zeros that an exponent brings back cost nothing.
    let text = format!("0.{}1e1000", "0".repeat(999));
    assert_eq!(read(&text), "1");
}

#[test]
fn a_point_stands_between_digits() {
    for (text, fixed, range) in [(".5", "write `0.5`", 0..2), ("5.", "write `5.0`", 0..2)] {
        let error = refused(text);
        assert_eq!(error.span().range(), range);
        assert_eq!(error.diagnostic().help, [fixed]);
    }
}

#[test]
fn angles_need_a_unit() {
    for (text, range) in [("48 V ∠ 30", 9..11), ("48 V ang 0", 9..10), ("1 ∠ -(30)", 7..11)] {
        let error = refused(text);
        assert!(matches!(error, TextError::AngleWithoutUnit { .. }), "{text}: {error:?}");
        assert_eq!(error.span().range(), range, "{text}");
    }
}

#[test]
fn units_stay_with_numbers() {
    for (text, range) in [("3 * V", 4..5), ("1/Ω", 2..4), ("mH", 0..2), ("2 * °", 4..6)] {
        let error = refused(text);
        assert!(matches!(error, TextError::LoneUnit { .. }), "{text}: {error:?}");
        assert_eq!(error.span().range(), range, "{text}");
    }
    for text in ["2 V^100", "2 Vpk^2", "2 V/deg", "2 Vpk*Apk", "2 V^9999999999999"] {
        assert!(matches!(refused(text), TextError::UnfitUnit { .. }), "{text}");
    }
    assert_eq!(read("2 Vpk/m"), "2[V/mpk]");
}
