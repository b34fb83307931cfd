//! Formulas and stamps over a random finite field, with a bound on how far a wrong agreement there
//! is from impossible.
//!
//! π and the frequency are the squares of random elements, j is a root of −1, square roots of exact
//! numbers follow from random roots of coprime whole numbers. Any other function gives a random
//! element that depends only on the function and its arguments: equal formulas then still agree,
//! but a disagreement says nothing. Such numbers are marked as opaque.

use crate::number::exact::{Basis, Exact, Root};
use crate::number::prime::{Prime, Residue};
use crate::number::{Field, FieldError, Function};
use crate::quantity::Decimal;
use num_bigint::BigUint;
use num_complex::Complex64;
use rand::SeedableRng;
use rand::rngs::StdRng;
use std::cell::RefCell;
use std::cmp::Ordering;
use std::collections::HashMap;
use std::rc::Rc;

/// A fraction of two polynomials in π, f, source values and opaque values, seen at a random point.
#[derive(Clone, Debug)]
pub struct Sample {
    /// Its residue.
    pub residue: Residue,
    /// Its exact value, where that is a monomial.
    pub exact: Option<Rc<Exact>>,
    /// A function that the field does not know had a part in it.
    pub opaque: bool,
    /// How large the polynomials are.
    pub size: Size,
}

/// Bound on numerator and denominator of a [`Sample`], written with integral coefficients.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Size {
    /// Total degree.
    pub degree: f64,
    /// Binary logarithm of the sum of the coefficients' magnitudes, the largest over all choices
    /// of roots.
    pub bits: f64,
}

impl Size {
    /// Of a product of such fractions.
    pub fn times(self, other: Size) -> Size {
        Size { degree: self.degree + other.degree, bits: self.bits + other.bits }
    }

    /// Of a sum of such fractions.
    pub fn plus(self, other: Size) -> Size {
        let Size { degree, bits } = self.times(other);
        Size { degree, bits: bits + 1.0 }
    }

    /// The larger of both bounds.
    pub fn max(self, other: Size) -> Size {
        Size { degree: self.degree.max(other.degree), bits: self.bits.max(other.bits) }
    }
}

#[derive(Debug, Default)]
struct Opaque {
    known: HashMap<(Function, Vec<Residue>), Residue>,
    /// The largest argument met.
    size: Size,
}

/// One draw of a finite field with everything that is random in it.
#[derive(Debug)]
pub struct Residues {
    prime: Prime,
    root_of_pi: Residue,
    root_of_f: Residue,
    basis: Rc<Basis>,
    /// A root of each number of the basis.
    roots: Vec<Residue>,
    /// Radicands that the basis does not span.
    missing: RefCell<Vec<BigUint>>,
    opaque: RefCell<Opaque>,
    random: RefCell<StdRng>,
}

impl Residues {
    /// Draws a field in which the roots of the basis are distinct from zero.
    pub fn draw(random: &mut StdRng, basis: &Rc<Basis>) -> Self {
        loop {
            let prime = Prime::random(random);
            let Some(roots) = draw_roots(prime, basis, random) else { continue };
            return Residues {
                prime,
                root_of_pi: prime.random_residue(random),
                root_of_f: prime.random_residue(random),
                basis: basis.clone(),
                roots,
                missing: RefCell::default(),
                opaque: RefCell::default(),
                random: RefCell::new(StdRng::from_rng(random)),
            };
        }
    }

    /// The prime.
    pub fn prime(&self) -> Prime {
        self.prime
    }

    /// The frequency.
    pub fn frequency(&self) -> Sample {
        self.exactly(Exact::frequency())
    }

    /// A random element that stands for a variable.
    pub fn variable(&self) -> Sample {
        let residue = self.prime.random_residue(&mut *self.random.borrow_mut());
        let size = Size { degree: 1.0, bits: 0.0 };
        Sample { residue, exact: None, opaque: false, size }
    }

    /// Radicands met that the basis does not span: refine it and draw again.
    pub fn missing(&self) -> Vec<BigUint> {
        self.missing.borrow().clone()
    }

    /// How many pairs of different opaque values could have been taken for one, and the largest
    /// difference of two arguments.
    pub fn opaque_pairs(&self) -> (f64, Size) {
        let opaque = self.opaque.borrow();
        let n = opaque.known.len() as f64;
        (n * (n - 1.0).max(0.0) / 2.0, opaque.size.plus(opaque.size))
    }

    /// What is exactly known, as a sample.
    fn exactly(&self, exact: Exact) -> Sample {
        let bits = exact.factor.numer().bits().max(exact.factor.denom().bits());
        let degree = f64::from(exact.pi.unsigned_abs() + exact.f.unsigned_abs());
        let whole = |n: &BigUint| {
            let modulus = BigUint::from(self.prime.modulus());
            self.prime.whole(u128::try_from(n % modulus).unwrap_or(0))
        };
        let above = whole(exact.factor.numer().magnitude());
        let below = whole(exact.factor.denom().magnitude());
        let quotient = self.quotient(above, below).unwrap_or(Residue::ZERO);
        let power = |base, exponent| self.prime.power(base, exponent).unwrap_or(Residue::ZERO);
        let powers =
            self.prime.mul(power(self.root_of_pi, exact.pi), power(self.root_of_f, exact.f));
        let mut residue = self.prime.mul(quotient, powers);
        if exact.is_negative() {
            residue = self.prime.neg(residue);
        }
        let size = Size { degree, bits: bits as f64 };
        Sample { residue, exact: Some(Rc::new(exact)), opaque: false, size }
    }

    fn quotient(&self, a: Residue, b: Residue) -> Option<Residue> {
        Some(self.prime.mul(a, self.prime.inverse(b)?))
    }

    /// A result with its exact value, where there is one; that bounds it more closely.
    fn sample(&self, residue: Residue, exact: Option<Exact>, opaque: bool, size: Size) -> Sample {
        let Some(exact) = exact else { return Sample { residue, exact: None, opaque, size } };
        let bits = exact.factor.numer().bits().max(exact.factor.denom().bits()) as f64;
        let degree = f64::from(exact.pi.unsigned_abs() + exact.f.unsigned_abs());
        let size = Size { degree: degree.min(size.degree), bits: bits.min(size.bits) };
        Sample { residue, exact: Some(Rc::new(exact)), opaque, size }
    }

    fn unknown(&self, function: Function, arguments: &[Sample]) -> Sample {
        let key = (function, arguments.iter().map(|a| a.residue).collect());
        let mut opaque = self.opaque.borrow_mut();
        opaque.size = arguments.iter().fold(opaque.size, |size, a| size.max(a.size));
        let random = &self.random;
        let residue = *opaque
            .known
            .entry(key)
            .or_insert_with(|| self.prime.random_residue(&mut *random.borrow_mut()));
        let size = Size { degree: 1.0, bits: 0.0 };
        Sample { residue, exact: None, opaque: true, size }
    }

    /// The principal square root.
    fn sqrt(&self, a: &Sample) -> Sample {
        let unknown = || self.unknown(Function::Sqrt, std::slice::from_ref(a));
        let Some(Root { before, radicand, imaginary }) = a.exact.as_ref().and_then(|e| e.sqrt())
        else {
            return unknown();
        };
        let whole = radicand == BigUint::from(1u8);
        let Some(powers) = self.basis.powers(&radicand) else {
            self.missing.borrow_mut().push(radicand);
            return unknown();
        };
        let before = self.exactly(before);
        let mut residue = before.residue;
        for (i, power) in powers {
            let root = self.prime.power(self.roots[i], power as i32).unwrap_or(Residue::ZERO);
            residue = self.prime.mul(residue, root);
        }
        if imaginary {
            residue = self.prime.mul(residue, self.prime.imaginary_unit());
        }
        let exact = (whole && !imaginary).then_some(before.exact).flatten();
        Sample { residue, exact, opaque: false, size: a.size }
    }

    /// Functions of an exactly known real number that need no more than its sign.
    fn of_real(&self, function: Function, a: &Sample) -> Option<Sample> {
        let exact = a.exact.as_ref()?;
        match function {
            Function::Re | Function::Conj => Some(a.clone()),
            Function::Im => Some(self.decimal(Decimal { mantissa: 0, exponent: 0 })),
            Function::Abs if exact.is_negative() => Some(self.neg(a)),
            Function::Abs => Some(a.clone()),
            _ => None,
        }
    }
}

fn draw_roots(prime: Prime, basis: &Basis, random: &mut StdRng) -> Option<Vec<Residue>> {
    use rand::Rng;
    let modulus = BigUint::from(prime.modulus());
    let root = |number: &BigUint| {
        let plain = u64::try_from(number % &modulus).ok().filter(|&plain| plain != 0)?;
        let root = prime.root(plain);
        Some(if random.next_u64() >> 63 == 0 { root } else { prime.neg(root) })
    };
    basis.numbers.iter().map(root).collect()
}

impl Field for Residues {
    type Number = Sample;

    fn decimal(&self, value: Decimal) -> Sample {
        if let Some(exact) = Exact::decimal(value) {
            return self.exactly(exact);
        }
        let power = self.prime.power(self.prime.whole(10), value.exponent);
        let mantissa = self.prime.whole(value.mantissa);
        let residue = self.prime.mul(mantissa, power.unwrap_or(Residue::ZERO));
        let bits = 128.0 + 10f64.log2() * f64::from(value.exponent.unsigned_abs());
        Sample { residue, exact: None, opaque: false, size: Size { degree: 0.0, bits } }
    }

    fn pi(&self) -> Sample {
        self.exactly(Exact::pi())
    }

    fn imaginary_unit(&self) -> Sample {
        let residue = self.prime.imaginary_unit();
        Sample { residue, exact: None, opaque: false, size: Size::default() }
    }

    fn add(&self, a: &Sample, b: &Sample) -> Sample {
        let zero = |x: &Sample| x.exact.as_ref().is_some_and(|e| e.is_zero());
        match (zero(a), zero(b)) {
            (true, _) => return b.clone(),
            (_, true) => return a.clone(),
            _ => {}
        }
        let exact = a.exact.as_ref().zip(b.exact.as_ref()).and_then(|(a, b)| a.add(b));
        let residue = self.prime.add(a.residue, b.residue);
        self.sample(residue, exact, a.opaque || b.opaque, a.size.plus(b.size))
    }

    fn sub(&self, a: &Sample, b: &Sample) -> Sample {
        self.add(a, &self.neg(b))
    }

    fn mul(&self, a: &Sample, b: &Sample) -> Sample {
        let exact = a.exact.as_ref().zip(b.exact.as_ref()).and_then(|(a, b)| a.mul(b));
        let residue = self.prime.mul(a.residue, b.residue);
        self.sample(residue, exact, a.opaque || b.opaque, a.size.times(b.size))
    }

    fn neg(&self, a: &Sample) -> Sample {
        let exact = a.exact.as_ref().map(|e| Rc::new(e.neg()));
        Sample { residue: self.prime.neg(a.residue), exact, ..*a }
    }

    fn div(&self, a: &Sample, b: &Sample) -> Result<Sample, FieldError> {
        let residue = self.quotient(a.residue, b.residue).ok_or(FieldError::DivisionByZero)?;
        let inverse = b.exact.as_ref().and_then(|b| b.inverse());
        let exact = a.exact.as_ref().zip(inverse).and_then(|(a, b)| a.mul(&b));
        Ok(self.sample(residue, exact, a.opaque || b.opaque, a.size.times(b.size)))
    }

    fn whole_power(&self, a: &Sample, exponent: i32) -> Result<Sample, FieldError> {
        let residue = self.prime.power(a.residue, exponent).ok_or(FieldError::DivisionByZero)?;
        let exact = a.exact.as_ref().and_then(|e| e.power(exponent));
        let times = f64::from(exponent.unsigned_abs());
        let size = Size { degree: a.size.degree * times, bits: a.size.bits * times };
        Ok(self.sample(residue, exact, a.opaque, size))
    }

    fn power(&self, a: &Sample, b: &Sample) -> Result<Sample, FieldError> {
        match b.exact.as_ref().and_then(|b| b.halves()) {
            Some(halves) if halves % 2 == 0 => self.whole_power(a, halves / 2),
            // Principal powers of positive numbers are powers of the principal root.
            Some(halves) if a.exact.as_ref().is_some_and(|a| !a.is_negative()) => {
                self.whole_power(&self.sqrt(a), halves)
            }
            _ => {
                let arguments = [a.clone(), b.clone()];
                // `power` is no function of its own; no two-argument function is `exp`.
                Ok(self.unknown(Function::Exp, &arguments))
            }
        }
    }

    fn function(&self, function: Function, arguments: &[Sample]) -> Result<Sample, FieldError> {
        let known = match (function, arguments) {
            (Function::Sqrt, [a]) => Some(self.sqrt(a)),
            (Function::Min | Function::Max, [a, b]) => {
                let order = a.exact.as_ref().zip(b.exact.as_ref()).and_then(|(a, b)| a.compare(b));
                let wanted =
                    if function == Function::Min { Ordering::Less } else { Ordering::Greater };
                order.map(|order| if order == wanted { a.clone() } else { b.clone() })
            }
            (_, [a]) => self.of_real(function, a),
            _ => None,
        };
        Ok(known.unwrap_or_else(|| self.unknown(function, arguments)))
    }

    fn interpolate(&self, _: &[(f64, Complex64)], _: &Sample) -> Result<Sample, FieldError> {
        Err(FieldError::Undecided)
    }
}

#[cfg(test)]
mod tests {
    use crate::number::exact::Basis;
    use crate::number::residues::{Residues, Sample};
    use crate::number::{Field, FieldError, Function};
    use crate::quantity::Decimal;
    use rand::SeedableRng;
    use rand::rngs::StdRng;
    use std::rc::Rc;

    fn number(field: &Residues, text: &str) -> Sample {
        let value: f64 = text.parse().unwrap();
        field.decimal(Decimal::from_f64(value))
    }

    fn sqrt(field: &Residues, a: &Sample) -> Sample {
        field.function(Function::Sqrt, std::slice::from_ref(a)).unwrap()
    }

    /// Runs a computation in many fields, refining the basis until it spans every radicand.
    fn in_fields(mut run: impl FnMut(&Residues)) {
        let mut random = StdRng::seed_from_u64(3);
        let mut basis = Rc::new(Basis::default());
        let mut done = 0;
        while done < 20 {
            let field = Residues::draw(&mut random, &basis);
            // A computation over a basis that is too coarse may fail: look for radicands first.
            let ran = std::panic::catch_unwind(std::panic::AssertUnwindSafe(|| run(&field)));
            let missing = field.missing();
            if missing.is_empty() {
                if let Err(panic) = ran {
                    std::panic::resume_unwind(panic);
                }
                done += 1;
                continue;
            }
            let mut finer = Basis::clone(&basis);
            missing.into_iter().for_each(|n| finer.refine(n));
            basis = Rc::new(finer);
        }
    }

    #[test]
    fn roots_multiply_like_positive_numbers_and_of_squares_are_positive() {
        let values = ["2", "3", "0.5", "240e-6", "190e-6", "12", "18", "1e-7", "49"];
        in_fields(|f| {
            for a in values {
                for b in values {
                    let (a, b) = (number(f, a), number(f, b));
                    let product = f.mul(&sqrt(f, &a), &sqrt(f, &b));
                    assert_eq!(sqrt(f, &f.mul(&a, &b)).residue, product.residue);
                    assert_eq!(sqrt(f, &f.mul(&a, &a)).residue, a.residue);
                    assert_eq!(f.mul(&sqrt(f, &a), &sqrt(f, &a)).residue, a.residue);
                }
            }
        });
    }

    #[test]
    fn roots_of_pi_f_and_negative_numbers_are_those_of_the_complex_plane() {
        in_fields(|f| {
            let pi = f.pi();
            assert_eq!(sqrt(f, &f.mul(&pi, &pi)).residue, pi.residue);
            let four_f = f.mul(&number(f, "4"), &f.frequency());
            let root = f.mul(&number(f, "2"), &sqrt(f, &f.frequency()));
            assert_eq!(sqrt(f, &four_f).residue, root.residue);
            let minus_nine = f.neg(&number(f, "9"));
            let three_j = f.mul(&number(f, "3"), &f.imaginary_unit());
            assert_eq!(sqrt(f, &minus_nine).residue, three_j.residue);
            assert!(!root.opaque);
        });
    }

    #[test]
    fn half_powers_are_powers_of_the_root() {
        in_fields(|f| {
            let a = number(f, "7.5");
            let cubed = f.power(&a, &number(f, "1.5")).unwrap();
            assert_eq!(cubed.residue, f.mul(&a, &sqrt(f, &a)).residue);
            let over = f.power(&a, &f.neg(&number(f, "2"))).unwrap();
            assert_eq!(f.mul(&over, &f.mul(&a, &a)).residue, number(f, "1").residue);
        });
    }

    #[test]
    fn unknown_functions_agree_on_equal_arguments_only() {
        in_fields(|f| {
            let one_and_two = f.add(&number(f, "1"), &number(f, "2"));
            let exp = |a: Sample| f.function(Function::Exp, &[a]).unwrap();
            assert_eq!(exp(one_and_two).residue, exp(number(f, "3")).residue);
            assert_ne!(exp(number(f, "3")).residue, exp(number(f, "4")).residue);
            assert!(exp(number(f, "3")).opaque);
            assert!(f.add(&exp(number(f, "3")), &number(f, "4")).opaque);
        });
    }

    #[test]
    fn real_constants_keep_their_value_under_re_im_conj_abs_min_and_max() {
        in_fields(|f| {
            let (two, minus) = (number(f, "2"), f.neg(&number(f, "3")));
            let call =
                |function, a: &Sample| f.function(function, std::slice::from_ref(a)).unwrap();
            assert_eq!(call(Function::Conj, &minus).residue, minus.residue);
            assert_eq!(call(Function::Abs, &minus).residue, number(f, "3").residue);
            assert_eq!(call(Function::Im, &two).residue, number(f, "0").residue);
            let least = f.function(Function::Min, &[two.clone(), minus.clone()]).unwrap();
            assert_eq!(least.residue, minus.residue);
            assert!(call(Function::Abs, &f.imaginary_unit()).opaque);
        });
    }

    #[test]
    fn division_by_zero_is_a_fault() {
        in_fields(|f| {
            let zero = f.sub(&number(f, "0.3"), &f.add(&number(f, "0.1"), &number(f, "0.2")));
            assert_eq!(f.div(&number(f, "1"), &zero).unwrap_err(), FieldError::DivisionByZero);
            assert_eq!(f.whole_power(&zero, -1).unwrap_err(), FieldError::DivisionByZero);
        });
    }
}
