//! What each lane's solution is worth: the componentwise backward error of Oettli and Prager
//! (1964), from the residual in plain doubles.

use crate::solve::lanes::Buffers;
use crate::solve::lanes::lane::{Lane, fused};
use crate::solve::lanes::values::{Given, Listing};

/// Smallest divisor: keeps 0/0 of a row without any value at zero.
const LEAST: f64 = f64::MIN_POSITIVE;

/// Finds the backward error of every lane into `buffers.backward`: the largest of
/// |b − A·x| / (|A|·|x| + |b|) over rows and right-hand sides, infinite where the solution is not
/// a number. Magnitudes are taken as |re| + |im|, which is right within a factor of √2.
///
/// The residuals are left in `buffers.carried` if `keep` is set.
#[inline(always)]
pub(super) fn judge<const W: usize, const FMA: bool>(
    listing: &Listing,
    buffers: &mut Buffers<W>,
    keep: bool,
) {
    let Buffers { frequency, carried, extras, solution, entries, driven, right, .. } = buffers;
    let sides = driven.sides;
    // The worst quotient so far as numerator and denominator: no division in the loop.
    let (mut above, mut below) = ([0.0; W], [1.0; W]);
    let mut total = [0.0; W];
    let (mut at, mut next_extra) = (0, 0);
    let mut given = Given::default();
    for (order, &count) in listing.counts.iter().enumerate() {
        driven.begin::<W, FMA>(&mut given, order, frequency, extras, right);
        let (first, last) = (at, at + count as usize);
        let extras_before = next_extra;
        for side in 0..sides {
            at = first;
            next_extra = extras_before;
            let mut rest = right[side];
            let mut scale = rest.size();
            let columns = &listing.columns[first..last];
            let coefficients = &entries.coefficients[first..last];
            for e in 0..columns.len() {
                let mut value = coefficients[e].at::<W, FMA>(frequency);
                if let Some(&(place, which)) = entries.extras.get(next_extra)
                    && place as usize == at
                {
                    value = value.plus(&extras[which as usize]);
                    next_extra += 1;
                }
                at += 1;
                let x = &solution[columns[e] as usize * sides + side];
                rest = rest.less::<FMA>(&value, x);
                add_sizes::<W, FMA>(&mut scale, &value, x);
            }
            let size = rest.size();
            for w in 0..W {
                scale[w] += LEAST;
            }
            for w in 0..W {
                total[w] += scale[w];
            }
            keep_worse(&mut above, &mut below, &size, &scale);
            if keep {
                carried[order * sides + side] = rest;
            }
        }
    }
    for w in 0..W {
        let worst = above[w] / below[w];
        buffers.backward[w] =
            if total[w].is_finite() && worst.is_finite() { worst } else { f64::INFINITY };
    }
}

/// The largest correction of an unknown relative to it, in each lane: what the correction itself
/// may be off by, relative to its size, since it comes from the same factors.
#[inline(always)]
pub(super) fn contraction<const W: usize>(
    solution: &[Lane<W>],
    corrections: &[Lane<W>],
) -> [f64; W] {
    let (mut above, mut below) = ([0.0; W], [1.0; W]);
    let mut total = [0.0; W];
    for (old, correction) in solution.iter().zip(corrections) {
        let (size, mut scale) = (correction.size(), old.size());
        for w in 0..W {
            scale[w] += LEAST;
        }
        for w in 0..W {
            total[w] += size[w] + scale[w];
        }
        keep_worse(&mut above, &mut below, &size, &scale);
    }
    let mut out = [f64::INFINITY; W];
    for w in 0..W {
        let worst = above[w] / below[w];
        if total[w].is_finite() && worst.is_finite() {
            out[w] = worst;
        }
    }
    out
}

/// Takes size/scale in the place of above/below where it is larger.
#[inline(always)]
fn keep_worse<const W: usize>(
    above: &mut [f64; W],
    below: &mut [f64; W],
    size: &[f64; W],
    scale: &[f64; W],
) {
    let (mut new, mut old) = ([0.0; W], [0.0; W]);
    for w in 0..W {
        new[w] = size[w] * below[w];
    }
    for w in 0..W {
        old[w] = above[w] * scale[w];
    }
    for w in 0..W {
        above[w] = if new[w] > old[w] { size[w] } else { above[w] };
    }
    for w in 0..W {
        below[w] = if new[w] > old[w] { scale[w] } else { below[w] };
    }
}

#[inline(always)]
fn add_sizes<const W: usize, const FMA: bool>(sum: &mut [f64; W], a: &Lane<W>, b: &Lane<W>) {
    let (a, b) = (a.size(), b.size());
    for w in 0..W {
        sum[w] = fused::<FMA>(a[w], b[w], sum[w]);
    }
}
