//! Exact complex numbers: two integers over one positive integer.
//!
//! Sums and products do not cancel common factors by themselves, since that is what costs time;
//! [`Exact::reduced`] does so where numbers are small.

use num_bigint::{BigInt, Sign};
use num_complex::Complex64;
use num_rational::BigRational;
use num_traits::{One, Signed, ToPrimitive, Zero};
use std::ops::{Add, Mul, Neg, Sub};

/// π to 40 decimals: as a rational it is off by less than 1e-40.
const PI_TIMES_1E40: &str = "31415926535897932384626433832795028841971";

/// Quotients are taken to this many bits before they are rounded to a double.
const QUOTIENT_BITS: i64 = 120;

/// `(re + j·im) / over`.
#[derive(Clone, Debug)]
pub struct Exact {
    re: BigInt,
    im: BigInt,
    over: BigInt,
}

impl Exact {
    /// `re + j·im` with whole parts.
    pub fn whole(re: i64, im: i64) -> Self {
        Self::integer(re.into(), im.into())
    }

    /// `re + j·im` with whole parts of any size.
    pub fn integer(re: BigInt, im: BigInt) -> Self {
        Exact { re, im, over: BigInt::one() }
    }

    /// Zero.
    pub fn zero() -> Self {
        Self::whole(0, 0)
    }

    /// `mantissa · 10^exponent`.
    pub fn decimal(mantissa: i64, exponent: i32) -> Self {
        let power = BigInt::from(10).pow(exponent.unsigned_abs());
        let (re, over) = if exponent < 0 {
            (BigInt::from(mantissa), power)
        } else {
            (BigInt::from(mantissa) * power, BigInt::one())
        };
        Exact { re, im: BigInt::zero(), over }.reduced()
    }

    /// 2π times a whole number of hertz.
    pub fn omega(frequency_hz: i64) -> Self {
        let pi: BigInt = PI_TIMES_1E40.parse().expect("digits only");
        let re = BigInt::from(2) * pi * frequency_hz;
        Exact { re, im: BigInt::zero(), over: BigInt::from(10).pow(40) }.reduced()
    }

    /// Times j.
    pub fn times_j(&self) -> Self {
        Exact { re: -&self.im, im: self.re.clone(), over: self.over.clone() }
    }

    /// The complex conjugate.
    pub fn conj(&self) -> Self {
        Exact { re: self.re.clone(), im: -&self.im, over: self.over.clone() }
    }

    /// One over this number, which must not be zero.
    pub fn inverse(&self) -> Self {
        assert!(!self.is_zero(), "one over zero");
        let norm = &self.re * &self.re + &self.im * &self.im;
        Exact { re: &self.re * &self.over, im: -&self.im * &self.over, over: norm }
    }

    /// Exactly zero.
    pub fn is_zero(&self) -> bool {
        self.re.is_zero() && self.im.is_zero()
    }

    /// `Some(1)` or `Some(-1)` where the number is exactly that.
    pub fn unit(&self) -> Option<i64> {
        let real = self.im.is_zero() && self.re.magnitude() == self.over.magnitude();
        real.then(|| if self.re.sign() == Sign::Minus { -1 } else { 1 })
    }

    /// The parts over their least common denominator.
    pub fn reduced(&self) -> Self {
        let re = BigRational::new(self.re.clone(), self.over.clone());
        let im = BigRational::new(self.im.clone(), self.over.clone());
        let over = least_common_multiple(re.denom(), im.denom());
        Exact { re: re.numer() * (&over / re.denom()), im: im.numer() * (&over / im.denom()), over }
    }

    /// The denominator.
    pub fn denominator(&self) -> &BigInt {
        &self.over
    }

    /// Real and imaginary part times `scale`, a multiple of the denominator.
    pub fn scaled_to_integers(&self, scale: &BigInt) -> (BigInt, BigInt) {
        let factor = scale / &self.over;
        (&self.re * &factor, &self.im * factor)
    }

    /// The number with both parts rounded to doubles.
    pub fn rounded(&self) -> Self {
        let part = |value: f64| {
            let ratio = BigRational::from_float(value).expect("finite");
            Exact { re: ratio.numer().clone(), im: BigInt::zero(), over: ratio.denom().clone() }
        };
        let value = self.to_c64();
        (&part(value.re) + &part(value.im).times_j()).reduced()
    }

    /// The nearest doubles.
    pub fn to_c64(&self) -> Complex64 {
        Complex64::new(quotient(&self.re, &self.over), quotient(&self.im, &self.over))
    }

    /// |this − other|, the difference taken exactly.
    pub fn distance(&self, other: Complex64) -> f64 {
        let parts = |part: f64| BigRational::from_float(part).expect("finite");
        let (re, im) = (parts(other.re), parts(other.im));
        let gap = |exact: &BigInt, found: &BigRational| {
            quotient(
                &(exact * found.denom() - found.numer() * &self.over),
                &(&self.over * found.denom()),
            )
        };
        gap(&self.re, &re).hypot(gap(&self.im, &im))
    }
}

/// Two numbers are equal if their difference is exactly zero.
impl PartialEq for Exact {
    fn eq(&self, other: &Self) -> bool {
        (self - other).is_zero()
    }
}

impl Add for &Exact {
    type Output = Exact;
    fn add(self, other: &Exact) -> Exact {
        if self.over == other.over {
            return Exact {
                re: &self.re + &other.re,
                im: &self.im + &other.im,
                over: self.over.clone(),
            };
        }
        let ratio = BigRational::new(self.over.clone(), other.over.clone());
        let (mine, theirs) = (ratio.denom(), ratio.numer());
        Exact {
            re: &self.re * mine + &other.re * theirs,
            im: &self.im * mine + &other.im * theirs,
            over: &self.over * mine,
        }
    }
}

impl Neg for &Exact {
    type Output = Exact;
    fn neg(self) -> Exact {
        Exact { re: -&self.re, im: -&self.im, over: self.over.clone() }
    }
}

impl Sub for &Exact {
    type Output = Exact;
    fn sub(self, other: &Exact) -> Exact {
        self + &-other
    }
}

impl Mul for &Exact {
    type Output = Exact;
    fn mul(self, other: &Exact) -> Exact {
        Exact {
            re: &self.re * &other.re - &self.im * &other.im,
            im: &self.re * &other.im + &self.im * &other.re,
            over: &self.over * &other.over,
        }
    }
}

/// The least common multiple of two positive integers.
pub fn least_common_multiple(a: &BigInt, b: &BigInt) -> BigInt {
    a * BigRational::new(b.clone(), a.clone()).numer()
}

/// `numerator / denominator` as a double, right to its last digit; the denominator is positive.
fn quotient(numerator: &BigInt, denominator: &BigInt) -> f64 {
    if numerator.is_zero() {
        return 0.0;
    }
    let shift = QUOTIENT_BITS + denominator.bits() as i64 - numerator.bits() as i64;
    let size = numerator.abs();
    let ratio = if shift >= 0 {
        (size << shift as u64) / denominator
    } else {
        size / (denominator << shift.unsigned_abs())
    };
    let size = ratio.to_f64().expect("fits a double") * 2f64.powi(-shift as i32);
    if numerator.is_negative() { -size } else { size }
}
