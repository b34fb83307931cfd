//! Exponential, logarithm and circular functions of [`Twofold`] reals.
//!
//! Each comes from its Taylor series after argument reduction, or by one Newton step on its
//! inverse from the double result.

use crate::number::complex::{ComplexTwofold, power_of_two_below};
use crate::number::twofold::Twofold;

/// Above this, e^x is infinite as a double.
const LARGEST_EXPONENT: f64 = 709.7;

/// Below this, e^x is zero as a double.
const SMALLEST_EXPONENT: f64 = -745.2;

/// The argument of the exponential series is halved this often, and the series squared back.
const HALVINGS: i32 = 8;

/// Terms that bring (ln 2 / 2^(HALVINGS+1))^n / n! below 2^-110.
const EXPONENTIAL_TERMS: u32 = 11;

/// Terms that bring (π/4)^2n / (2n)! below 2^-110.
const CIRCULAR_TERMS: u32 = 15;

/// Beyond this many radians the reduction to a quarter turn has no digits left to give.
pub(crate) const LARGEST_ANGLE: f64 = 1e15;

/// e^x, within (1 + |x|) · 2^-97 relative short of underflow.
pub(crate) fn exp(x: Twofold) -> Twofold {
    if x.hi > LARGEST_EXPONENT {
        return Twofold::new(f64::INFINITY);
    }
    if x.hi < SMALLEST_EXPONENT {
        return Twofold::ZERO;
    }
    let doublings = (x.hi / Twofold::LN_2.hi).round();
    let reduced = (x - Twofold::LN_2 * doublings).scale(0.5f64.powi(HALVINGS));
    let mut term = reduced;
    let mut rest = reduced;
    for n in 2..=EXPONENTIAL_TERMS {
        term = term * reduced / Twofold::new(f64::from(n));
        rest += term;
    }
    // e^2r − 1 from e^r − 1 keeps the small part's digits.
    for _ in 0..HALVINGS {
        rest = rest.scale(2.0) + rest * rest;
    }
    let (half, other_half) = halves(doublings as i32);
    (Twofold::ONE + rest).scale(half).scale(other_half)
}

/// Two powers of two whose product is 2^exponent, each within range.
fn halves(exponent: i32) -> (f64, f64) {
    let half = exponent / 2;
    (2f64.powi(half), 2f64.powi(exponent - half))
}

/// ln x for x > 0, within (1 + |ln x|) · 2^-97 absolute.
pub(crate) fn ln(x: Twofold) -> Twofold {
    let scale = power_of_two_below(x.hi);
    let reduced = x.scale(1.0 / scale);
    let start = Twofold::new(reduced.hi.ln());
    let off = reduced * exp(-start) - Twofold::ONE;
    start + off - (off * off).scale(0.5) + Twofold::LN_2 * scale.log2()
}

/// Sine and cosine of `x` radians, |x| below [`LARGEST_ANGLE`], within (1 + |x|) · 2^-100
/// absolute.
pub(crate) fn sin_cos(x: Twofold) -> (Twofold, Twofold) {
    let quarters = (x.hi / Twofold::HALF_PI.hi).round();
    let reduced = x - Twofold::HALF_PI * quarters;
    let square = reduced * reduced;
    let (mut sin, mut cos) = (Twofold::ZERO, Twofold::ZERO);
    // The smallest terms first, by Horner's rule on x²: 1 − x²/(1·2)·(1 − x²/(3·4)·(…)).
    for n in (1..=CIRCULAR_TERMS).rev() {
        let even = f64::from(2 * n);
        let cos_factor = square / Twofold::new((even - 1.0) * even);
        let sin_factor = square / Twofold::new(even * (even + 1.0));
        cos = cos_factor * (Twofold::ONE - cos);
        sin = sin_factor * (Twofold::ONE - sin);
    }
    let (sin, cos) = (reduced * (Twofold::ONE - sin), Twofold::ONE - cos);
    match quarters.rem_euclid(4.0) as i32 {
        0 => (sin, cos),
        1 => (cos, -sin),
        2 => (-sin, -cos),
        _ => (-cos, sin),
    }
}

/// The angle of a number other than zero, in (-π, π], within 2^-96 absolute.
pub(crate) fn angle(z: ComplexTwofold) -> Twofold {
    if z.im.is_zero() {
        return if z.re.hi < 0.0 { Twofold::PI } else { Twofold::ZERO };
    }
    let start = Twofold::new(z.im.hi.atan2(z.re.hi));
    let (sin, cos) = sin_cos(start);
    let scale = 1.0 / power_of_two_below(z.re.hi.abs().max(z.im.hi.abs()));
    let z = z.scale(scale);
    // sin(angle − start), and the arc sine of so small a number.
    let off = (z.im * cos - z.re * sin) / z.abs();
    start + off + off * off * off / Twofold::new(6.0)
}
