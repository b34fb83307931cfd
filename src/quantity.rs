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
