//! Residuals in twice the working precision, all lanes at once: the compensated dot product of
//! Ogita, Rump and Oishi (2005), with the values of the equations kept to twice the precision too.

use crate::number::{Affine, ComplexTwofold};
use crate::solve::lanes::Buffers;
use crate::solve::lanes::lane::Lane;
use crate::solve::lanes::values::{Equations, Listing};

/// A line over frequency: high and low parts of constant and slope, real and imaginary.
#[derive(Clone, Copy, Debug, Default)]
struct Line {
    constant: ComplexTwofold,
    slope: ComplexTwofold,
}

impl From<Affine> for Line {
    fn from(affine: Affine) -> Self {
        Line { constant: affine.constant, slope: affine.slope }
    }
}

impl Line {
    /// Real and imaginary part at the frequency of each lane.
    #[inline(always)]
    fn at<const W: usize>(&self, frequency: &[f64; W]) -> (Sum<W>, Sum<W>) {
        let Line { constant: c, slope: s } = self;
        (
            Sum::of_line((c.re.hi, s.re.hi), (c.re.lo, s.re.lo), frequency),
            Sum::of_line((c.im.hi, s.im.hi), (c.im.lo, s.im.lo), frequency),
        )
    }
}

/// The values of the equations in the order of elimination, unrounded.
#[derive(Clone, Debug, Default)]
pub(super) struct ExactValues {
    entries: Vec<Line>,
    /// Right-hand side of each row in the order of elimination; only the first side.
    right: Vec<Line>,
    /// Row in the order of elimination and number of each further value of the right-hand side.
    right_extras: Vec<(u32, u32)>,
}

impl ExactValues {
    pub fn new(listing: &Listing, equations: &Equations) -> Self {
        let n = listing.rows.len();
        let mut order = vec![0u32; n];
        listing.rows.iter().enumerate().for_each(|(at, &row)| order[row as usize] = at as u32);
        let first = equations.extra_entries.len() as u32;
        let mut right_extras: Vec<(u32, u32)> = equations
            .extra_right
            .iter()
            .zip(first..)
            .filter(|(place, _)| (**place as usize) < n)
            .map(|(&place, which)| (order[place as usize], which))
            .collect();
        right_extras.sort_unstable();
        ExactValues {
            entries: listing.slots.iter().map(|&s| equations.entries[s as usize].into()).collect(),
            right: listing.rows.iter().map(|&r| equations.right[r as usize].into()).collect(),
            right_extras,
        }
    }
}

/// A sum kept in two parts for each lane.
#[derive(Clone, Copy)]
struct Sum<const W: usize> {
    high: [f64; W],
    low: [f64; W],
}

impl<const W: usize> Sum<W> {
    #[inline(always)]
    fn of_line(line_high: (f64, f64), line_low: (f64, f64), frequency: &[f64; W]) -> Self {
        // constant + slope·f
        let mut out = Sum { high: [0.0; W], low: [0.0; W] };
        for w in 0..W {
            let (p, e) = two_product(line_high.1, frequency[w]);
            let (s, t) = two_sum(line_high.0, p);
            out.high[w] = s;
            out.low[w] = t + (e + (line_low.0 + line_low.1 * frequency[w]));
        }
        out
    }

    #[inline(always)]
    fn add(&mut self, high: &[f64; W], low: &[f64; W]) {
        for w in 0..W {
            let (s, t) = two_sum(self.high[w], high[w]);
            self.high[w] = s;
            self.low[w] += t + low[w];
        }
    }

    /// self − sign·a·(x + what was rounded off it)
    #[inline(always)]
    fn less_product(&mut self, a: &Sum<W>, x: &[f64; W], x_low: &[f64; W], sign: f64) {
        for w in 0..W {
            let x = sign * x[w];
            let (p, e) = two_product(a.high[w], x);
            let (s, t) = two_sum(self.high[w], -p);
            self.high[w] = s;
            self.low[w] += t - (e + (a.low[w] * x + sign * a.high[w] * x_low[w]));
        }
    }

    #[inline(always)]
    fn total(&self) -> [f64; W] {
        let mut out = [0.0; W];
        for w in 0..W {
            out[w] = self.high[w] + self.low[w];
        }
        out
    }
}

/// a + b and its rounding error (Knuth, 1969).
#[inline(always)]
fn two_sum(a: f64, b: f64) -> (f64, f64) {
    let s = a + b;
    let z = s - a;
    (s, (a - (s - z)) + (b - z))
}

/// a·b and its rounding error.
#[inline(always)]
fn two_product(a: f64, b: f64) -> (f64, f64) {
    let p = a * b;
    (p, a.mul_add(b, -p))
}

/// Writes b − A·x of the first right-hand side into `buffers.carried`, rows in the order of
/// elimination; x is `buffers.before` and, in less weight, `buffers.low`.
#[inline(always)]
pub(super) fn residual<const W: usize>(listing: &Listing, buffers: &mut Buffers<W>) {
    let Buffers { frequency, carried, extras, extras_low, before, low, entries, exact, .. } =
        buffers;
    let (mut at, mut next_extra, mut next_right) = (0, 0, 0);
    for (order, &count) in listing.counts.iter().enumerate() {
        let (mut re, mut im) = exact.right[order].at(frequency);
        while let Some(&(row, which)) = exact.right_extras.get(next_right)
            && row as usize == order
        {
            let (high, low) = (&extras[which as usize], &extras_low[which as usize]);
            re.add(&high.re, &low.re);
            im.add(&high.im, &low.im);
            next_right += 1;
        }
        for _ in 0..count {
            let (mut a_re, mut a_im) = exact.entries[at].at(frequency);
            while let Some(&(place, which)) = entries.extras.get(next_extra)
                && place as usize == at
            {
                let (high, low) = (&extras[which as usize], &extras_low[which as usize]);
                a_re.add(&high.re, &low.re);
                a_im.add(&high.im, &low.im);
                next_extra += 1;
            }
            let column = listing.columns[at] as usize;
            let (x, x_low) = (&before[column], &low[column]);
            re.less_product(&a_re, &x.re, &x_low.re, 1.0);
            re.less_product(&a_im, &x.im, &x_low.im, -1.0);
            im.less_product(&a_re, &x.im, &x_low.im, 1.0);
            im.less_product(&a_im, &x.re, &x_low.re, 1.0);
            at += 1;
        }
        carried[order] = Lane { re: re.total(), im: im.total() };
    }
}
