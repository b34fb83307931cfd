//! The field of complex balls: formulas and stamps with a bound on every rounding.

use crate::number::ball::Ball;
use crate::number::complex::ComplexTwofold;
use crate::number::twofold::Twofold;
use crate::number::{Field, FieldError, Function};
use crate::quantity::Decimal;
use num_complex::Complex64;

/// Arithmetic on [`Ball`].
#[derive(Clone, Copy, Debug, Default)]
pub struct Balls;

impl Field for Balls {
    type Number = Ball;

    fn decimal(&self, value: Decimal) -> Ball {
        Ball::decimal(value)
    }

    fn pi(&self) -> Ball {
        Ball::pi()
    }

    fn imaginary_unit(&self) -> Ball {
        Ball::J
    }

    fn add(&self, a: &Ball, b: &Ball) -> Ball {
        a.add(b)
    }

    fn sub(&self, a: &Ball, b: &Ball) -> Ball {
        a.sub(b)
    }

    fn mul(&self, a: &Ball, b: &Ball) -> Ball {
        a.mul(b)
    }

    fn neg(&self, a: &Ball) -> Ball {
        a.neg()
    }

    fn div(&self, a: &Ball, b: &Ball) -> Result<Ball, FieldError> {
        a.div(b)
    }

    fn whole_power(&self, a: &Ball, exponent: i32) -> Result<Ball, FieldError> {
        a.whole_power(exponent)
    }

    fn power(&self, a: &Ball, b: &Ball) -> Result<Ball, FieldError> {
        a.power(b)
    }

    fn function(&self, function: Function, arguments: &[Ball]) -> Result<Ball, FieldError> {
        Ball::function(function, arguments)
    }

    fn interpolate(&self, points: &[(f64, Complex64)], at: &Ball) -> Result<Ball, FieldError> {
        let (Some(first), Some(last)) = (points.first(), points.last()) else {
            return Err(FieldError::Domain);
        };
        if !at.may_be_real() || !at.centre.is_finite() {
            return Err(FieldError::Domain);
        }
        // Rounding may carry an end point just past the end; what is within the radius counts.
        let least = (at.centre.re - Twofold::new(at.radius)).hi;
        let most = (at.centre.re + Twofold::new(at.radius)).hi;
        if most < first.0 || least > last.0 {
            return Err(FieldError::Domain);
        }
        let x = match at.centre.re {
            x if x < Twofold::new(first.0) => Twofold::new(first.0),
            x if x > Twofold::new(last.0) => Twofold::new(last.0),
            x => x,
        };
        let upper = points.partition_point(|point| Twofold::new(point.0) < x);
        let mut result = match points[..=upper] {
            [.., low, high] if high.0 != x.hi || x.lo != 0.0 => on_segment(low, high, x)?,
            [.., point] => Ball::exact(ComplexTwofold::from(point.1)),
            [] => return Err(FieldError::Domain),
        };
        result.radius += at.radius * steepest(points, least, most);
        result.finite()
    }
}

/// The value at `x` on the straight line between two points.
fn on_segment(
    low: (f64, Complex64),
    high: (f64, Complex64),
    x: Twofold,
) -> Result<Ball, FieldError> {
    let real = |value: Twofold| Ball::exact(ComplexTwofold::real(value));
    let point = |value: Complex64| Ball::exact(ComplexTwofold::from(value));
    let rise = point(high.1).sub(&point(low.1));
    let run = real(Twofold::sum(high.0, -low.0));
    let part = real(x).sub(&real(Twofold::new(low.0)));
    Ok(point(low.1).add(&part.mul(&rise).div(&run)?))
}

/// Bound on the slope over all segments that touch [least, most], with some reserve.
fn steepest(points: &[(f64, Complex64)], least: f64, most: f64) -> f64 {
    let touching = points.windows(2).filter(|pair| pair[0].0 <= most && pair[1].0 >= least);
    touching
        .map(|pair| (pair[1].1 - pair[0].1).norm() / (pair[1].0 - pair[0].0))
        .fold(0.0, |steepest, slope| f64::max(steepest, slope * 1.000_001))
}
