//! Arithmetic modulo a prime, and in the field of its square: where square roots and j have exact
//! residues, so that two formulas are compared without rounding.
//!
//! Primes here are 5 modulo 8. Then 2 is no square, j = 2^((p−1)/4) is a root of −1, and adjoining
//! √2 gives a field of p² elements in which every residue modulo p has a square root.

use rand::Rng;

/// Primes are drawn from [2^60, 2^61), so that sums of eight products fit 128 bits.
const LEAST_BITS: u32 = 60;

/// Bases that decide primality of every number below 3.18·10^23 (Sorenson and Webster, 2017).
const WITNESSES: [u64; 12] = [2, 3, 5, 7, 11, 13, 17, 19, 23, 29, 31, 37];

/// The non-residue whose root is adjoined.
const ADJOINED: u64 = 2;

/// a + b·√2, both parts below the prime.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub struct Residue {
    /// The part without √2.
    pub plain: u64,
    /// The factor of √2.
    pub root: u64,
}

/// A prime p = 5 (mod 8) and arithmetic in the field of p² elements.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Prime {
    p: u64,
    /// A root of −1.
    j: u64,
}

impl Residue {
    /// Zero.
    pub const ZERO: Residue = Residue { plain: 0, root: 0 };
    /// One.
    pub const ONE: Residue = Residue { plain: 1, root: 0 };

    /// True for zero.
    pub fn is_zero(self) -> bool {
        self == Self::ZERO
    }
}

impl Prime {
    /// A random prime, every one in the range equally likely.
    pub fn random(random: &mut impl Rng) -> Self {
        loop {
            let drawn = (1 << LEAST_BITS) | (random.next_u64() >> (64 - LEAST_BITS));
            if let Some(prime) = Prime::new((drawn & !7) | 5) {
                return prime;
            }
        }
    }

    /// The field of a number, if that is a prime, 5 modulo 8, and below 2^61.
    pub fn new(p: u64) -> Option<Self> {
        if p % 8 != 5 || p >> (LEAST_BITS + 1) != 0 || !is_prime(p) {
            return None;
        }
        // 2 is no square modulo such a prime, so 2^((p−1)/2) = −1.
        Some(Prime { p, j: power(ADJOINED, (p - 1) / 4, p) })
    }

    /// The prime itself.
    pub fn modulus(self) -> u64 {
        self.p
    }

    /// j, the root of −1.
    pub fn imaginary_unit(self) -> Residue {
        Residue { plain: self.j, root: 0 }
    }

    /// A residue of a whole number.
    pub fn whole(self, value: u128) -> Residue {
        Residue { plain: (value % u128::from(self.p)) as u64, root: 0 }
    }

    /// Any element of the field, all equally likely.
    pub fn random_residue(self, random: &mut impl Rng) -> Residue {
        let mut below = || {
            loop {
                let drawn = random.next_u64() >> (63 - LEAST_BITS);
                if drawn < self.p {
                    return drawn;
                }
            }
        };
        Residue { plain: below(), root: below() }
    }

    /// a + b
    pub fn add(self, a: Residue, b: Residue) -> Residue {
        let sum = |a: u64, b: u64| if a + b >= self.p { a + b - self.p } else { a + b };
        Residue { plain: sum(a.plain, b.plain), root: sum(a.root, b.root) }
    }

    /// −a
    pub fn neg(self, a: Residue) -> Residue {
        let minus = |a: u64| if a == 0 { 0 } else { self.p - a };
        Residue { plain: minus(a.plain), root: minus(a.root) }
    }

    /// a − b
    pub fn sub(self, a: Residue, b: Residue) -> Residue {
        self.add(a, self.neg(b))
    }

    /// a · b
    pub fn mul(self, a: Residue, b: Residue) -> Residue {
        let wide = |a: u64, b: u64| u128::from(a) * u128::from(b);
        if a.root == 0 && b.root == 0 {
            return Residue { plain: self.reduce(wide(a.plain, b.plain)), root: 0 };
        }
        // (a + a'√2)(b + b'√2) = ab + 2a'b' + (ab' + a'b)√2
        let adjoined = u128::from(ADJOINED) * wide(a.root, b.root);
        Residue {
            plain: self.reduce(wide(a.plain, b.plain) + adjoined),
            root: self.reduce(wide(a.plain, b.root) + wide(a.root, b.plain)),
        }
    }

    fn reduce(self, wide: u128) -> u64 {
        (wide % u128::from(self.p)) as u64
    }

    /// 1/a; `None` for zero.
    pub fn inverse(self, a: Residue) -> Option<Residue> {
        if a.is_zero() {
            return None;
        }
        // 1/(a + a'√2) = (a − a'√2)/(a² − 2a'²); the norm is a plain residue.
        let conjugate = Residue { plain: a.plain, root: self.neg(a).root };
        let norm = self.mul(a, conjugate);
        let inverse = Residue { plain: inverse(norm.plain, self.p), root: 0 };
        Some(self.mul(conjugate, inverse))
    }

    /// a to a whole power; `None` for a negative power of zero.
    pub fn power(self, a: Residue, exponent: i32) -> Option<Residue> {
        let mut base = if exponent < 0 { self.inverse(a)? } else { a };
        let mut left = exponent.unsigned_abs();
        let mut result = Residue::ONE;
        while left > 0 {
            if left & 1 == 1 {
                result = self.mul(result, base);
            }
            base = self.mul(base, base);
            left >>= 1;
        }
        Some(result)
    }

    /// One of the two square roots of a plain residue: plain if it is a square modulo p, else a
    /// multiple of √2.
    pub fn root(self, plain: u64) -> Residue {
        let square = |root: u64| self.reduce(u128::from(root) * u128::from(root));
        // For p = 5 (mod 8) a square a has the root a^((p+3)/8), or that times j.
        let plain_root = |a: u64| {
            let root = power(a, self.p / 8 + 1, self.p);
            let other = self.reduce(u128::from(root) * u128::from(self.j));
            [root, other].into_iter().find(|&r| square(r) == a)
        };
        match plain_root(plain) {
            Some(root) => Residue { plain: root, root: 0 },
            None => {
                let half = self.reduce(u128::from(plain) * u128::from(inverse(ADJOINED, self.p)));
                // The quotient of two non-squares is a square.
                Residue { plain: 0, root: plain_root(half).unwrap_or(0) }
            }
        }
    }
}

fn power(base: u64, mut exponent: u64, modulus: u64) -> u64 {
    let times = |a: u64, b: u64| (u128::from(a) * u128::from(b) % u128::from(modulus)) as u64;
    let (mut base, mut result) = (base % modulus, 1);
    while exponent > 0 {
        if exponent & 1 == 1 {
            result = times(result, base);
        }
        base = times(base, base);
        exponent >>= 1;
    }
    result
}

/// 1/a modulo a prime, by the extended Euclidean algorithm; `a` must not be zero.
fn inverse(a: u64, p: u64) -> u64 {
    let (mut old, mut new) = (i128::from(p), i128::from(a));
    let (mut old_factor, mut new_factor) = (0i128, 1i128);
    while new != 0 {
        let quotient = old / new;
        (old, new) = (new, old - quotient * new);
        (old_factor, new_factor) = (new_factor, old_factor - quotient * new_factor);
    }
    old_factor.rem_euclid(i128::from(p)) as u64
}

/// Primality, by the strong test of Miller and Rabin; for 64 bits these bases leave no doubt.
pub fn is_prime(n: u64) -> bool {
    if let Some(&small) = WITNESSES.iter().find(|&&small| n.is_multiple_of(small)) {
        return n == small;
    }
    if n < 2 {
        return false;
    }
    let twos = (n - 1).trailing_zeros();
    let odd = (n - 1) >> twos;
    WITNESSES.iter().all(|&base| {
        let mut x = power(base, odd, n);
        if x == 1 || x == n - 1 {
            return true;
        }
        (1..twos).any(|_| {
            x = (u128::from(x) * u128::from(x) % u128::from(n)) as u64;
            x == n - 1
        })
    })
}

#[cfg(test)]
mod tests {
    use crate::number::prime::{Prime, Residue, is_prime};
    use rand::SeedableRng;
    use rand::rngs::StdRng;

    fn fields() -> impl Iterator<Item = (Prime, StdRng)> {
        (0..20).map(|seed| {
            let mut random = StdRng::seed_from_u64(seed);
            (Prime::random(&mut random), random)
        })
    }

    #[test]
    fn primality_agrees_with_trial_division() {
        let slow = |n: u64| n > 1 && (2..).take_while(|d| d * d <= n).all(|d| n % d != 0);
        for n in 0..20_000 {
            assert_eq!(is_prime(n), slow(n), "{n}");
        }
    }

    #[test]
    fn known_large_primes_and_strong_pseudoprimes_are_told_apart() {
        assert!(is_prime((1 << 61) - 1));
        assert!(!is_prime((1 << 61) + 1));
        // The least numbers that pass the strong test to the first few prime bases.
        for pseudoprime in [2047, 1_373_653, 3_215_031_751, 3_825_123_056_546_413_051] {
            assert!(!is_prime(pseudoprime), "{pseudoprime}");
        }
    }

    #[test]
    fn random_primes_lie_in_their_range_and_class() {
        for (field, _) in fields() {
            let p = field.modulus();
            assert!(p >> 60 == 1 && p % 8 == 5 && is_prime(p));
        }
        assert_eq!(Prime::new(17), None, "1 modulo 8");
        assert_eq!(Prime::new(21), None, "not prime");
    }

    #[test]
    fn the_laws_of_a_field_hold() {
        for (f, mut random) in fields() {
            for _ in 0..50 {
                let mut draw = || f.random_residue(&mut random);
                let (a, b, c) = (draw(), draw(), draw());
                assert_eq!(f.mul(a, f.add(b, c)), f.add(f.mul(a, b), f.mul(a, c)));
                assert_eq!(f.mul(a, f.mul(b, c)), f.mul(f.mul(a, b), c));
                assert_eq!(f.mul(a, b), f.mul(b, a));
                assert_eq!(f.add(f.sub(a, b), b), a);
                assert_eq!(f.mul(a, f.inverse(a).unwrap()), Residue::ONE);
                assert_eq!(f.power(a, 5).unwrap(), f.mul(a, f.power(a, 4).unwrap()));
                assert_eq!(f.mul(f.power(a, -3).unwrap(), f.power(a, 3).unwrap()), Residue::ONE);
            }
            assert_eq!(f.inverse(Residue::ZERO), None);
            assert_eq!(f.power(Residue::ZERO, -1), None);
        }
    }

    #[test]
    fn j_squared_is_minus_one() {
        for (f, _) in fields() {
            let j = f.imaginary_unit();
            assert_eq!(f.mul(j, j), f.neg(Residue::ONE));
        }
    }

    #[test]
    fn every_plain_residue_has_a_root() {
        for (f, _) in fields() {
            for value in (0..200).chain([f.modulus() - 1]) {
                let root = f.root(value);
                assert_eq!(f.mul(root, root), f.whole(value.into()), "{value}");
            }
        }
    }
}
