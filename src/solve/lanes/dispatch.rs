//! The widest vector instructions of the machine, found when the program runs.

// Calling a function compiled for more than the baseline is what needs `unsafe`.
#![allow(unsafe_code)]

use crate::solve::lanes::work::{Job, work};
use crate::solve::lanes::{Buffers, Plan};

/// Vector instructions to compute with.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Instructions {
    /// What every machine of this kind has.
    Baseline,
    /// AVX2 with fused multiply-add: four doubles at once.
    Avx2,
    /// AVX-512: eight doubles at once.
    Avx512,
}

impl Instructions {
    /// The widest this machine has.
    pub fn widest() -> Self {
        [Instructions::Avx512, Instructions::Avx2]
            .into_iter()
            .find(|i| i.available())
            .unwrap_or(Instructions::Baseline)
    }

    /// Whether this machine has them.
    pub fn available(self) -> bool {
        match self {
            Instructions::Baseline => true,
            #[cfg(target_arch = "x86_64")]
            Instructions::Avx2 => {
                is_x86_feature_detected!("avx2") && is_x86_feature_detected!("fma")
            }
            #[cfg(target_arch = "x86_64")]
            Instructions::Avx512 => {
                Instructions::Avx2.available()
                    && is_x86_feature_detected!("avx512f")
                    && is_x86_feature_detected!("avx512dq")
                    && is_x86_feature_detected!("avx512vl")
            }
            #[cfg(not(target_arch = "x86_64"))]
            _ => false,
        }
    }
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx512f,avx512dq,avx512vl,avx2,fma")]
fn with_avx512<const W: usize>(plan: &Plan, buffers: &mut Buffers<W>, job: Job) {
    work::<W, 8, true>(plan, buffers, job);
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma")]
fn with_avx2<const W: usize>(plan: &Plan, buffers: &mut Buffers<W>, job: Job) {
    work::<W, 4, true>(plan, buffers, job);
}

/// Does a job with the given instructions, or the widest below them that the machine has.
pub(super) fn dispatch<const W: usize>(
    instructions: Instructions,
    plan: &Plan,
    buffers: &mut Buffers<W>,
    job: Job,
) {
    match instructions.min(Instructions::widest()) {
        #[cfg(target_arch = "x86_64")]
        // SAFETY: `widest` found all the features `with_avx512` is compiled for.
        Instructions::Avx512 => unsafe { with_avx512(plan, buffers, job) },
        #[cfg(target_arch = "x86_64")]
        // SAFETY: `widest` found all the features `with_avx2` is compiled for.
        Instructions::Avx2 => unsafe { with_avx2(plan, buffers, job) },
        _ => work::<W, 2, { cfg!(target_arch = "aarch64") }>(plan, buffers, job),
    }
}
