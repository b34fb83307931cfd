//! What each lane's solution is worth: the componentwise backward error of Oettli and Prager
//! (1964), from the residual in plain doubles.

use crate::solve::lanes::Buffers;
use crate::solve::lanes::lane::{Lane, fused};
use crate::solve::lanes::values::Listing;

/// Smallest divisor: keeps 0/0 of a row without any value at zero.
const LEAST: f64 = f64::MIN_POSITIVE;

/// Finds the backward error of every lane into `buffers.backward`: the largest of
/// |b − A·x| / (|A|·|x| + |b|) over rows and right-hand sides, infinite where the solution is not
/// a number. Magnitudes are taken as |re| + |im|, which is right within a factor of √2.
///
/// The residuals are left in `buffers.carried`.
#[inline(always)]
pub(super) fn judge<const W: usize, const FMA: bool>(listing: &Listing, buffers: &mut Buffers<W>) {
    let Buffers { frequency, carried, extras, solution, entries, driven, .. } = buffers;
    driven.write::<W, FMA>(frequency, extras, carried);
    let sides = driven.sides;
    let mut worst = [0.0; W];
    let mut total = [0.0; W];
    for side in 0..sides {
        let mut at = 0;
        let mut extra = entries.extras.iter().peekable();
        for (order, &count) in listing.counts.iter().enumerate() {
            let place = order * sides + side;
            let mut rest = carried[place];
            let mut scale = rest.size();
            let last = at + count as usize;
            let row = listing.columns[at..last].iter().zip(&entries.coefficients[at..last]);
            for (&column, coefficient) in row {
                let mut value = coefficient.at::<W, FMA>(frequency);
                if let Some(&&(_, which)) = extra.peek().filter(|e| e.0 as usize == at) {
                    value = value.plus(&extras[which as usize]);
                    extra.next();
                }
                at += 1;
                let x = &solution[column as usize * sides + side];
                rest = rest.less::<FMA>(&value, x);
                add_sizes::<W, FMA>(&mut scale, &value, x);
            }
            let size = rest.size();
            for w in 0..W {
                worst[w] = f64::max(worst[w], size[w] / (scale[w] + LEAST));
                total[w] += scale[w];
            }
            carried[place] = rest;
        }
    }
    for w in 0..W {
        buffers.backward[w] = if total[w].is_finite() { worst[w] } else { f64::INFINITY };
    }
}

#[inline(always)]
fn add_sizes<const W: usize, const FMA: bool>(sum: &mut [f64; W], a: &Lane<W>, b: &Lane<W>) {
    let (a, b) = (a.size(), b.size());
    for w in 0..W {
        sum[w] = fused::<FMA>(a[w], b[w], sum[w]);
    }
}
