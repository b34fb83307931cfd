//! Numbers and the fields the stamps and formulas are written over.

pub mod affine;
pub mod ball;
pub mod balls;
pub mod complex;
mod elementary;
pub mod exact;
pub mod prime;
pub mod residues;
#[cfg(test)]
mod tests;
pub mod twofold;

pub use crate::number::affine::Affine;
pub use crate::number::ball::Ball;
pub use crate::number::balls::Balls;
pub use crate::number::complex::ComplexTwofold;
pub use crate::number::residues::Residues;
pub use crate::number::twofold::Twofold;

use crate::quantity::Decimal;
use thiserror::Error;

/// The functions a formula may call, beyond `+ - * / ^`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Function {
    /// Principal square root.
    Sqrt,
    /// e to the power.
    Exp,
    /// Natural logarithm.
    Ln,
    /// Decimal logarithm.
    Log10,
    /// Magnitude.
    Abs,
    /// Angle in radians, in (-π, π].
    Arg,
    /// Real part.
    Re,
    /// Imaginary part.
    Im,
    /// Complex conjugate.
    Conj,
    /// Smaller of two reals.
    Min,
    /// Larger of two reals.
    Max,
    /// Sine of radians.
    Sin,
    /// Cosine of radians.
    Cos,
    /// Tangent of radians.
    Tan,
    /// Arc sine in radians.
    Asin,
    /// Arc cosine in radians.
    Acos,
    /// Arc tangent in radians.
    Atan,
    /// Arc tangent of y/x in radians, in (-π, π].
    Atan2,
}

/// Why a field could not carry out an operation.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Error)]
pub enum FieldError {
    /// The divisor is zero (or cannot be told from zero).
    #[error("division by zero")]
    DivisionByZero,
    /// The function is not defined for this argument.
    #[error("the function is not defined for this value")]
    Domain,
    /// The result is not a finite number.
    #[error("the result is too large to be a number")]
    Overflow,
    /// The field has no such operation; nothing can be decided.
    #[error("this operation cannot be carried out exactly")]
    Undecided,
}

/// Arithmetic over some set of numbers. Formulas and stamps are written once over this trait;
/// the value `self` carries whatever the field needs (a modulus, say).
pub trait Field {
    /// One number.
    type Number: Clone + std::fmt::Debug;
    /// An exact decimal.
    fn decimal(&self, value: Decimal) -> Self::Number;
    /// π.
    fn pi(&self) -> Self::Number;
    /// The imaginary unit j.
    fn imaginary_unit(&self) -> Self::Number;
    /// a + b
    fn add(&self, a: &Self::Number, b: &Self::Number) -> Self::Number;
    /// a − b
    fn sub(&self, a: &Self::Number, b: &Self::Number) -> Self::Number;
    /// a · b
    fn mul(&self, a: &Self::Number, b: &Self::Number) -> Self::Number;
    /// −a
    fn neg(&self, a: &Self::Number) -> Self::Number;
    /// a / b
    fn div(&self, a: &Self::Number, b: &Self::Number) -> Result<Self::Number, FieldError>;
    /// a to a whole power (also negative).
    fn whole_power(&self, a: &Self::Number, exponent: i32) -> Result<Self::Number, FieldError>;
    /// a to any power.
    fn power(&self, a: &Self::Number, b: &Self::Number) -> Result<Self::Number, FieldError>;
    /// One of the functions; `arguments` has as many numbers as the function takes.
    fn function(
        &self,
        function: Function,
        arguments: &[Self::Number],
    ) -> Result<Self::Number, FieldError>;
    /// A value read from measured data: `(x, y)` by piecewise-linear interpolation of `points`
    /// at the real number `at`.
    fn interpolate(
        &self,
        points: &[(f64, num_complex::Complex64)],
        at: &Self::Number,
    ) -> Result<Self::Number, FieldError>;
}
