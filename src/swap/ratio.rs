//! A ratio before the second winding, so that no leg of a tee or pi is negative.
//!
//! Behind an ideal transformer of n : 1 the second winding looks like n²·L2 and the mutual
//! inductance like n·M, whatever n is; the tee's legs are then L1 − n·M, n²·L2 − n·M and n·M. None
//! is negative for |M|/L2 ≤ n ≤ L1/|M|, n with the sign of M (at k = 1 that is one value). The
//! geometric mean of the two limits is √(L1/L2): it divides the leakage evenly. (Textbook circuit
//! theory of coupled coils, as in Terman, Radio Engineers' Handbook; from memory.)

use crate::circuit::FormulaId;
use crate::quantity::Dimension;
use crate::swap::SwapError;
use crate::swap::build::Build;
use crate::swap::sets::CoupledSet;
use std::str::FromStr;

/// The turns of the first side for one turn of the second.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Ratio {
    /// √(L1/L2) with the sign of M: no leg is negative.
    Auto,
    /// As given; negative: crossed over.
    Turns(f64),
}

impl Ratio {
    pub(crate) fn is_zero(self) -> bool {
        matches!(self, Ratio::Turns(n) if n == 0.0 || !n.is_finite())
    }
}

impl FromStr for Ratio {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        match text.trim() {
            "auto" => Ok(Ratio::Auto),
            number => number
                .parse()
                .map(Ratio::Turns)
                .map_err(|_| String::from("a ratio is a number such as 2.5, or `auto`")),
        }
    }
}

/// The size of the ratio as a formula, and whether the second winding is crossed over.
pub(crate) fn turns(
    build: &mut Build,
    set: &CoupledSet,
    ratio: Ratio,
) -> Result<(FormulaId, bool), SwapError> {
    let m = build.algebra.real_or_zero(set.inductance(0, 1));
    match ratio {
        Ratio::Turns(n) => {
            warn_outside(build, set, n);
            Ok((build.algebra.number(n.abs(), Dimension::NONE), n < 0.0))
        }
        Ratio::Auto => {
            let n = set.voltage_ratio(&mut build.algebra);
            match (build.algebra.real(n), m) {
                (Some(value), Some(m)) if value > 0.0 => Ok((n, m < 0.0)),
                _ => Err(SwapError::RatioVaries { names: set.names(), span: set.span }),
            }
        }
    }
}

fn warn_outside(build: &mut Build, set: &CoupledSet, n: f64) {
    let real = |id| build.algebra.real(id);
    let parts = (
        real(set.windings[0].inductance),
        real(set.windings[1].inductance),
        build.algebra.real_or_zero(set.inductance(0, 1)),
    );
    let (Some(l1), Some(l2), Some(m)) = parts else { return };
    if m == 0.0 {
        return;
    }
    let (least, most) = (m.abs() / l2, l1 / m.abs());
    let inside = (least * (1.0 - 1e-12)..=most * (1.0 + 1e-12)).contains(&n.abs());
    if !inside || (n < 0.0) != (m < 0.0) {
        let sign = if m < 0.0 { "-" } else { "" };
        build.warnings.push(format!(
            "with a ratio of {n} some leg of {} is negative; none is from {sign}{least:.6} to \
             {sign}{most:.6}",
            set.names()
        ));
    }
}
