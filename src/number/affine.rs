//! Values that follow a straight line over frequency.

use crate::number::ComplexTwofold;

/// A value constant + slope·f with the frequency f in hertz.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Affine {
    /// The value at f = 0.
    pub constant: ComplexTwofold,
    /// What each hertz adds.
    pub slope: ComplexTwofold,
}

impl Affine {
    /// The same value at every frequency.
    pub const fn constant(constant: ComplexTwofold) -> Self {
        Affine { constant, slope: ComplexTwofold::ZERO }
    }

    /// The value at a frequency in hertz.
    pub fn at(&self, frequency_hz: f64) -> ComplexTwofold {
        self.constant + self.slope * ComplexTwofold::from(frequency_hz)
    }

    /// Exactly zero at every frequency.
    pub fn is_zero(&self) -> bool {
        self.constant.is_zero() && self.slope.is_zero()
    }
}
