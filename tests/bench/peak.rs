//! What one thread can do at most: fused multiply-adds that never leave the registers.

// Calling a function compiled for more than the baseline is what needs `unsafe`.
#![allow(unsafe_code)]

use std::hint::black_box;
use std::time::Instant;

const ROUNDS: usize = 1 << 20;
const CHAINS: usize = 12;

#[inline(always)]
fn chains<const V: usize, const FMA: bool>() -> f64 {
    let mut sums = [[1.0f64; V]; CHAINS];
    let (a, b) = (black_box([0.999_999; V]), black_box([1e-6; V]));
    for _ in 0..ROUNDS {
        for sum in &mut sums {
            for v in 0..V {
                sum[v] = if FMA { sum[v].mul_add(a[v], b[v]) } else { sum[v] * a[v] + b[v] };
            }
        }
    }
    sums.iter().flatten().sum()
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx512f,avx512vl,avx512dq,avx2,fma")]
fn wide() -> f64 {
    chains::<8, true>()
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma")]
fn narrow() -> f64 {
    chains::<4, true>()
}

/// Measured with the widest instructions of the machine.
pub fn measured_gflops() -> f64 {
    use bifilar::solve::lanes::Instructions;
    let widest = Instructions::widest();
    let mut best = f64::INFINITY;
    for _ in 0..5 {
        let begun = Instant::now();
        black_box(match widest {
            #[cfg(target_arch = "x86_64")]
            // SAFETY: `widest` found the features.
            Instructions::Avx512 => unsafe { wide() },
            #[cfg(target_arch = "x86_64")]
            // SAFETY: `widest` found the features.
            Instructions::Avx2 => unsafe { narrow() },
            _ => chains::<2, false>(),
        });
        best = best.min(begun.elapsed().as_secs_f64());
    }
    let vector = match widest {
        Instructions::Avx512 => 8,
        Instructions::Avx2 => 4,
        Instructions::Baseline => 2,
    };
    (2 * vector * CHAINS * ROUNDS) as f64 / best / 1e9
}
