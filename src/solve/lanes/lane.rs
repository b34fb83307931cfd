//! One complex number per lane, real and imaginary parts apart, so that a vector instruction does
//! the same step of the same elimination at several frequencies.

use num_complex::Complex64;

/// `W` complex numbers, one per frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
#[repr(C, align(64))]
pub struct Lane<const W: usize> {
    /// Real parts.
    pub re: [f64; W],
    /// Imaginary parts.
    pub im: [f64; W],
}

/// a·b + c: fused where the machine has an instruction for it, since a fused operation done in
/// software costs more than everything around it.
#[inline(always)]
pub(super) fn fused<const FMA: bool>(a: f64, b: f64, c: f64) -> f64 {
    if FMA { a.mul_add(b, c) } else { a * b + c }
}

impl<const W: usize> Lane<W> {
    /// Zero in every lane.
    pub const ZERO: Self = Lane { re: [0.0; W], im: [0.0; W] };

    /// The number of one lane.
    #[inline(always)]
    pub fn get(&self, lane: usize) -> Complex64 {
        Complex64::new(self.re[lane], self.im[lane])
    }

    /// Sets the number of one lane.
    #[inline(always)]
    pub fn set(&mut self, lane: usize, value: Complex64) {
        self.re[lane] = value.re;
        self.im[lane] = value.im;
    }

    /// self − a·b
    #[inline(always)]
    pub(super) fn less<const FMA: bool>(&self, a: &Self, b: &Self) -> Self {
        let mut out = *self;
        for w in 0..W {
            let re = fused::<FMA>(-a.re[w], b.re[w], out.re[w]);
            out.re[w] = fused::<FMA>(a.im[w], b.im[w], re);
        }
        for w in 0..W {
            let im = fused::<FMA>(-a.re[w], b.im[w], out.im[w]);
            out.im[w] = fused::<FMA>(-a.im[w], b.re[w], im);
        }
        out
    }

    /// self · b
    #[inline(always)]
    pub(super) fn times<const FMA: bool>(&self, b: &Self) -> Self {
        let mut out = Self::ZERO;
        for w in 0..W {
            out.re[w] = fused::<FMA>(self.re[w], b.re[w], -(self.im[w] * b.im[w]));
        }
        for w in 0..W {
            out.im[w] = fused::<FMA>(self.re[w], b.im[w], self.im[w] * b.re[w]);
        }
        out
    }

    /// 1/self. Where the square of the magnitude leaves the range of doubles the lane becomes
    /// infinite, zero or not-a-number, which the judgement of the solution finds.
    #[inline(always)]
    pub(super) fn inverse<const FMA: bool>(&self) -> Self {
        let mut out = Self::ZERO;
        for w in 0..W {
            let square = fused::<FMA>(self.re[w], self.re[w], self.im[w] * self.im[w]);
            let scale = 1.0 / square;
            out.re[w] = self.re[w] * scale;
            out.im[w] = -(self.im[w] * scale);
        }
        out
    }

    /// self + b
    #[inline(always)]
    pub(super) fn plus(&self, b: &Self) -> Self {
        let mut out = *self;
        for w in 0..W {
            out.re[w] += b.re[w];
            out.im[w] += b.im[w];
        }
        out
    }

    /// |re| + |im| of each lane: between the magnitude and √2 times the magnitude.
    #[inline(always)]
    pub(super) fn size(&self) -> [f64; W] {
        let mut out = [0.0; W];
        for w in 0..W {
            out[w] = self.re[w].abs() + self.im[w].abs();
        }
        out
    }
}

/// A value constant + slope·f, rounded to doubles.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Coefficient {
    pub constant: Complex64,
    pub slope: Complex64,
}

impl Coefficient {
    /// The value at the frequency of each lane.
    #[inline(always)]
    pub fn at<const W: usize, const FMA: bool>(&self, frequency: &[f64; W]) -> Lane<W> {
        let mut out = Lane::ZERO;
        for w in 0..W {
            out.re[w] = fused::<FMA>(self.slope.re, frequency[w], self.constant.re);
        }
        for w in 0..W {
            out.im[w] = fused::<FMA>(self.slope.im, frequency[w], self.constant.im);
        }
        out
    }
}
