//! Dimensions, units, exact decimals, and how one number with its unit is printed.

use std::fmt;

/// Exponents are kept in twelfths, so halves, thirds and quarters (`sqrt(1 kHz)`) are exact.
pub const TWELFTHS: i16 = 12;

/// A physical dimension as powers of volt, ampere, second and metre, each in twelfths.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub struct Dimension {
    /// Power of the volt, in twelfths.
    pub volt: i16,
    /// Power of the ampere, in twelfths.
    pub ampere: i16,
    /// Power of the second, in twelfths.
    pub second: i16,
    /// Power of the metre, in twelfths.
    pub metre: i16,
}

impl Dimension {
    /// A plain number.
    pub const NONE: Dimension = Self::whole(0, 0, 0, 0);
    /// V
    pub const VOLTAGE: Dimension = Self::whole(1, 0, 0, 0);
    /// A
    pub const CURRENT: Dimension = Self::whole(0, 1, 0, 0);
    /// W, VA, var
    pub const POWER: Dimension = Self::whole(1, 1, 0, 0);
    /// Ω
    pub const RESISTANCE: Dimension = Self::whole(1, -1, 0, 0);
    /// S
    pub const CONDUCTANCE: Dimension = Self::whole(-1, 1, 0, 0);
    /// H
    pub const INDUCTANCE: Dimension = Self::whole(1, -1, 1, 0);
    /// F
    pub const CAPACITANCE: Dimension = Self::whole(-1, 1, 1, 0);
    /// Hz
    pub const FREQUENCY: Dimension = Self::whole(0, 0, -1, 0);
    /// s
    pub const TIME: Dimension = Self::whole(0, 0, 1, 0);
    /// m
    pub const LENGTH: Dimension = Self::whole(0, 0, 0, 1);

    const fn whole(volt: i16, ampere: i16, second: i16, metre: i16) -> Self {
        Dimension {
            volt: volt * TWELFTHS,
            ampere: ampere * TWELFTHS,
            second: second * TWELFTHS,
            metre: metre * TWELFTHS,
        }
    }

    fn zip(self, other: Self, op: impl Fn(i16, i16) -> Option<i16>) -> Option<Self> {
        Some(Dimension {
            volt: op(self.volt, other.volt)?,
            ampere: op(self.ampere, other.ampere)?,
            second: op(self.second, other.second)?,
            metre: op(self.metre, other.metre)?,
        })
    }

    /// Dimension of a product; `None` where an exponent leaves the range of `i16`.
    pub fn times(self, other: Self) -> Option<Self> {
        self.zip(other, i16::checked_add)
    }

    /// Dimension of a quotient; `None` where an exponent leaves the range of `i16`.
    pub fn over(self, other: Self) -> Option<Self> {
        self.zip(other, i16::checked_sub)
    }

    /// Dimension of a power; `None` where an exponent is no multiple of a twelfth or too large.
    pub fn power(self, exponent: f64) -> Option<Self> {
        self.zip(Self::NONE, |e, _| {
            let scaled = f64::from(e) * exponent;
            let rounded = scaled.round();
            let exact = (scaled - rounded).abs() < 1e-9 && rounded.abs() <= f64::from(i16::MAX);
            exact.then_some(rounded as i16)
        })
    }

    /// The usual unit, if the dimension has one: `V`, `Ω`, `H`, …; `""` for a plain number.
    pub fn usual_unit(self) -> Option<&'static str> {
        const USUAL: [(Dimension, &str); 11] = [
            (Dimension::NONE, ""),
            (Dimension::VOLTAGE, "V"),
            (Dimension::CURRENT, "A"),
            (Dimension::POWER, "W"),
            (Dimension::RESISTANCE, "Ω"),
            (Dimension::CONDUCTANCE, "S"),
            (Dimension::INDUCTANCE, "H"),
            (Dimension::CAPACITANCE, "F"),
            (Dimension::FREQUENCY, "Hz"),
            (Dimension::TIME, "s"),
            (Dimension::LENGTH, "m"),
        ];
        USUAL.iter().find(|(dimension, _)| *dimension == self).map(|(_, unit)| *unit)
    }
}

/// The unit of a dimension: its usual name, else a glued product such as `V^2*s/m`.
impl fmt::Display for Dimension {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(unit) = self.usual_unit() {
            return out.write_str(unit);
        }
        let factors = [(self.volt, "V"), (self.ampere, "A"), (self.second, "s"), (self.metre, "m")];
        let power = |e: i16| match (e / TWELFTHS, e % TWELFTHS) {
            (1, 0) => String::new(),
            (whole, 0) => format!("^{whole}"),
            _ => format!("^{:.3}", f64::from(e) / f64::from(TWELFTHS)),
        };
        let above: Vec<_> = factors
            .iter()
            .filter(|(e, _)| *e > 0)
            .map(|(e, unit)| format!("{unit}{}", power(*e)))
            .collect();
        let below: Vec<_> = factors
            .iter()
            .filter(|(e, _)| *e < 0)
            .map(|(e, unit)| format!("/{unit}{}", power(-*e)))
            .collect();
        let head = if above.is_empty() { "1".to_owned() } else { above.join("*") };
        write!(out, "{head}{}", below.concat())
    }
}

/// A non-negative decimal exactly as written: `mantissa · 10^exponent`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Decimal {
    /// All digits, without the point.
    pub mantissa: u128,
    /// Power of ten.
    pub exponent: i32,
}

impl Decimal {
    /// Nearest double. The grammar lets no decimal through that is infinite, or zero by underflow.
    pub fn to_f64(self) -> f64 {
        // The standard parser rounds correctly, which multiplying by a power of ten does not.
        format!("{}e{}", self.mantissa, self.exponent).parse().unwrap_or(f64::NAN)
    }

    /// The decimal that prints as the shortest text that reads back as `value` (its magnitude).
    pub fn from_f64(value: f64) -> Self {
        let text = format!("{:e}", value.abs());
        let (digits, exponent) = text.split_once('e').unwrap_or((&text, "0"));
        let fraction = digits.split_once('.').map_or(0, |(_, f)| f.len() as i32);
        Decimal {
            mantissa: digits.replace('.', "").parse().unwrap_or(0),
            exponent: exponent.parse::<i32>().unwrap_or(0) - fraction,
        }
    }
}

/// What a unit does to a number beyond a power of ten.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub enum Conversion {
    /// Nothing.
    #[default]
    Plain,
    /// Degrees: times π/180.
    Degrees,
    /// Peak amplitude: divided by √2.
    Peak,
}

/// A unit as written: `kHz`, `Ω/m`, `mm^2`, `Vpk`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Unit {
    /// What it measures.
    pub dimension: Dimension,
    /// The power of ten to SI base units, the prefixes taken together.
    pub power_of_ten: i32,
    /// What else it does to the number.
    pub conversion: Conversion,
}

/// A prefix as written, as spoken, and its power of ten.
pub type Prefix = (&'static str, &'static str, i32);

/// The SI prefixes with their spoken names and powers of ten; micro in all three spellings.
pub const PREFIXES: [Prefix; 26] = [
    ("Q", "quetta", 30),
    ("R", "ronna", 27),
    ("Y", "yotta", 24),
    ("Z", "zetta", 21),
    ("E", "exa", 18),
    ("P", "peta", 15),
    ("T", "tera", 12),
    ("G", "giga", 9),
    ("M", "mega", 6),
    ("k", "kilo", 3),
    ("h", "hecto", 2),
    ("da", "deca", 1),
    ("d", "deci", -1),
    ("c", "centi", -2),
    ("m", "milli", -3),
    ("u", "micro", -6),
    ("\u{b5}", "micro", -6),
    ("\u{3bc}", "micro", -6),
    ("n", "nano", -9),
    ("p", "pico", -12),
    ("f", "femto", -15),
    ("a", "atto", -18),
    ("z", "zepto", -21),
    ("y", "yocto", -24),
    ("r", "ronto", -27),
    ("q", "quecto", -30),
];

/// A unit symbol of the language.
struct Symbol {
    written: &'static str,
    spoken: &'static str,
    dimension: Dimension,
    power_of_ten: i32,
    conversion: Conversion,
    prefixed: bool,
}

const fn symbol(written: &'static str, spoken: &'static str, dimension: Dimension) -> Symbol {
    let conversion = Conversion::Plain;
    Symbol { written, spoken, dimension, power_of_ten: 0, conversion, prefixed: true }
}

const fn degree(written: &'static str) -> Symbol {
    let plain = symbol(written, "degree", Dimension::NONE);
    Symbol { conversion: Conversion::Degrees, prefixed: false, ..plain }
}

const SYMBOLS: [Symbol; 20] = [
    symbol("V", "volt", Dimension::VOLTAGE),
    symbol("A", "ampere", Dimension::CURRENT),
    symbol("W", "watt", Dimension::POWER),
    symbol("VA", "volt-ampere", Dimension::POWER),
    symbol("var", "reactive volt-ampere", Dimension::POWER),
    symbol("\u{3a9}", "ohm", Dimension::RESISTANCE),
    symbol("\u{2126}", "ohm", Dimension::RESISTANCE),
    symbol("ohm", "ohm", Dimension::RESISTANCE),
    symbol("S", "siemens", Dimension::CONDUCTANCE),
    symbol("H", "henry", Dimension::INDUCTANCE),
    symbol("F", "farad", Dimension::CAPACITANCE),
    symbol("Hz", "hertz", Dimension::FREQUENCY),
    symbol("s", "second", Dimension::TIME),
    symbol("m", "metre", Dimension::LENGTH),
    symbol("rad", "radian", Dimension::NONE),
    degree("\u{b0}"),
    degree("deg"),
    Symbol { conversion: Conversion::Peak, ..symbol("Vpk", "volt (peak)", Dimension::VOLTAGE) },
    Symbol { conversion: Conversion::Peak, ..symbol("Apk", "ampere (peak)", Dimension::CURRENT) },
    Symbol { power_of_ten: -2, prefixed: false, ..symbol("%", "percent", Dimension::NONE) },
];

/// Splits a whole word into a prefix and a unit symbol. No word splits in two ways: a test says so.
fn split(word: &str) -> Option<(Option<&'static Prefix>, &'static Symbol)> {
    /// Names of values pass here too: most are told apart by their last byte.
    fn ends(word: &str, symbol: &Symbol) -> bool {
        word.as_bytes().last() == symbol.written.as_bytes().last()
    }
    SYMBOLS.iter().filter(|symbol| ends(word, symbol)).find_map(|symbol| {
        let before = word.strip_suffix(symbol.written)?;
        if before.is_empty() {
            return Some((None, symbol));
        }
        let prefix = PREFIXES.iter().find(|prefix| symbol.prefixed && prefix.0 == before)?;
        Some((Some(prefix), symbol))
    })
}

impl Unit {
    /// A unit without a prefix or a conversion.
    pub const fn plain(dimension: Dimension) -> Unit {
        Unit { dimension, power_of_ten: 0, conversion: Conversion::Plain }
    }

    /// The unit a whole word stands for: one symbol with at most one prefix (`kHz`, `µH`, `°`).
    pub fn from_symbol(word: &str) -> Option<Unit> {
        let (prefix, symbol) = split(word)?;
        Some(Unit {
            dimension: symbol.dimension,
            power_of_ten: symbol.power_of_ten + prefix.map_or(0, |p| p.2),
            conversion: symbol.conversion,
        })
    }

    /// How a unit symbol is spoken: `kilohertz` for `kHz`.
    pub fn spoken(word: &str) -> Option<String> {
        let (prefix, symbol) = split(word)?;
        Some(format!("{}{}", prefix.map_or("", |p| p.1), symbol.spoken))
    }

    /// The prefix letter's power of ten (`k` is 3).
    pub fn prefix(letter: &str) -> Option<i32> {
        PREFIXES.iter().find(|p| p.0 == letter).map(|p| p.2)
    }

    /// A known unit symbol that is likely meant by an unknown one (`kHz` for `KHz`).
    pub fn likely(word: &str) -> Option<String> {
        /// Everyday prefixes: a suggestion never proposes yoctovolts.
        const EVERYDAY: [&str; 9] = ["", "k", "m", "\u{b5}", "u", "n", "p", "M", "G"];
        let spelled = |symbol: &Symbol, prefix: &str| format!("{prefix}{}", symbol.written);
        let all = SYMBOLS.iter().flat_map(|symbol| {
            let count = if symbol.prefixed { EVERYDAY.len() } else { 1 };
            EVERYDAY[..count].iter().map(move |prefix| spelled(symbol, prefix))
        });
        if word.chars().count() > 8 {
            return None;
        }
        let folded = word.to_lowercase();
        // A prefix alone, as on drawings.
        match word {
            "k" | "M" | "G" => return Some(format!("{word}\u{3a9}")),
            "u" | "\u{b5}" | "\u{3bc}" | "n" | "p" => return Some(format!("{word}F")),
            "R" => return Some("\u{3a9}".to_owned()),
            _ => {}
        }
        // Only the case differs: the first letter written as it stands weighs most.
        // Where every letter differs, it is some other unit: `Pa` is not `pA`.
        let kept = |unit: &str| unit.chars().zip(word.chars()).any(|(a, b)| a == b);
        let alike =
            |unit: &String| unit.to_lowercase() == folded && (kept(unit) || unit.len() == 1);
        let mut same: Vec<String> = all.filter(alike).collect();
        let first = word.chars().next();
        same.sort_by_key(|unit| unit.chars().next() != first);
        let spoken = || {
            let singular = folded.strip_suffix('s').unwrap_or(&folded);
            SYMBOLS.iter().find(|s| s.spoken == folded || s.spoken == singular)
        };
        same.into_iter().next().or_else(|| spoken().map(|symbol| symbol.written.to_owned()))
    }

    /// The unit of a product; `None` where it cannot be kept.
    pub fn times(self, other: Unit) -> Option<Unit> {
        self.combined(other, self.dimension.times(other.dimension)?, 1)
    }

    /// The unit of a quotient; `None` where it cannot be kept.
    pub fn over(self, other: Unit) -> Option<Unit> {
        self.combined(other, self.dimension.over(other.dimension)?, -1)
    }

    /// A unit to a whole power; `None` where it cannot be kept.
    pub fn power(self, exponent: i32) -> Option<Unit> {
        if exponent == 1 {
            return Some(self);
        }
        let plain = self.conversion == Conversion::Plain;
        let dimension = self.dimension.power(f64::from(exponent))?;
        let power_of_ten = self.power_of_ten.checked_mul(exponent)?;
        plain.then_some(Unit { dimension, power_of_ten, conversion: Conversion::Plain })
    }

    /// Degrees and peak values are kept only as the first factor, to the first power.
    fn combined(self, other: Unit, dimension: Dimension, sign: i32) -> Option<Unit> {
        let power_of_ten = self.power_of_ten.checked_add(other.power_of_ten.checked_mul(sign)?)?;
        let plain = other.conversion == Conversion::Plain;
        plain.then_some(Unit { dimension, power_of_ten, conversion: self.conversion })
    }
}

#[cfg(test)]
mod tests {
    use crate::quantity::{Conversion, Dimension, PREFIXES, SYMBOLS, Unit};

    #[test]
    fn no_word_is_two_units() {
        let mut seen = std::collections::HashSet::new();
        for symbol in &SYMBOLS {
            assert!(seen.insert(symbol.written.to_owned()), "{}", symbol.written);
            for prefix in PREFIXES.iter().filter(|_| symbol.prefixed) {
                let word = format!("{}{}", prefix.0, symbol.written);
                assert!(seen.insert(word.clone()), "{word} reads in two ways");
            }
        }
    }

    #[test]
    fn prefixes_and_symbols_are_told_apart_by_the_whole_word() {
        let table = [
            ("m", Dimension::LENGTH, 0),
            ("mm", Dimension::LENGTH, -3),
            ("Mm", Dimension::LENGTH, 6),
            ("F", Dimension::CAPACITANCE, 0),
            ("fF", Dimension::CAPACITANCE, -15),
            ("kHz", Dimension::FREQUENCY, 3),
            ("\u{b5}H", Dimension::INDUCTANCE, -6),
            ("\u{3bc}H", Dimension::INDUCTANCE, -6),
            ("uH", Dimension::INDUCTANCE, -6),
            ("k\u{3a9}", Dimension::RESISTANCE, 3),
            ("k\u{2126}", Dimension::RESISTANCE, 3),
            ("Mohm", Dimension::RESISTANCE, 6),
            ("daA", Dimension::CURRENT, 1),
            ("kvar", Dimension::POWER, 3),
            ("MVA", Dimension::POWER, 6),
            ("qs", Dimension::TIME, -30),
            ("QS", Dimension::CONDUCTANCE, 30),
            ("%", Dimension::NONE, -2),
        ];
        for (word, dimension, power_of_ten) in table {
            let expected = Unit { dimension, power_of_ten, conversion: Conversion::Plain };
            assert_eq!(Unit::from_symbol(word), Some(expected), "{word}");
        }
        for word in
            ["KHz", "Khz", "hz", "Pa", "dB", "k", "f", "min", "k%", "m\u{b0}", "", "mmm", "Ohm"]
        {
            assert_eq!(Unit::from_symbol(word), None, "{word}");
        }
    }

    #[test]
    fn a_wrong_case_is_set_right() {
        let table = [
            ("KHz", Some("kHz")),
            ("Khz", Some("kHz")),
            ("mhz", Some("mHz")),
            ("Mhz", Some("MHz")),
            ("UF", Some("uF")),
            ("Ohm", Some("ohm")),
            ("ohms", Some("\u{3a9}")),
            ("Volts", Some("V")),
            ("k", Some("k\u{3a9}")),
            ("n", Some("nF")),
            ("R", Some("\u{3a9}")),
            ("dB", None),
            ("Pa", None),
        ];
        for (wrong, right) in table {
            assert_eq!(Unit::likely(wrong).as_deref(), right, "{wrong}");
        }
    }

    #[test]
    fn compound_units_multiply_prefixes_too() {
        let unit = |word| Unit::from_symbol(word).expect("a unit");
        let area = unit("mm").power(2).expect("kept");
        assert_eq!(area.power_of_ten, -6);
        let slope = unit("nF").over(unit("km")).expect("kept");
        assert_eq!(slope.power_of_ten, -12);
        assert_eq!(slope.dimension, Dimension::CAPACITANCE.over(Dimension::LENGTH).expect("kept"));
        assert_eq!(unit("Vpk").power(2), None);
        assert_eq!(unit("V").over(unit("deg")), None);
        assert_eq!(unit("V").power(i32::MAX), None);
    }
}
