//! Values as an engineer writes them, with what they are exactly.

use crate::exact::number::Exact;
use fastrand::Rng;

/// A decimal with its digits as drawn: `mantissa · 10^exponent`.
#[derive(Clone, Copy, Debug)]
pub struct Decimal {
    pub mantissa: i64,
    pub exponent: i32,
}

impl Decimal {
    pub fn exact(self) -> Exact {
        Exact::decimal(self.mantissa, self.exponent)
    }

    /// A positive value near `10^decades`, with one to three digits.
    pub fn near(rng: &mut Rng, decades: f64) -> Self {
        let digits = rng.u32(1..=3);
        let low = 10_i64.pow(digits - 1);
        let mantissa = rng.i64(low..low * 10);
        Decimal { mantissa, exponent: decades.round() as i32 + 1 - digits as i32 }
    }
}

/// Plain digits: `0.0047`, `470`, `4.7`.
pub fn plain(mantissa: i64, exponent: i32) -> String {
    let sign = if mantissa < 0 { "-" } else { "" };
    let digits = mantissa.unsigned_abs().to_string();
    if exponent >= 0 {
        return format!("{sign}{digits}{}", "0".repeat(exponent as usize));
    }
    let places = exponent.unsigned_abs() as usize;
    let padded = format!("{digits:0>width$}", width = places + 1);
    let (whole, fraction) = padded.split_at(padded.len() - places);
    match fraction.trim_end_matches('0') {
        "" => format!("{sign}{whole}"),
        fraction => format!("{sign}{whole}.{fraction}"),
    }
}

/// One of the spellings of a prefix.
fn prefix(rng: &mut Rng, power_of_ten: i32) -> &'static str {
    match power_of_ten {
        -12 => "p",
        -9 => "n",
        -6 => ["u", "\u{b5}", "\u{3bc}"][rng.usize(0..3)],
        -3 => "m",
        0 => "",
        3 => "k",
        6 => "M",
        9 => "G",
        _ => panic!("no prefix for 10^{power_of_ten}"),
    }
}

/// One of the spellings of a unit.
fn unit(rng: &mut Rng, name: &'static str) -> &'static str {
    match name {
        "Ω" => ["\u{3a9}", "\u{2126}", "ohm"][rng.usize(0..3)],
        other => other,
    }
}

/// The prefix a value is usually written with, or a neighbour of it.
fn choose_prefix(rng: &mut Rng, value: Decimal) -> i32 {
    let digits = value.mantissa.unsigned_abs().to_string().len() as i32;
    let decade = digits - 1 + value.exponent;
    let usual = decade.div_euclid(3) * 3;
    let shift = if rng.u8(0..8) == 0 { [-3, 3][rng.usize(0..2)] } else { 0 };
    (usual + shift).clamp(-12, 9)
}

/// A value with its unit: `4.7 kΩ`, `4.7kohm`, `0.0047 MΩ`.
pub fn with_unit(rng: &mut Rng, value: Decimal, name: &'static str) -> String {
    if let Some(marked) = letter_mark(rng, value, name) {
        return marked;
    }
    let power = choose_prefix(rng, value);
    let number = plain(value.mantissa, value.exponent - power);
    let space = ["", " "][rng.usize(0..2)];
    format!("{number}{space}{}{}", prefix(rng, power), unit(rng, name))
}

/// `4k7` and `4n7` (IEC 60062), for some values of two digits that can be written so.
fn letter_mark(rng: &mut Rng, value: Decimal, name: &'static str) -> Option<String> {
    if !(10..100).contains(&value.mantissa) || rng.bool() {
        return None;
    }
    let letter = match (name, value.exponent + 1) {
        ("Ω", 0) => "R",
        ("Ω", 3) => "k",
        ("Ω", 6) => "M",
        ("F", -6) => "u",
        ("F", -9) => "n",
        ("F", -12) => "p",
        _ => return None,
    };
    Some(format!("{}{letter}{}", value.mantissa / 10, value.mantissa % 10))
}

/// A complex value with its unit, `(3 + 4j) kΩ`, and what it is.
pub fn complex_with_unit(rng: &mut Rng, decades: f64, name: &'static str) -> (String, Exact) {
    let (text, value, power) = complex(rng, decades);
    let space = ["", " "][rng.usize(0..2)];
    let text = format!("({text}){space}{}{}", prefix(rng, power), unit(rng, name));
    (text, &value * &Exact::decimal(1, power))
}

/// `3 + 4j`, what it is, and the power of ten that brings it near `10^decades`.
fn complex(rng: &mut Rng, decades: f64) -> (String, Exact, i32) {
    let power = ((decades / 3.0).floor() as i32 * 3).clamp(-12, 9);
    let rest = decades - f64::from(power);
    let (re, im) = (Decimal::near(rng, rest), Decimal::near(rng, rest));
    let sign = if rng.bool() { -1 } else { 1 };
    let join = match (sign, rng.bool()) {
        (1, true) => " + ",
        (1, false) => "+",
        (_, true) => " - ",
        (_, false) => "-",
    };
    let text =
        format!("{}{join}{}j", plain(re.mantissa, re.exponent), plain(im.mantissa, im.exponent));
    let value = &re.exact() + &(&im.exact() * &Exact::whole(0, sign));
    (text, value, power)
}

/// A phasor: real, complex, or with one of the angles whose cosine and sine are whole.
pub fn phasor(rng: &mut Rng, decades: f64, name: &'static str) -> (String, Exact) {
    if rng.bool() {
        return complex_with_unit(rng, decades, name);
    }
    let value = Decimal::near(rng, decades);
    let text = with_unit(rng, value, name);
    let (angle, turn) = match rng.u8(0..6) {
        0 => (" ∠ 90°", Exact::whole(0, 1)),
        1 => (" ang 180 deg", Exact::whole(-1, 0)),
        2 => (" ∠ -90°", Exact::whole(0, -1)),
        3 => (" ∠ 0 rad", Exact::whole(1, 0)),
        _ => ("", Exact::whole(1, 0)),
    };
    (format!("{text}{angle}"), &value.exact() * &turn)
}

/// A number without a unit near `10^decades`, real or complex, either sign.
pub fn factor(rng: &mut Rng, decades: f64) -> (String, Exact) {
    if rng.u8(0..4) == 0 {
        let (text, value, power) = complex(rng, decades);
        let text = match power {
            0 => format!("({text})"),
            _ => format!("({text}) * {}", plain(1, power)),
        };
        return (text, &value * &Exact::decimal(1, power));
    }
    let mut value = Decimal::near(rng, decades);
    if rng.bool() {
        value.mantissa = -value.mantissa;
    }
    (plain(value.mantissa, value.exponent), value.exact())
}

/// A value with its unit, complex or real, either sign.
pub fn complex_or_real(rng: &mut Rng, decades: f64, name: &'static str) -> (String, Exact) {
    if rng.u8(0..4) == 0 {
        return complex_with_unit(rng, decades, name);
    }
    let value = Decimal::near(rng, decades);
    let text = with_unit(rng, value, name);
    if rng.u8(0..3) == 0 { (format!("-{text}"), -&value.exact()) } else { (text, value.exact()) }
}
