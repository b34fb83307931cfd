//! Complex numbers of two [`Twofold`] parts.

use crate::number::twofold::Twofold;
use num_complex::Complex64;
use std::ops::{Add, AddAssign, Div, Mul, Neg, Sub, SubAssign};

/// A complex number of about 32 decimal digits.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct ComplexTwofold {
    /// Real part.
    pub re: Twofold,
    /// Imaginary part.
    pub im: Twofold,
}

/// The power of two just at or below |value|, kept where its inverse is a normal number too;
/// 1 for zero and for what is not finite.
pub(crate) fn power_of_two_below(value: f64) -> f64 {
    if value == 0.0 || !value.is_finite() {
        return 1.0;
    }
    let exponent = ((value.to_bits() >> 52) & 0x7ff).clamp(2, 2044);
    f64::from_bits(exponent << 52)
}

impl ComplexTwofold {
    /// Zero.
    pub const ZERO: ComplexTwofold = ComplexTwofold::real(Twofold::ZERO);
    /// One.
    pub const ONE: ComplexTwofold = ComplexTwofold::real(Twofold::ONE);
    /// The imaginary unit j.
    pub const J: ComplexTwofold = ComplexTwofold { re: Twofold::ZERO, im: Twofold::ONE };

    /// A real number.
    pub const fn real(re: Twofold) -> Self {
        ComplexTwofold { re, im: Twofold::ZERO }
    }

    /// The nearest pair of doubles.
    pub fn to_complex(self) -> Complex64 {
        Complex64::new(self.re.hi, self.im.hi)
    }

    /// Magnitude, as a double.
    pub fn norm(self) -> f64 {
        self.re.hi.hypot(self.im.hi)
    }

    /// The larger of the magnitudes of the two parts.
    fn largest_part(self) -> f64 {
        self.re.hi.abs().max(self.im.hi.abs())
    }

    /// Magnitude in full precision, without overflow on the way.
    pub fn abs(self) -> Twofold {
        if self.im.is_zero() {
            return self.re.abs();
        }
        if self.re.is_zero() {
            return self.im.abs();
        }
        let scale = power_of_two_below(self.largest_part());
        let (re, im) = (self.re.scale(1.0 / scale), self.im.scale(1.0 / scale));
        (re * re + im * im).sqrt().scale(scale)
    }

    /// Principal square root: real part not negative; on the negative real axis +j.
    pub fn sqrt(self) -> Self {
        if self.re.is_zero() && self.im.is_zero() {
            return Self::ZERO;
        }
        if self.im.is_zero() {
            return if self.re.hi > 0.0 {
                Self::real(self.re.sqrt())
            } else {
                ComplexTwofold { re: Twofold::ZERO, im: (-self.re).sqrt() }
            };
        }
        // An even power of two leaves the root exact.
        let scale = even_power_of_two_below(self.largest_part());
        let (re, im) = (self.re.scale(1.0 / scale), self.im.scale(1.0 / scale));
        let magnitude = ComplexTwofold { re, im }.abs();
        // The sum that does not cancel gives one part, the product 2·re·im the other.
        let larger = ((magnitude + re.abs()).scale(0.5)).sqrt();
        let smaller = im / larger.scale(2.0);
        let root = if re.hi >= 0.0 {
            ComplexTwofold { re: larger, im: smaller }
        } else {
            let sign = if im.hi < 0.0 { -1.0 } else { 1.0 };
            ComplexTwofold { re: smaller.abs(), im: larger.scale(sign) }
        };
        root.scale(scale.sqrt())
    }

    /// Complex conjugate.
    pub fn conj(self) -> Self {
        ComplexTwofold { re: self.re, im: -self.im }
    }

    /// Times `factor`, which must be a power of two: exact short of overflow and underflow.
    pub fn scale(self, factor: f64) -> Self {
        ComplexTwofold { re: self.re.scale(factor), im: self.im.scale(factor) }
    }

    /// All parts finite.
    pub fn is_finite(self) -> bool {
        self.re.is_finite() && self.im.is_finite()
    }

    /// Exactly zero.
    pub fn is_zero(self) -> bool {
        self.re.is_zero() && self.im.is_zero()
    }
}

/// As [`power_of_two_below`], with an even exponent, so that the root is a power of two too.
fn even_power_of_two_below(value: f64) -> f64 {
    let power = power_of_two_below(value);
    // The exponent field is biased by an odd number.
    let exponent = ((power.to_bits() >> 52) - 1) | 1;
    f64::from_bits(exponent << 52)
}

impl From<Complex64> for ComplexTwofold {
    fn from(value: Complex64) -> Self {
        ComplexTwofold { re: value.re.into(), im: value.im.into() }
    }
}

impl From<f64> for ComplexTwofold {
    fn from(value: f64) -> Self {
        Self::real(value.into())
    }
}

impl Neg for ComplexTwofold {
    type Output = ComplexTwofold;
    fn neg(self) -> ComplexTwofold {
        ComplexTwofold { re: -self.re, im: -self.im }
    }
}

impl Add for ComplexTwofold {
    type Output = ComplexTwofold;
    fn add(self, other: ComplexTwofold) -> ComplexTwofold {
        ComplexTwofold { re: self.re + other.re, im: self.im + other.im }
    }
}

impl Sub for ComplexTwofold {
    type Output = ComplexTwofold;
    fn sub(self, other: ComplexTwofold) -> ComplexTwofold {
        ComplexTwofold { re: self.re - other.re, im: self.im - other.im }
    }
}

impl AddAssign for ComplexTwofold {
    fn add_assign(&mut self, other: ComplexTwofold) {
        *self = *self + other;
    }
}

impl SubAssign for ComplexTwofold {
    fn sub_assign(&mut self, other: ComplexTwofold) {
        *self = *self - other;
    }
}

impl Mul for ComplexTwofold {
    type Output = ComplexTwofold;
    fn mul(self, other: ComplexTwofold) -> ComplexTwofold {
        ComplexTwofold {
            re: self.re * other.re - self.im * other.im,
            im: self.re * other.im + self.im * other.re,
        }
    }
}

impl Div for ComplexTwofold {
    type Output = ComplexTwofold;
    /// Both operands are brought near 1 first, so nothing overflows that need not.
    fn div(self, other: ComplexTwofold) -> ComplexTwofold {
        if other.im.is_zero() {
            return ComplexTwofold { re: self.re / other.re, im: self.im / other.re };
        }
        let above_scale = power_of_two_below(self.largest_part());
        let below_scale = power_of_two_below(other.largest_part());
        let above = self.scale(1.0 / above_scale);
        let below = other.scale(1.0 / below_scale);
        let square = below.re * below.re + below.im * below.im;
        let product = above * below.conj();
        let quotient = ComplexTwofold { re: product.re / square, im: product.im / square };
        quotient.scale(above_scale / below_scale)
    }
}
