//! Complex balls: a centre in twofold precision and a bound on how far the exact value may be.

use crate::number::complex::ComplexTwofold;
use crate::number::elementary;
use crate::number::twofold::Twofold;
use crate::number::{FieldError, Function};
use crate::quantity::Decimal;

/// Relative rounding of one twofold complex operation (sum, product, quotient, root, magnitude):
/// the worst one, the quotient, stays below 2^6 u² with u² = 2^-106; the rest is reserve.
const ROUNDING: f64 = 1.0 / (1u128 << 99) as f64;

/// Relative rounding of the elementary functions in twofold arithmetic.
const ELEMENTARY_ROUNDING: f64 = 1.0 / (1u128 << 96) as f64;

/// Radii are sums and products of a few doubles, each within 2^-53: this lifts them above.
const UP: f64 = 1.0 + 4e-15;

/// What is lost where the low parts underflow: some tens of the smallest double.
const UNDERFLOW: f64 = 1e-320;

/// From this magnitude on no low part that matters underflows.
const SAFE_FROM_UNDERFLOW: f64 = 1e-280;

/// All values within `radius` of `centre`; the exact value is one of them.
///
/// A centre whose imaginary part is exactly zero stands for a real number where a function has a
/// branch cut along the negative real axis: real arithmetic keeps it zero.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Ball {
    /// The computed value.
    pub centre: ComplexTwofold,
    /// Upper bound on |centre − exact value|.
    pub radius: f64,
}

fn up(radius: f64) -> f64 {
    radius * UP
}

/// Bound on the rounding of an operation whose terms have the magnitude `size`.
fn rounding(size: f64) -> f64 {
    if size >= SAFE_FROM_UNDERFLOW || size == 0.0 {
        ROUNDING * size
    } else {
        ROUNDING * size + UNDERFLOW
    }
}

impl Ball {
    /// Zero, exactly.
    pub const ZERO: Ball = Ball::exact(ComplexTwofold::ZERO);
    /// One, exactly.
    pub const ONE: Ball = Ball::exact(ComplexTwofold::ONE);
    /// The imaginary unit, exactly.
    pub const J: Ball = Ball::exact(ComplexTwofold::J);

    /// A value that is known exactly.
    pub const fn exact(centre: ComplexTwofold) -> Self {
        Ball { centre, radius: 0.0 }
    }

    /// π
    pub fn pi() -> Self {
        Ball { centre: ComplexTwofold::real(Twofold::PI), radius: ROUNDING }
    }

    /// A decimal; exact where it is a whole number or a binary fraction of up to 106 bits.
    pub fn decimal(value: Decimal) -> Self {
        let real = Twofold::from_decimal(value);
        let radius = if decimal_is_exact(value, real) { 0.0 } else { up(rounding(real.hi)) };
        Ball { centre: ComplexTwofold::real(real), radius }
    }

    /// Upper bound on the magnitude of the exact value.
    pub fn magnitude(&self) -> f64 {
        up(self.centre.norm() + self.radius)
    }

    /// Lower bound on the magnitude of the exact value; 0 where the ball touches zero.
    pub fn least_magnitude(&self) -> f64 {
        (self.centre.norm() / UP - up(self.radius)).max(0.0) / UP
    }

    /// Zero is one of the values.
    pub fn contains_zero(&self) -> bool {
        self.least_magnitude() == 0.0
    }

    /// A real number is one of the values.
    pub fn may_be_real(&self) -> bool {
        self.centre.im.hi.abs() <= self.radius
    }

    /// One or j: a factor that rounds nothing.
    fn is_unit(&self) -> bool {
        self.centre == ComplexTwofold::ONE || self.centre == ComplexTwofold::J
    }

    /// The ball crosses the negative real axis, where the angle jumps.
    fn crosses_cut(&self) -> bool {
        self.centre.re.hi <= self.radius && !self.centre.im.is_zero() && self.may_be_real()
    }

    /// Overflow unless centre and radius are numbers.
    pub fn finite(self) -> Result<Self, FieldError> {
        if self.centre.is_finite() && self.radius.is_finite() {
            Ok(self)
        } else {
            Err(FieldError::Overflow)
        }
    }

    /// The real number of the ball, if it holds one.
    fn real(&self) -> Result<Ball, FieldError> {
        if self.may_be_real() {
            Ok(Ball { centre: ComplexTwofold::real(self.centre.re), radius: self.radius })
        } else {
            Err(FieldError::Domain)
        }
    }

    /// a + b
    pub fn add(&self, other: &Ball) -> Ball {
        let centre = self.centre + other.centre;
        let exact = is_short(self.centre) && is_short(other.centre)
            || self.centre.is_zero()
            || other.centre.is_zero();
        let rest = if exact { 0.0 } else { rounding(centre.norm()) };
        Ball { centre, radius: up(self.radius + other.radius + rest) }
    }

    /// a − b
    pub fn sub(&self, other: &Ball) -> Ball {
        self.add(&other.neg())
    }

    /// −a
    pub fn neg(&self) -> Ball {
        Ball { centre: -self.centre, radius: self.radius }
    }

    /// a · b
    pub fn mul(&self, other: &Ball) -> Ball {
        let (a, b) = (self.centre.norm(), other.centre.norm());
        let spread = a * other.radius + b * self.radius + self.radius * other.radius;
        let size = a * b;
        let exact = size == 0.0 && (a == 0.0 || b == 0.0)
            || [self, other].into_iter().any(|factor| factor.is_unit())
            || size >= SAFE_FROM_UNDERFLOW
                && is_short(self.centre)
                && is_short(other.centre)
                && (on_axis(self.centre) || on_axis(other.centre));
        let rest = if exact { 0.0 } else { rounding(size.max(f64::MIN_POSITIVE)) };
        Ball { centre: self.centre * other.centre, radius: up(spread + rest) }
    }

    /// a / b
    pub fn div(&self, other: &Ball) -> Result<Ball, FieldError> {
        let least = other.least_magnitude();
        if least == 0.0 {
            return Err(FieldError::DivisionByZero);
        }
        if self.centre.is_zero() && self.radius == 0.0 {
            return Ok(Ball::ZERO);
        }
        if other.centre == ComplexTwofold::ONE && other.radius == 0.0 {
            return Ok(*self);
        }
        let centre = self.centre / other.centre;
        let size = centre.norm();
        let spread = (self.radius + size * other.radius) / least;
        Ball { centre, radius: up(spread + rounding(size.max(f64::MIN_POSITIVE))) }.finite()
    }

    /// a to a whole power, by repeated squaring.
    pub fn whole_power(&self, exponent: i32) -> Result<Ball, FieldError> {
        let mut left = exponent.unsigned_abs();
        let mut square = *self;
        let mut power = Ball::ONE;
        while left > 0 {
            if left & 1 == 1 {
                power = power.mul(&square);
            }
            left >>= 1;
            if left > 0 {
                square = square.mul(&square);
            }
        }
        if exponent < 0 { Ball::ONE.div(&power) } else { power.finite() }
    }

    /// a to any power: whole ones by multiplication, one half by the root, others as e^(b ln a).
    pub fn power(&self, exponent: &Ball) -> Result<Ball, FieldError> {
        let exact = exponent.radius == 0.0 && exponent.centre.im.is_zero();
        let value = exponent.centre.re;
        if exact && value.lo == 0.0 && value.hi.fract() == 0.0 && value.hi.abs() < 2f64.powi(31) {
            return self.whole_power(value.hi as i32);
        }
        if exact && value == Twofold::new(0.5) {
            return self.sqrt();
        }
        if self.centre.is_zero() && self.radius == 0.0 && value.hi > exponent.radius {
            return Ok(Ball::ZERO);
        }
        exponent.mul(&self.ln()?).exp()
    }

    /// Principal square root.
    pub fn sqrt(&self) -> Result<Ball, FieldError> {
        let centre = self.centre.sqrt();
        let size = centre.norm();
        let spread = if self.radius == 0.0 {
            0.0
        } else if self.contains_zero() || self.crosses_cut() {
            // The other root may be meant: no bound but the sum of both magnitudes.
            size + self.magnitude().sqrt()
        } else {
            // |√z − √c| = |z − c| / |√z + √c|, and no two such roots point apart.
            self.radius / size
        };
        let exact = is_short(centre) && on_axis(centre) && centre * centre == self.centre;
        let rest = if exact { 0.0 } else { rounding(size) };
        Ball { centre, radius: up(spread + rest) }.finite()
    }

    /// e^a
    pub fn exp(&self) -> Result<Ball, FieldError> {
        if self.centre.is_zero() && self.radius == 0.0 {
            return Ok(Ball::ONE);
        }
        let size = elementary::exp(self.centre.re);
        let (turn, turn_radius) = sin_cos_of(self.centre.im);
        let centre = ComplexTwofold { re: turn.1 * size, im: turn.0 * size };
        let own = ELEMENTARY_ROUNDING * (1.0 + self.centre.re.hi.abs()) + turn_radius;
        let radius = size.hi * (self.radius.exp_m1() + own * 2.0) + UNDERFLOW;
        Ball { centre, radius: up(radius) }.finite()
    }

    /// Natural logarithm, the angle in (-π, π].
    pub fn ln(&self) -> Result<Ball, FieldError> {
        let least = self.least_magnitude();
        if least == 0.0 {
            return Err(FieldError::Domain);
        }
        if self.centre == ComplexTwofold::ONE && self.radius == 0.0 {
            return Ok(Ball::ZERO);
        }
        let re = elementary::ln(self.centre.abs());
        let im = elementary::angle(self.centre);
        let jump = if self.crosses_cut() { 2.0 * Twofold::PI.hi } else { 0.0 };
        let own = ELEMENTARY_ROUNDING * (2.0 + re.hi.abs() + im.hi.abs());
        let radius = self.radius / least + jump + own;
        Ball { centre: ComplexTwofold { re, im }, radius: up(radius) }.finite()
    }

    /// Magnitude.
    pub fn abs(&self) -> Ball {
        let size = self.centre.abs();
        let rest = if on_axis(self.centre) { 0.0 } else { rounding(size.hi) };
        Ball { centre: ComplexTwofold::real(size), radius: up(self.radius + rest) }
    }

    /// Angle in radians, in (-π, π]; not defined for zero.
    pub fn arg(&self) -> Result<Ball, FieldError> {
        if self.centre.is_zero() {
            return Err(FieldError::Domain);
        }
        let angle = elementary::angle(self.centre);
        let exact = self.centre.im.is_zero() && self.centre.re.hi > 0.0;
        let own = if exact { 0.0 } else { ELEMENTARY_ROUNDING * 4.0 };
        let spread = if self.contains_zero() || self.crosses_cut() {
            2.0 * Twofold::PI.hi
        } else {
            self.radius / self.least_magnitude()
        };
        Ball { centre: ComplexTwofold::real(angle), radius: up(spread + own) }.finite()
    }

    /// Sine and cosine of complex radians.
    pub fn sin_cos(&self) -> Result<(Ball, Ball), FieldError> {
        let (turn, turn_radius) = sin_cos_of(self.centre.re);
        let height = self.centre.im;
        let (rise, fall) = (elementary::exp(height), elementary::exp(-height));
        let (cosh, sinh) = ((rise + fall).scale(0.5), (rise - fall).scale(0.5));
        let sin = ComplexTwofold { re: turn.0 * cosh, im: turn.1 * sinh };
        let cos = ComplexTwofold { re: turn.1 * cosh, im: -(turn.0 * sinh) };
        let own = ELEMENTARY_ROUNDING * (1.0 + height.hi.abs()) + turn_radius;
        // Both derivatives stay below cosh of the highest imaginary part.
        let steepest = cosh.hi * self.radius.exp();
        let at_zero = self.centre.is_zero() && self.radius == 0.0;
        let slack = if at_zero { 0.0 } else { 4.0 * own * cosh.hi };
        let radius = up(self.radius * steepest + slack);
        Ok((Ball { centre: sin, radius }.finite()?, Ball { centre: cos, radius }.finite()?))
    }

    /// Smaller (`larger` false) or larger of two reals.
    fn extreme(&self, other: &Ball, larger: bool) -> Result<Ball, FieldError> {
        let (a, b) = (self.real()?, other.real()?);
        let first = (a.centre.re >= b.centre.re) == larger;
        let centre = if first { a.centre } else { b.centre };
        // Where the two cannot be told apart the radius must cover both.
        let radius = if a.sub(&b).contains_zero() {
            a.radius.max(b.radius)
        } else if first {
            a.radius
        } else {
            b.radius
        };
        Ok(Ball { centre, radius })
    }

    /// Arc sine: the angle of √(1 − a²) + ja where that is on the unit circle.
    fn asin(&self) -> Result<Ball, FieldError> {
        let cosine = self.cosine_from_sine()?;
        if cosine.centre.im.is_zero() && self.centre.im.is_zero() {
            return cosine.add(&Ball::J.mul(self)).arg();
        }
        let turned = cosine.add(&Ball::J.mul(self)).ln()?;
        Ok(Ball::J.neg().mul(&turned))
    }

    /// Arc cosine.
    fn acos(&self) -> Result<Ball, FieldError> {
        let sine = self.cosine_from_sine()?;
        if sine.centre.im.is_zero() && self.centre.im.is_zero() {
            return self.add(&Ball::J.mul(&sine)).arg();
        }
        let quarter = Ball { centre: ComplexTwofold::real(Twofold::HALF_PI), radius: ROUNDING };
        Ok(quarter.sub(&self.asin()?))
    }

    /// √(1 − a²), without cancellation near ±1.
    fn cosine_from_sine(&self) -> Result<Ball, FieldError> {
        Ball::ONE.sub(self).mul(&Ball::ONE.add(self)).sqrt()
    }

    /// Arc tangent.
    fn atan(&self) -> Result<Ball, FieldError> {
        let turned = Ball::J.mul(self);
        if self.centre.im.is_zero() {
            return Ball::ONE.add(&turned).arg();
        }
        let difference = Ball::ONE.add(&turned).ln()?.sub(&Ball::ONE.sub(&turned).ln()?);
        let half = Ball::exact(ComplexTwofold { re: Twofold::ZERO, im: Twofold::new(-0.5) });
        Ok(half.mul(&difference))
    }

    /// One of the functions of formulas.
    pub fn function(function: Function, arguments: &[Ball]) -> Result<Ball, FieldError> {
        let (Some(a), Some(b)) = (arguments.first(), arguments.get(1).or(arguments.first())) else {
            return Err(FieldError::Domain);
        };
        let result = match function {
            Function::Sqrt => a.sqrt()?,
            Function::Exp => a.exp()?,
            Function::Ln => a.ln()?,
            Function::Log10 => {
                let ten = ComplexTwofold::real(Twofold::LN_10);
                a.ln()?.div(&Ball { centre: ten, radius: 2.0 * ROUNDING })?
            }
            Function::Abs => a.abs(),
            Function::Arg => a.arg()?,
            Function::Re => Ball { centre: ComplexTwofold::real(a.centre.re), radius: a.radius },
            Function::Im => Ball { centre: ComplexTwofold::real(a.centre.im), radius: a.radius },
            Function::Conj => Ball { centre: a.centre.conj(), radius: a.radius },
            Function::Min => a.extreme(b, false)?,
            Function::Max => a.extreme(b, true)?,
            Function::Sin => a.sin_cos()?.0,
            Function::Cos => a.sin_cos()?.1,
            Function::Tan => {
                let (sin, cos) = a.sin_cos()?;
                sin.div(&cos)?
            }
            Function::Asin => a.asin()?,
            Function::Acos => a.acos()?,
            Function::Atan => a.atan()?,
            Function::Atan2 => b.real()?.add(&Ball::J.mul(&a.real()?)).arg()?,
        };
        result.finite()
    }
}

/// Both parts are plain doubles: sums of two such numbers are exact, and so are products where
/// one factor is on an axis.
fn is_short(z: ComplexTwofold) -> bool {
    z.re.lo == 0.0 && z.im.lo == 0.0
}

/// Real or imaginary.
fn on_axis(z: ComplexTwofold) -> bool {
    z.re.is_zero() || z.im.is_zero()
}

/// The decimal is m · 2^k with m short enough that no step of its conversion rounded.
fn decimal_is_exact(value: Decimal, real: Twofold) -> bool {
    let five = |places: u32| 5u128.checked_pow(places);
    let places = value.exponent.unsigned_abs();
    if value.exponent < 0 {
        return real.lo == 0.0
            && real.hi >= SAFE_FROM_UNDERFLOW
            && five(places).is_some_and(|power| value.mantissa.is_multiple_of(power));
    }
    let whole = 10u128.checked_pow(places).and_then(|power| value.mantissa.checked_mul(power));
    whole.is_some_and(|whole| whole < 1 << 106)
}

/// Sine and cosine with the bound on their error; any angle is right within 1 where the
/// argument is too large to be reduced.
fn sin_cos_of(angle: Twofold) -> ((Twofold, Twofold), f64) {
    if angle.is_zero() {
        return ((Twofold::ZERO, Twofold::ONE), 0.0);
    }
    if angle.hi.abs() > elementary::LARGEST_ANGLE {
        return ((Twofold::ZERO, Twofold::ZERO), 1.0);
    }
    (elementary::sin_cos(angle), ELEMENTARY_ROUNDING * (1.0 + angle.hi.abs()))
}
