//! Any number of windings as uncoupled windings with dependent sources.
//!
//! The definition of mutual inductance itself: into the dot of each winding the others' currents
//! induce Σ (R_m + jωM)·i, here one source in series with the winding. It is no part one could buy,
//! but the exact restatement for tools that know dependent sources and no coupling.
//!
//! Holds always, k = 1, f = 0 and any law of frequency included, and keeps every island apart.

use crate::circuit::{Drive, End, Law};
use crate::quantity::Dimension;
use crate::swap::build::{Build, joint};
use crate::swap::sets::CoupledSet;
use crate::swap::{Condition, Fate, SwapError};

pub(crate) fn build(build: &mut Build, set: &CoupledSet) -> Result<Condition, SwapError> {
    let j_omega = build.algebra.j_omega();
    let mut impedance = vec![None; set.len() * set.len()];
    for i in 0..set.len() {
        for j in i + 1..set.len() {
            let Some(mutual) = set.mutual(i, j) else { continue };
            let reactance = mutual.inductance.map(|m| build.algebra.product(j_omega, m));
            let Some(z) = build.algebra.sum(mutual.resistance, reactance) else { continue };
            let joint = joint(&set.windings[i].name, &set.windings[j].name);
            build.name_value(&format!("Z_{joint}"), z);
            build.note(
                &format!("Z_{}", joint.replace('.', "_")),
                Some(z),
                Dimension::RESISTANCE,
                Fate::Element,
                true,
            );
            impedance[i * set.len() + j] = Some(z);
            impedance[j * set.len() + i] = Some(z);
        }
    }
    for (i, winding) in set.windings.iter().enumerate() {
        let terms: Vec<_> = (0..set.len())
            .filter_map(|j| Some((j, impedance[i * set.len() + j]?)))
            .map(|(j, z)| build.induced(set, j, z))
            .collect();
        let (inductance, series) = (winding.inductance, winding.series);
        let law = Law::Winding { inductance, series, dot: None };
        let own = (format!("{}_own", winding.name), law);
        let inner = winding.node(winding.dot);
        let far = winding.plain();
        let between = match terms.is_empty() {
            true => far,
            false => build.node(&format!("{}_in", winding.name), inner),
        };
        let along = |a, b| if winding.dot == End::Left { (a, b) } else { (b, a) };
        let (left, right) = along(inner, between);
        let id = build.add(&own.0, left, right, own.1);
        build.amps.insert(winding.id, vec![(false, id)]);
        if !terms.is_empty() {
            let (left, right) = along(between, far);
            let drive = Drive { constant: None, terms, end: winding.dot };
            let name = format!("{}_induced", winding.name);
            build.add(&name, left, right, Law::VoltageSource(drive));
        }
        build.note(&own.0, Some(inductance), Dimension::INDUCTANCE, Fate::Element, false);
    }
    Ok(Condition::Always)
}
