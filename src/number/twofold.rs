//! Real numbers as unevaluated sums of two doubles, about 32 decimal digits.
//!
//! The error-free sum is Knuth's (1969), the error-free product uses the fused multiply-add in
//! place of the splitting of Dekker (1971); the composite operations follow Hida, Li and Bailey
//! (2001). Error bounds are in units of u² = 2^-106.

use crate::quantity::Decimal;
use std::cmp::Ordering;
use std::f64::consts;
use std::ops::{Add, AddAssign, Div, Mul, Neg, Sub, SubAssign};

/// A real number `hi + lo` with |lo| ≤ ulp(hi)/2.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Twofold {
    /// The number rounded to a double.
    pub hi: f64,
    /// What the rounding left over.
    pub lo: f64,
}

/// a + b without error, in any order of magnitude.
fn two_sum(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    let b_part = sum - a;
    (sum, (a - (sum - b_part)) + (b - b_part))
}

/// a + b without error, where |a| ≥ |b| or a = 0.
fn quick_two_sum(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    (sum, b - (sum - a))
}

/// a · b without error (short of underflow).
fn two_product(a: f64, b: f64) -> (f64, f64) {
    let product = a * b;
    (product, a.mul_add(b, -product))
}

/// 10^32 apart; the powers of ten in between come from exact integers.
const TEN_TO_32_TIMES: [Twofold; 10] = [
    Twofold { hi: 1.0, lo: 0.0 },
    Twofold { hi: 1e32, lo: -5366162204393472.0 },
    Twofold { hi: 1e64, lo: -2.1320419009454396e47 },
    Twofold { hi: 1e96, lo: -4.9861653971908895e79 },
    Twofold { hi: 1e128, lo: -7.51744869165182e111 },
    Twofold { hi: 1e160, lo: -6.528407745068227e142 },
    Twofold { hi: 1e192, lo: -4.09008802087614e175 },
    Twofold { hi: 1e224, lo: 3.0450964820516807e207 },
    Twofold { hi: 1e256, lo: -3.012765990014054e239 },
    Twofold { hi: 1e288, lo: -7.6304735395750355e270 },
];

/// Step between the tabulated powers of ten.
const POWER_STEP: u32 = 32;

/// The largest power of ten that is surely finite.
const LARGEST_POWER: u32 = 308;

impl Twofold {
    /// Zero.
    pub const ZERO: Twofold = Twofold::new(0.0);
    /// One.
    pub const ONE: Twofold = Twofold::new(1.0);
    /// π
    pub const PI: Twofold = Twofold { hi: consts::PI, lo: 1.2246467991473532e-16 };
    /// π/2
    pub const HALF_PI: Twofold = Twofold { hi: consts::FRAC_PI_2, lo: 6.123233995736766e-17 };
    /// ln 2
    pub const LN_2: Twofold = Twofold { hi: consts::LN_2, lo: 2.3190468138462996e-17 };
    /// ln 10
    pub const LN_10: Twofold = Twofold { hi: consts::LN_10, lo: -2.1707562233822494e-16 };

    /// Exactly `value`.
    pub const fn new(value: f64) -> Self {
        Twofold { hi: value, lo: 0.0 }
    }

    /// The sum of any two doubles, exactly.
    pub fn sum(a: f64, b: f64) -> Self {
        let (hi, lo) = two_sum(a, b);
        Twofold { hi, lo }
    }

    /// The nearest double.
    pub fn to_f64(self) -> f64 {
        self.hi
    }

    /// Neither infinite nor not-a-number.
    pub fn is_finite(self) -> bool {
        self.hi.is_finite() && self.lo.is_finite()
    }

    /// Exactly zero.
    pub fn is_zero(self) -> bool {
        self.hi == 0.0
    }

    /// Magnitude.
    pub fn abs(self) -> Self {
        if self.hi < 0.0 { -self } else { self }
    }

    /// Times `factor`, which must be a power of two: exact short of overflow and underflow.
    pub fn scale(self, factor: f64) -> Self {
        Twofold { hi: self.hi * factor, lo: self.lo * factor }
    }

    /// Square root by one Newton step from the double root, within 8 u² relative; not-a-number
    /// for negative numbers.
    pub fn sqrt(self) -> Self {
        if self.hi == 0.0 {
            return Self::ZERO;
        }
        let root = self.hi.sqrt();
        let (square, rest) = two_product(root, root);
        let left = (self - Twofold { hi: square, lo: rest }).hi;
        let (hi, lo) = quick_two_sum(root, left / (2.0 * root));
        Twofold { hi, lo }
    }

    /// An integer, within u² relative.
    pub fn from_u128(value: u128) -> Self {
        let hi = value as f64;
        // 2^128 is what the largest values round to; it does not fit back.
        if hi >= 2f64.powi(128) {
            return Twofold { hi, lo: -((u128::MAX - value) as f64 + 1.0) };
        }
        let back = hi as u128;
        let lo = if value >= back { (value - back) as f64 } else { -((back - value) as f64) };
        Twofold { hi, lo }
    }

    /// 10^exponent for exponents up to 308, within 8 u² relative.
    fn power_of_ten(exponent: u32) -> Self {
        let exponent = exponent.min(LARGEST_POWER);
        let rest = Self::from_u128(10u128.pow(exponent % POWER_STEP));
        match exponent / POWER_STEP {
            0 => rest,
            step => TEN_TO_32_TIMES[step as usize] * rest,
        }
    }

    /// A decimal as written, within 2^-100 relative wherever the result is a normal double.
    pub fn from_decimal(decimal: Decimal) -> Self {
        let mantissa = Self::from_u128(decimal.mantissa);
        if decimal.mantissa == 0 {
            return mantissa;
        }
        let places = decimal.exponent.unsigned_abs();
        if decimal.exponent >= 0 {
            if places > LARGEST_POWER {
                return Self::new(f64::INFINITY);
            }
            return mantissa * Self::power_of_ten(places);
        }
        // No double is below 10^-324, no mantissa above 10^39.
        if places > 400 {
            return Self::ZERO;
        }
        // In two steps, since 10^places alone may overflow.
        let first = places.min(POWER_STEP * 5);
        mantissa / Self::power_of_ten(first) / Self::power_of_ten(places - first)
    }
}

impl From<f64> for Twofold {
    fn from(value: f64) -> Self {
        Twofold::new(value)
    }
}

impl Neg for Twofold {
    type Output = Twofold;
    fn neg(self) -> Twofold {
        Twofold { hi: -self.hi, lo: -self.lo }
    }
}

impl Add for Twofold {
    type Output = Twofold;
    /// Within 3 u² of the sum, also where the leading parts cancel.
    fn add(self, other: Twofold) -> Twofold {
        let (high, high_rest) = two_sum(self.hi, other.hi);
        let (low, low_rest) = two_sum(self.lo, other.lo);
        let (high, rest) = quick_two_sum(high, high_rest + low);
        let (hi, lo) = quick_two_sum(high, rest + low_rest);
        Twofold { hi, lo }
    }
}

impl Sub for Twofold {
    type Output = Twofold;
    fn sub(self, other: Twofold) -> Twofold {
        self + -other
    }
}

impl AddAssign for Twofold {
    fn add_assign(&mut self, other: Twofold) {
        *self = *self + other;
    }
}

impl SubAssign for Twofold {
    fn sub_assign(&mut self, other: Twofold) {
        *self = *self - other;
    }
}

impl Mul for Twofold {
    type Output = Twofold;
    /// Within 7 u² of the product.
    fn mul(self, other: Twofold) -> Twofold {
        let (high, rest) = two_product(self.hi, other.hi);
        let rest = rest + (self.hi * other.lo + self.lo * other.hi);
        let (hi, lo) = quick_two_sum(high, rest);
        Twofold { hi, lo }
    }
}

impl Mul<f64> for Twofold {
    type Output = Twofold;
    fn mul(self, other: f64) -> Twofold {
        let (high, rest) = two_product(self.hi, other);
        let (hi, lo) = quick_two_sum(high, self.lo.mul_add(other, rest));
        Twofold { hi, lo }
    }
}

impl Div for Twofold {
    type Output = Twofold;
    /// Long division, within 16 u² of the quotient.
    fn div(self, other: Twofold) -> Twofold {
        let first = self.hi / other.hi;
        if !first.is_finite() || !other.hi.is_finite() {
            return Twofold::new(first);
        }
        let left = self - other * first;
        let second = left.hi / other.hi;
        let left = left - other * second;
        let third = left.hi / other.hi;
        let (high, rest) = quick_two_sum(first, second);
        Twofold { hi: high, lo: rest } + Twofold::new(third)
    }
}

impl PartialOrd for Twofold {
    fn partial_cmp(&self, other: &Twofold) -> Option<Ordering> {
        match self.hi.partial_cmp(&other.hi)? {
            Ordering::Equal => self.lo.partial_cmp(&other.lo),
            order => Some(order),
        }
    }
}
