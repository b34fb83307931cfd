//! KLU (Davis and Natarajan, 2010) as the benchmark's yardstick: analysed and factored once, then
//! refactored and solved at each frequency, scaling off.

// A foreign library.
#![allow(unsafe_code)]

use crate::Engine;
use crate::networks::{Network, values};
use num_complex::Complex64;
use std::os::raw::{c_int, c_void};

/// Room for the library's settings, larger than it is in any version.
#[repr(C, align(16))]
struct Common {
    tol: f64,
    memgrow: f64,
    initmem_amd: f64,
    initmem: f64,
    maxwork: f64,
    btf: c_int,
    ordering: c_int,
    scale: c_int,
    rest: [u8; 1024],
}

#[link(name = "klu")]
unsafe extern "C" {
    fn klu_defaults(common: *mut Common) -> c_int;
    fn klu_analyze(
        n: c_int,
        start: *mut c_int,
        row: *mut c_int,
        common: *mut Common,
    ) -> *mut c_void;
    fn klu_z_factor(
        start: *mut c_int,
        row: *mut c_int,
        values: *mut f64,
        symbolic: *mut c_void,
        common: *mut Common,
    ) -> *mut c_void;
    fn klu_z_refactor(
        start: *mut c_int,
        row: *mut c_int,
        values: *mut f64,
        symbolic: *mut c_void,
        numeric: *mut c_void,
        common: *mut Common,
    ) -> c_int;
    fn klu_z_solve(
        symbolic: *mut c_void,
        numeric: *mut c_void,
        leading: c_int,
        sides: c_int,
        right: *mut f64,
        common: *mut Common,
    ) -> c_int;
}

pub fn engine(network: &Network) -> Engine<'_> {
    let n = network.pattern.n;
    let mut start: Vec<c_int> = network.pattern.column_start.iter().map(|&s| s as c_int).collect();
    let mut row: Vec<c_int> = network.pattern.row.iter().map(|&r| r as c_int).collect();
    let mut entries = vec![Complex64::default(); row.len()];
    let mut right = vec![Complex64::default(); n];
    // SAFETY: all zeros is a valid value of plain numbers and bytes.
    let mut common: Box<Common> = Box::new(unsafe { std::mem::zeroed() });
    values(network, network.middle_hz(), &mut entries, &mut right);
    let (start_at, row_at) = (start.as_mut_ptr(), row.as_mut_ptr());
    // SAFETY: the arrays are a valid matrix by columns and live as long as the engine; a pair of
    // doubles is how the library takes a complex number.
    let (symbolic, numeric) = unsafe {
        klu_defaults(&mut *common);
        common.scale = -1;
        let symbolic = klu_analyze(n as c_int, start_at, row_at, &mut *common);
        assert!(!symbolic.is_null(), "KLU has an analysis");
        let at = entries.as_mut_ptr().cast();
        let numeric = klu_z_factor(start_at, row_at, at, symbolic, &mut *common);
        assert!(!numeric.is_null(), "KLU has factors");
        (symbolic, numeric)
    };
    let sweep = Box::new(move |frequencies: &[f64]| {
        for &f in frequencies {
            values(network, f, &mut entries, &mut right);
            // SAFETY: as above.
            let done = unsafe {
                klu_z_refactor(
                    start.as_mut_ptr(),
                    row.as_mut_ptr(),
                    entries.as_mut_ptr().cast(),
                    symbolic,
                    numeric,
                    &mut *common,
                ) & klu_z_solve(
                    symbolic,
                    numeric,
                    n as c_int,
                    1,
                    right.as_mut_ptr().cast(),
                    &mut *common,
                )
            };
            assert_eq!(done, 1, "KLU solved");
            std::hint::black_box(right[0]);
        }
    });
    Engine { name: "KLU refactor + solve".into(), sweep, best_seconds: f64::INFINITY }
}
