//! What one thread can do at most: fused multiply-adds that never leave the registers.

// Calling a function compiled for more than the baseline is what needs `unsafe`.
#![allow(unsafe_code)]

use bifilar::solve::lanes::Instructions;
use std::hint::black_box;
use std::time::Instant;

const ROUNDS: usize = 1 << 20;

/// Sums kept in flight at once: too few wait for each other, too many leave the registers.
fn counts() -> [fn(Instructions) -> f64; 5] {
    [best::<4>, best::<6>, best::<8>, best::<12>, best::<16>]
}

#[inline(always)]
fn chains<const N: usize, const V: usize, const FMA: bool>() -> f64 {
    let mut sums = [[1.0f64; V]; N];
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
fn wide<const N: usize>() -> f64 {
    chains::<N, 8, true>()
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma")]
fn narrow<const N: usize>() -> f64 {
    chains::<N, 4, true>()
}

/// Best of a few runs with `N` sums in flight, in GFLOP/s.
fn best<const N: usize>(instructions: Instructions) -> f64 {
    let mut seconds = f64::INFINITY;
    for _ in 0..5 {
        let begun = Instant::now();
        black_box(match instructions {
            #[cfg(target_arch = "x86_64")]
            // SAFETY: the caller found the features.
            Instructions::Avx512 => unsafe { wide::<N>() },
            #[cfg(target_arch = "x86_64")]
            // SAFETY: the caller found the features.
            Instructions::Avx2 => unsafe { narrow::<N>() },
            _ => chains::<N, 2, false>(),
        });
        seconds = seconds.min(begun.elapsed().as_secs_f64());
    }
    let vector = match instructions {
        Instructions::Avx512 => 8,
        Instructions::Avx2 => 4,
        Instructions::Baseline => 2,
    };
    (2 * vector * N * ROUNDS) as f64 / seconds / 1e9
}

/// The most that any instructions of the machine reach.
pub fn measured_gflops() -> f64 {
    let all = [Instructions::Baseline, Instructions::Avx2, Instructions::Avx512];
    let available = all.into_iter().filter(|i| i.available());
    available.flat_map(|i| counts().map(|measure| measure(i))).fold(0.0, f64::max)
}
