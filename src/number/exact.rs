//! Exact positive and negative monomials q·π^(a/2)·f^(b/2), and the square roots they need.
//!
//! Roots must be chosen so that √(a·b) = √a·√b and √(c²) = c for positive numbers, as on the real
//! line. All radicands are therefore written as products of whole numbers that are coprime and no
//! squares; the roots of those are independent, so each may be either root in a field, and every
//! other root follows from them.

use crate::quantity::Decimal;
use num_bigint::{BigInt, BigUint, Sign};
use num_integer::Integer;
use num_rational::BigRational;
use num_traits::{One, Signed, Zero};

/// Fractions longer than this are no longer followed exactly: a root of them is then undecided.
const MOST_BITS: u64 = 4096;

/// Largest power of ten of a decimal that is followed exactly.
const LARGEST_EXPONENT: u32 = 400;

/// Largest power of π or f, in halves.
const LARGEST_POWER: i32 = 1 << 12;

/// A real number q·π^(a/2)·f^(b/2), where f is the frequency in hertz, positive.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Exact {
    /// The rational factor; carries the sign.
    pub factor: BigRational,
    /// Power of π, in halves.
    pub pi: i32,
    /// Power of f, in halves.
    pub f: i32,
}

/// The square root of an [`Exact`]: c·√n·π^(a/2)·f^(b/2), times j below zero.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Root {
    /// What stands before the root.
    pub before: Exact,
    /// The whole number under the root.
    pub radicand: BigUint,
    /// The radicand was negative.
    pub imaginary: bool,
}

impl Exact {
    fn checked(factor: BigRational, pi: i32, f: i32) -> Option<Self> {
        let short = factor.numer().bits().max(factor.denom().bits()) <= MOST_BITS;
        let (pi, f) = if factor.is_zero() { (0, 0) } else { (pi, f) };
        let small = pi.abs() <= LARGEST_POWER && f.abs() <= LARGEST_POWER;
        (short && small).then_some(Exact { factor, pi, f })
    }

    /// A decimal.
    pub fn decimal(value: Decimal) -> Option<Self> {
        let mantissa = BigInt::from(value.mantissa);
        if mantissa.is_zero() {
            return Self::checked(BigRational::zero(), 0, 0);
        }
        let size = value.exponent.unsigned_abs();
        if size > LARGEST_EXPONENT {
            return None;
        }
        let ten = BigInt::from(10).pow(size);
        let factor = match value.exponent < 0 {
            true => BigRational::new(mantissa, ten),
            false => BigRational::from(mantissa * ten),
        };
        Self::checked(factor, 0, 0)
    }

    /// π
    pub fn pi() -> Self {
        Exact { factor: BigRational::one(), pi: 2, f: 0 }
    }

    /// f
    pub fn frequency() -> Self {
        Exact { factor: BigRational::one(), pi: 0, f: 2 }
    }

    /// True for zero.
    pub fn is_zero(&self) -> bool {
        self.factor.is_zero()
    }

    /// True below zero.
    pub fn is_negative(&self) -> bool {
        self.factor.is_negative()
    }

    /// a + b, if that is one monomial again.
    pub fn add(&self, other: &Self) -> Option<Self> {
        if self.is_zero() {
            return Some(other.clone());
        }
        if other.is_zero() {
            return Some(self.clone());
        }
        if (self.pi, self.f) != (other.pi, other.f) {
            return None;
        }
        Self::checked(&self.factor + &other.factor, self.pi, self.f)
    }

    /// a · b
    pub fn mul(&self, other: &Self) -> Option<Self> {
        Self::checked(&self.factor * &other.factor, self.pi + other.pi, self.f + other.f)
    }

    /// 1/a
    pub fn inverse(&self) -> Option<Self> {
        (!self.is_zero()).then(|| Exact { factor: self.factor.recip(), pi: -self.pi, f: -self.f })
    }

    /// −a
    pub fn neg(&self) -> Self {
        Exact { factor: -&self.factor, pi: self.pi, f: self.f }
    }

    /// a to a whole power.
    pub fn power(&self, exponent: i32) -> Option<Self> {
        let bits = self.factor.numer().bits().max(self.factor.denom().bits());
        let size = exponent.unsigned_abs();
        if bits.saturating_mul(size.into()) > MOST_BITS || size > LARGEST_POWER as u32 {
            return None;
        }
        if exponent < 0 && self.is_zero() {
            return None;
        }
        let pi = self.pi.checked_mul(exponent)?;
        Self::checked(self.factor.pow(exponent), pi, self.f.checked_mul(exponent)?)
    }

    /// The number as a whole number of halves, if it is one of moderate size.
    pub fn halves(&self) -> Option<i32> {
        let doubled = &self.factor + &self.factor;
        let plain = self.pi == 0 && self.f == 0 && doubled.is_integer();
        let value = i32::try_from(doubled.numer()).ok()?;
        (plain && value.abs() <= LARGEST_POWER).then_some(value)
    }

    /// Compares two numbers whose quotient is rational.
    pub fn compare(&self, other: &Self) -> Option<std::cmp::Ordering> {
        if self.is_zero() || other.is_zero() || (self.pi, self.f) == (other.pi, other.f) {
            return Some(self.factor.cmp(&other.factor));
        }
        None
    }

    /// The principal square root, if the powers are even enough: √(n/d) = √(n·d)/d.
    pub fn sqrt(&self) -> Option<Root> {
        if self.pi % 2 != 0 || self.f % 2 != 0 {
            return None;
        }
        let denominator = self.factor.denom().magnitude().clone();
        let product = self.factor.numer().magnitude() * &denominator;
        let whole = product.sqrt();
        let square = &whole * &whole == product;
        let (above, radicand) =
            if square { (whole, BigUint::one()) } else { (BigUint::one(), product) };
        let signed = |n: BigUint| BigInt::from_biguint(Sign::Plus, n);
        let factor = BigRational::new(signed(above), signed(denominator));
        let before = Self::checked(factor, self.pi / 2, self.f / 2)?;
        Some(Root { before, radicand, imaginary: self.is_negative() })
    }
}

/// Whole numbers above one, coprime in pairs and no squares.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Basis {
    /// The numbers.
    pub numbers: Vec<BigUint>,
}

impl Basis {
    /// The basis number by basis number powers of a positive whole number, if it is a product of
    /// such: pairs of index and power.
    pub fn powers(&self, of: &BigUint) -> Option<Vec<(usize, u32)>> {
        let mut left = of.clone();
        let mut powers = Vec::new();
        for (i, number) in self.numbers.iter().enumerate() {
            let mut power = 0;
            while !left.is_one() {
                let (quotient, rest) = left.div_rem(number);
                if !rest.is_zero() {
                    break;
                }
                left = quotient;
                power += 1;
            }
            if power > 0 {
                powers.push((i, power));
            }
        }
        left.is_one().then_some(powers)
    }

    /// Refines the basis until a positive whole number is a product of its numbers.
    pub fn refine(&mut self, with: BigUint) {
        let mut waiting = vec![with];
        // Every split lowers the product of all numbers, so this ends.
        while let Some(number) = waiting.pop() {
            if number.is_one() {
                continue;
            }
            let meets = |own: &BigUint| !own.gcd(&number).is_one();
            match self.numbers.iter().position(meets) {
                None => self.numbers.push(without_square_root(number)),
                Some(i) if self.numbers[i] == number => {}
                Some(i) => {
                    let own = self.numbers.swap_remove(i);
                    let common = own.gcd(&number);
                    waiting.extend([&own / &common, &number / &common, common]);
                }
            }
        }
    }
}

/// The number whose repeated square is given and which is no square itself.
fn without_square_root(mut number: BigUint) -> BigUint {
    loop {
        let root = number.sqrt();
        if &root * &root != number {
            return number;
        }
        number = root;
    }
}

#[cfg(test)]
mod tests {
    use crate::number::exact::{Basis, Exact};
    use crate::quantity::Decimal;
    use num_bigint::BigUint;
    use num_integer::Integer;

    fn decimal(mantissa: u128, exponent: i32) -> Exact {
        Exact::decimal(Decimal { mantissa, exponent }).unwrap()
    }

    #[test]
    fn the_root_of_a_square_is_rational() {
        let root = decimal(225, -2).sqrt().unwrap();
        assert_eq!(root.radicand, BigUint::from(1u8));
        assert_eq!(root.before, decimal(15, -1));
        let area = Exact::pi().mul(&Exact::pi()).unwrap().mul(&decimal(4, 0)).unwrap();
        assert_eq!(area.sqrt().unwrap().before, Exact::pi().mul(&decimal(2, 0)).unwrap());
    }

    #[test]
    fn unlike_monomials_have_no_exact_sum() {
        assert_eq!(Exact::pi().add(&decimal(1, 0)), None);
        assert_eq!(Exact::pi().add(&Exact::pi()), Exact::pi().mul(&decimal(2, 0)));
    }

    #[test]
    fn a_refined_basis_is_coprime_without_squares_and_spans_its_radicands() {
        let mut random = fastrand::Rng::with_seed(7);
        for _ in 0..200 {
            let radicands: Vec<_> =
                (0..12).map(|_| BigUint::from(random.u64(1..5000) * random.u64(1..5000))).collect();
            let mut basis = Basis::default();
            radicands.iter().for_each(|n| basis.refine(n.clone()));
            for (i, a) in basis.numbers.iter().enumerate() {
                let root = a.sqrt();
                assert!(a != &BigUint::from(1u8) && &(&root * &root) != a, "{a}");
                for b in &basis.numbers[i + 1..] {
                    assert_eq!(a.gcd(b), BigUint::from(1u8), "{a} and {b}");
                }
            }
            for radicand in &radicands {
                let powers = basis.powers(radicand).expect("the basis spans it");
                let product: BigUint =
                    powers.iter().map(|&(i, power)| basis.numbers[i].pow(power)).product();
                assert_eq!(&product, radicand);
            }
        }
    }
}
