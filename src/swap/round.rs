//! Preferred values of IEC 60063, for `--round` and for what could be bought. (Values from memory
//! of the standard; the formula for E48 to E192 and its one exception are in it.)

use crate::quantity::Decimal;
use std::fmt;
use std::str::FromStr;

/// A series of preferred values.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Series {
    /// ±40 %
    E3,
    /// ±20 %
    E6,
    /// ±10 %
    E12,
    /// ±5 %
    E24,
    /// ±2 %
    E48,
    /// ±1 %
    E96,
    /// ±0.5 % and closer
    E192,
}

/// E24 was fixed before the formula was, and eight of its values do not follow it.
const E24: [u32; 24] = [
    10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91,
];

impl Series {
    /// All series, the coarsest first.
    pub const ALL: [Series; 7] =
        [Series::E3, Series::E6, Series::E12, Series::E24, Series::E48, Series::E96, Series::E192];

    /// How many values a decade has.
    pub fn size(self) -> usize {
        match self {
            Series::E3 => 3,
            Series::E6 => 6,
            Series::E12 => 12,
            Series::E24 => 24,
            Series::E48 => 48,
            Series::E96 => 96,
            Series::E192 => 192,
        }
    }

    /// The values of one decade, from 100 to below 1000.
    pub fn decade(self) -> Vec<u32> {
        let size = self.size();
        if size <= 24 {
            return E24.iter().step_by(24 / size).map(|value| value * 10).collect();
        }
        (0..size)
            .map(|i| {
                let place = i * (192 / size);
                // The formula gives 919 here; the standard has 920.
                let exact = 100.0 * 10f64.powf(place as f64 / 192.0);
                if place == 185 { 920 } else { exact.round() as u32 }
            })
            .collect()
    }

    /// The preferred value nearest to a positive finite value.
    pub fn nearest(self, value: f64) -> Decimal {
        let decade = value.log10().floor() as i32;
        let exact =
            |(mantissa, exponent): (u32, i32)| Decimal { mantissa: u128::from(mantissa), exponent };
        (-1..=1)
            .flat_map(|step| self.decade().into_iter().map(move |v| (v, decade + step - 2)))
            .map(exact)
            .min_by(|a, b| {
                let off = |d: &Decimal| (d.to_f64() - value).abs();
                off(a).total_cmp(&off(b))
            })
            .unwrap_or(Decimal::from_f64(value))
    }
}

impl fmt::Display for Series {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(out, "E{}", self.size())
    }
}

impl FromStr for Series {
    type Err = String;

    fn from_str(word: &str) -> Result<Self, String> {
        let found = Series::ALL.into_iter().find(|series| series.to_string() == word);
        found.ok_or_else(|| String::from("the series are E3, E6, E12, E24, E48, E96 and E192"))
    }
}

#[cfg(test)]
mod tests {
    use crate::swap::round::Series;

    #[test]
    fn the_series_are_those_of_the_standard() {
        assert_eq!(Series::E3.decade(), [100, 220, 470]);
        assert_eq!(Series::E6.decade(), [100, 150, 220, 330, 470, 680]);
        let e96 = Series::E96.decade();
        assert_eq!(e96[..10], [100, 102, 105, 107, 110, 113, 115, 118, 121, 124]);
        assert_eq!(e96[92..], [909, 931, 953, 976]);
        assert!(Series::E192.decade().contains(&920));
        assert!(!Series::E192.decade().contains(&919));
    }

    #[test]
    fn the_nearest_value_may_lie_in_the_next_decade() {
        assert_eq!(Series::E24.nearest(9.7e-6).to_f64(), 10e-6);
        assert_eq!(Series::E24.nearest(187.2e-6).to_f64(), 180e-6);
        assert_eq!(Series::E3.nearest(1.0).to_f64(), 1.0);
    }
}
