//! How one number is printed for people: prefixes, digits, angles. Every digit printed here is
//! one the error bound of the value supports.

use num_complex::Complex64;
use unicode_width::UnicodeWidthStr;

/// Stands where the error bound supports no digit at all.
pub const UNKNOWN: &str = "?";

/// A printed number in the parts that are aligned in a column.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Text {
    /// Sign and digits before the decimal point.
    pub whole: String,
    /// The decimal point and what follows it; may be empty.
    pub fraction: String,
    /// The unit with its prefix; may be empty.
    pub unit: String,
}

impl Text {
    fn unknown(unit: &str) -> Self {
        Text { whole: UNKNOWN.to_owned(), fraction: String::new(), unit: unit.to_owned() }
    }

    fn zero(unit: &str) -> Self {
        Text { whole: "0".to_owned(), fraction: String::new(), unit: unit.to_owned() }
    }

    /// The number in running text: `48.0000 V`, `-12.5°`.
    pub fn flat(&self) -> String {
        let gap = if self.unit.is_empty() || self.unit == "°" { "" } else { " " };
        format!("{}{}{gap}{}", self.whole, self.fraction, self.unit)
    }

    /// Columns before the decimal point, after it, and of the unit.
    pub fn widths(&self) -> Widths {
        Widths {
            whole: self.whole.width(),
            fraction: self.fraction.width(),
            unit: self.unit.width(),
        }
    }

    /// The number padded so that decimal points and units stand below each other.
    pub fn padded(&self, widths: Widths) -> String {
        if self.unit == "°" {
            return self.glued(widths);
        }
        let left = widths.whole.saturating_sub(self.whole.width());
        let right = widths.fraction.saturating_sub(self.fraction.width());
        // The unit letter itself is lined up, so a prefix stands to the left of its column.
        let before = widths.unit.saturating_sub(self.unit.width());
        let gap = if widths.unit == 0 { "" } else { " " };
        format!(
            "{:left$}{}{}{:right$}{gap}{:before$}{}",
            "", self.whole, self.fraction, "", "", self.unit
        )
    }

    /// The number padded so that decimal points stand below each other, its unit right behind it.
    pub fn glued(&self, widths: Widths) -> String {
        let left = widths.whole.saturating_sub(self.whole.width());
        let gap = usize::from(widths.unit > 0 && self.unit != "°");
        let room = widths.fraction + gap + widths.unit;
        let gap = if self.unit.is_empty() || gap == 0 { "" } else { " " };
        let used = self.fraction.width() + gap.len() + self.unit.width();
        let right = room.saturating_sub(used);
        format!("{:left$}{}{}{gap}{}{:right$}", "", self.whole, self.fraction, self.unit, "")
    }
}

/// Room for the parts of the numbers in one column.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Widths {
    /// Before the decimal point.
    pub whole: usize,
    /// The point and after it.
    pub fraction: usize,
    /// The unit.
    pub unit: usize,
}

impl Widths {
    /// The room that fits both.
    pub fn max(self, other: Widths) -> Widths {
        Widths {
            whole: self.whole.max(other.whole),
            fraction: self.fraction.max(other.fraction),
            unit: self.unit.max(other.unit),
        }
    }

    /// The room that fits every number of a column.
    pub fn of<'a>(texts: impl IntoIterator<Item = &'a Text>) -> Widths {
        texts.into_iter().fold(Widths::default(), |w, text| w.max(text.widths()))
    }
}

/// The largest |value| of a kind in one result. What cannot be told from zero prints as `0` only
/// where its bound is small beside this, and as [`UNKNOWN`] elsewhere.
pub type Scale = Option<f64>;

/// A bound above this part of the scale is too coarse to call the value zero.
const COARSE: f64 = 1e-6;

/// A bound below this part of the last place cannot be seen: the value sits on a rounding edge,
/// and both neighbours are nearest to it for every practical purpose.
const UNSEEN: f64 = 1e-3;

/// A real value and the bound on its error, in the unit it is printed in.
#[derive(Clone, Copy, Debug)]
pub struct Bounded {
    /// The value.
    pub value: f64,
    /// Bound on its error.
    pub error: f64,
}

impl Bounded {
    /// Adds one rounding of the value itself, made by arithmetic done for printing.
    pub fn rounded_once(value: f64, error: f64) -> Self {
        Bounded { value, error: error + value.abs() * f64::EPSILON }
    }
}

/// Text of `value` in multiples of `10^power`.
fn in_multiples(value: f64, power: i32) -> String {
    if power <= 0 {
        format!("{value:.*}", power.unsigned_abs() as usize)
    } else {
        format!("{:.0}", value / 10f64.powi(power))
    }
}

/// Whether the last printed place `10^power` is right: the whole interval rounds to one text.
fn place_is_right(x: Bounded, power: i32) -> bool {
    if x.error <= UNSEEN * 10f64.powi(power) {
        return true;
    }
    in_multiples(x.value - x.error, power) == in_multiples(x.value + x.error, power)
}

/// Decimal exponent of the first digit of `value` printed with `digits` digits.
fn first_place(value: f64, digits: usize) -> i32 {
    let text = format!("{value:.*e}", digits - 1);
    text.rsplit_once('e').and_then(|(_, e)| e.parse().ok()).unwrap_or(0)
}

/// How many significant digits of `x` are right, `wanted` at most.
pub fn right_digits(x: Bounded, wanted: usize) -> usize {
    if !x.value.is_finite() || x.error.is_nan() || x.error.is_infinite() {
        return 0;
    }
    if x.value == 0.0 {
        return if x.error == 0.0 { wanted } else { 0 };
    }
    let right =
        |&digits: &usize| place_is_right(x, first_place(x.value, digits) - (digits as i32 - 1));
    (1..=wanted).rev().find(right).unwrap_or(0)
}

/// Decides what cannot be printed digit by digit: `None` where digits can.
fn special(x: Bounded, unit: &str, scale: Scale) -> Option<Text> {
    if !x.value.is_finite() || !x.error.is_finite() {
        return Some(Text::unknown(unit));
    }
    if x.value.abs() > x.error {
        return None;
    }
    let coarse = scale.is_some_and(|scale| x.error > COARSE * scale);
    Some(if coarse && x.error > 0.0 { Text::unknown(unit) } else { Text::zero(unit) })
}

/// Prefixes from 10^-18 in steps of a thousand.
const PREFIXES: [&str; 12] = ["a", "f", "p", "n", "µ", "m", "", "k", "M", "G", "T", "P"];

/// Significant digits of |value| without a point, and the exponent of the first of them.
fn split(value: f64, digits: usize) -> (String, i32) {
    let text = format!("{:.*e}", digits - 1, value.abs());
    let (mantissa, exponent) = text.rsplit_once('e').unwrap_or((&text, "0"));
    (mantissa.replace('.', ""), exponent.parse().unwrap_or(0))
}

/// Puts the decimal point after `before` digits, with zeros where digits are missing.
fn point(digits: &str, before: i32) -> (String, String) {
    if before <= 0 {
        let zeros = "0".repeat(before.unsigned_abs() as usize);
        return ("0".to_owned(), format!(".{zeros}{digits}"));
    }
    let before = before as usize;
    if digits.len() <= before {
        return (digits.to_owned(), String::new());
    }
    (digits[..before].to_owned(), format!(".{}", &digits[before..]))
}

/// True for a unit that takes a prefix: a single unit, not a glued product or a plain number.
fn takes_prefix(unit: &str) -> bool {
    !unit.is_empty() && unit.chars().all(char::is_alphabetic)
}

/// A value with an engineering prefix: `48.0000 V`, `-1.20 mA`. A plain number gets no prefix.
pub fn engineering(x: Bounded, digits: usize, unit: &str, scale: Scale) -> Text {
    if let Some(text) = special(x, unit, scale) {
        return text;
    }
    let digits = right_digits(x, digits);
    if digits == 0 {
        return Text::unknown(unit);
    }
    let (figures, exponent) = split(x.value, digits);
    let sign = if x.value < 0.0 { "-" } else { "" };
    let (whole, fraction, unit) = lay_out(&figures, exponent, unit);
    Text { whole: format!("{sign}{whole}"), fraction, unit }
}

/// Places the point and chooses the prefix; falls back to a power of ten.
fn lay_out(figures: &str, exponent: i32, unit: &str) -> (String, String, String) {
    let thousands = exponent.div_euclid(3);
    let before = exponent.rem_euclid(3) + 1;
    // With fewer right digits than places before the point, a zero would be a claim: take the
    // next larger prefix, where the digits stand behind the point.
    let short = figures.len() < before as usize;
    let (thousands, before) = if short { (thousands + 1, before - 3) } else { (thousands, before) };
    let prefix = usize::try_from(thousands + 6).ok().and_then(|i| PREFIXES.get(i));
    match prefix {
        Some(prefix) if takes_prefix(unit) => {
            let (whole, fraction) = point(figures, before);
            (whole, fraction, format!("{prefix}{unit}"))
        }
        _ if (-4..7).contains(&exponent) && figures.len() as i32 > exponent => {
            let (whole, fraction) = point(figures, exponent + 1);
            (whole, fraction, unit.to_owned())
        }
        _ => {
            let (whole, fraction) = point(figures, 1);
            (whole, format!("{fraction}e{exponent}"), unit.to_owned())
        }
    }
}

/// A value known exactly (a frequency, a parameter): at most `digits` digits, no idle zeros.
pub fn exact(value: f64, digits: usize, unit: &str) -> Text {
    if !value.is_finite() {
        return Text::unknown(unit);
    }
    if value == 0.0 {
        return Text::zero(unit);
    }
    let shortest = format!("{:e}", value.abs());
    let written = shortest.bytes().take_while(|b| *b != b'e').filter(u8::is_ascii_digit).count();
    let (figures, exponent) = split(value, written.min(digits));
    let kept = figures.trim_end_matches('0');
    // Zeros up to the decimal point have to stay.
    let whole_digits = if takes_prefix(unit) { exponent.rem_euclid(3) + 1 } else { exponent + 1 };
    let least = (whole_digits.clamp(1, 7) as usize).max(kept.len());
    let figures = format!("{kept:0<least$}");
    let sign = if value < 0.0 { "-" } else { "" };
    let (whole, fraction, unit) = lay_out(&figures, exponent, unit);
    Text { whole: format!("{sign}{whole}"), fraction, unit }
}

/// A value with a fixed number of decimals, fewer where the bound supports fewer.
fn decimals(x: Bounded, wanted: usize, unit: &str) -> Text {
    let known = x.value.is_finite() && x.error.is_finite();
    let right = (0..=wanted).rev().find(|&d| known && place_is_right(x, -(d as i32)));
    let Some(places) = right else { return Text::unknown(unit) };
    let text = in_multiples(x.value, -(places as i32));
    let text = match text.strip_prefix('-') {
        Some(rest) if rest.bytes().all(|b| matches!(b, b'0' | b'.')) => rest.to_owned(),
        _ => text,
    };
    let (whole, fraction) = match text.find('.') {
        Some(i) => (text[..i].to_owned(), text[i..].to_owned()),
        None => (text, String::new()),
    };
    Text { whole, fraction, unit: unit.to_owned() }
}

/// Decimals of an angle or a level for so many significant digits of the magnitude.
fn places_for(digits: usize) -> usize {
    digits.saturating_sub(4).clamp(1, 13)
}

/// The angle in degrees, in (-180°, 180°]; [`UNKNOWN`] where the bound reaches around the origin.
pub fn angle(value: Complex64, error: f64, digits: usize) -> Text {
    let size = value.norm();
    if size <= error || !size.is_finite() || !error.is_finite() {
        return Text::unknown("°");
    }
    let degrees = value.arg().to_degrees();
    // Two roundings, of the arc tangent and of the conversion.
    let error = (error / size).min(1.0).asin().to_degrees() + 2.0 * degrees.abs() * f64::EPSILON;
    let mut text = decimals(Bounded { value: degrees, error }, places_for(digits), "°");
    if text.whole == "-180" {
        text.whole = "180".to_owned();
    }
    text
}

/// Level against one unit: 10·log10 of powers, 20·log10 of everything else.
pub fn decibels(value: Complex64, is_power: bool) -> f64 {
    let factor = if is_power { 10.0 } else { 20.0 };
    factor * value.norm().log10()
}

/// The level with its unit, such as `33.62 dBV`.
pub fn level(value: Complex64, error: f64, digits: usize, unit: &str, is_power: bool) -> Text {
    let unit = format!("dB{unit}");
    let size = value.norm();
    if size == 0.0 && error == 0.0 {
        return Text { whole: "-inf".to_owned(), fraction: String::new(), unit };
    }
    if size <= error {
        return Text::unknown(&unit);
    }
    let level = decibels(value, is_power);
    let factor = if is_power { 10.0 } else { 20.0 } / std::f64::consts::LN_10;
    // −ln(1 − x) bounds both sides of the logarithm.
    let error = -factor * (-error / size).ln_1p() + 2.0 * level.abs() * f64::EPSILON;
    decimals(Bounded { value: level, error }, places_for(digits), &unit)
}

#[cfg(test)]
mod tests {
    use crate::render::number::{Bounded, angle, engineering, exact, level, right_digits};
    use num_complex::Complex64;

    fn printed(value: f64, error: f64, unit: &str) -> String {
        engineering(Bounded { value, error }, 6, unit, None).flat()
    }

    #[test]
    fn a_value_gets_the_prefix_that_leaves_one_to_three_digits_before_the_point() {
        assert_eq!(printed(48.0, 0.0, "V"), "48.0000 V");
        assert_eq!(printed(-0.0123456, 0.0, "A"), "-12.3456 mA");
        assert_eq!(printed(999.9999, 0.0, "Hz"), "1.00000 kHz");
        assert_eq!(printed(2.4e-4, 0.0, "H"), "240.000 µH");
        assert_eq!(printed(1e21, 0.0, "V"), "1.00000e21 V");
    }

    #[test]
    fn a_plain_number_and_a_glued_unit_get_no_prefix() {
        assert_eq!(printed(0.93, 0.0, ""), "0.930000");
        assert_eq!(printed(0.002, 0.0, ""), "0.00200000");
        assert_eq!(printed(1234.5, 0.0, "V^2/Ω"), "1234.50 V^2/Ω");
        assert_eq!(printed(3e-9, 0.0, ""), "3.00000e-9");
    }

    #[test]
    fn no_digit_is_printed_that_the_error_bound_does_not_support() {
        assert_eq!(printed(12.3476, 0.001, "V"), "12.35 V");
        assert_eq!(printed(12.3456, 0.001, "V"), "12.3 V");
        assert_eq!(printed(12.3456, 0.02, "V"), "12 V");
        assert_eq!(printed(123.456, 4.0, "V"), "0.1 kV");
        assert_eq!(printed(3.0, 2.0, "V"), "? V");
        assert_eq!(printed(1.0, f64::INFINITY, "V"), "? V");
        assert_eq!(printed(f64::NAN, 0.0, "V"), "? V");
    }

    #[test]
    fn every_printed_text_is_the_rounding_of_every_value_the_bound_allows() {
        let mut random = fastrand::Rng::with_seed(7);
        for _ in 0..20_000 {
            let value = (random.f64() - 0.5) * 10f64.powi(random.i32(-8..8));
            let error = value.abs() * 10f64.powf(-8.0 * random.f64());
            let digits = right_digits(Bounded { value, error }, 9);
            if digits == 0 {
                continue;
            }
            let shown: f64 = format!("{value:.*e}", digits - 1).parse().unwrap();
            let place = 10f64.powi(shown.abs().log10().floor() as i32 - digits as i32 + 1);
            for exact in [value - error, value + error] {
                assert!((shown - exact).abs() <= 0.5011 * place, "{value} ± {error}: {shown}");
            }
        }
    }

    #[test]
    fn what_cannot_be_told_from_zero_prints_as_zero_where_its_bound_is_small() {
        assert_eq!(printed(1e-17, 1e-15, "V"), "0 V");
        let coarse = engineering(Bounded { value: 1.0, error: 3.0 }, 6, "V", Some(48.0));
        assert_eq!(coarse.flat(), "? V");
        let fine = engineering(Bounded { value: 1e-16, error: 3e-15 }, 6, "V", Some(48.0));
        assert_eq!(fine.flat(), "0 V");
    }

    #[test]
    fn a_value_on_a_rounding_edge_keeps_its_digits() {
        assert_eq!(engineering(Bounded { value: 2.5, error: 1e-16 }, 1, "V", None).flat(), "2 V");
    }

    #[test]
    fn seventeen_digits_can_be_asked_for() {
        let text = engineering(Bounded { value: 0.1, error: 0.0 }, 17, "V", None);
        assert_eq!(text.flat(), "100.00000000000001 mV");
    }

    #[test]
    fn an_exact_value_prints_without_idle_zeros() {
        assert_eq!(exact(85e3, 9, "Hz").flat(), "85 kHz");
        assert_eq!(exact(100.0, 9, "Hz").flat(), "100 Hz");
        assert_eq!(exact(123456.789, 9, "Hz").flat(), "123.456789 kHz");
        assert_eq!(exact(0.0, 9, "Hz").flat(), "0 Hz");
        assert_eq!(exact(1200.0, 9, "").flat(), "1200");
        assert_eq!(exact(0.85, 9, "").flat(), "0.85");
        assert_eq!(exact(f64::MAX, 9, "Hz").flat(), "1.79769313e308 Hz");
    }

    #[test]
    fn an_angle_is_printed_as_far_as_its_bound_supports() {
        assert_eq!(angle(Complex64::new(0.0, 1.0), 0.0, 6).flat(), "90.00°");
        assert_eq!(angle(Complex64::new(1.0, -1e-9), 0.0, 6).flat(), "0.00°");
        assert_eq!(angle(Complex64::new(-1.0, -1e-9), 0.0, 6).flat(), "180.00°");
        assert_eq!(angle(Complex64::new(1.0, 1.0), 0.001, 6).flat(), "45.0°");
        assert_eq!(angle(Complex64::new(1.0, 1.0), 1.2, 6).flat(), "?°");
        assert_eq!(angle(Complex64::new(1e-3, 0.0), 1.0, 6).flat(), "?°");
    }

    #[test]
    fn a_level_of_a_power_counts_ten_and_of_a_voltage_twenty() {
        assert_eq!(level(Complex64::new(10.0, 0.0), 0.0, 6, "V", false).flat(), "20.00 dBV");
        assert_eq!(level(Complex64::new(10.0, 0.0), 0.0, 6, "W", true).flat(), "10.00 dBW");
    }
}
