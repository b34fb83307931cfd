//! Two windings that share a node as a pi: D/(L2 − M'), D/(L1 − M') and D/M', D = L1·L2 − M².
//!
//! The inverse of the inductance matrix gives the currents from the fluxes of the two ports:
//! i1 = (L2·v1 − M'·v2)/(s·D) = (L2 − M')/(s·D)·v1 + M'/(s·D)·(v1 − v2), and likewise i2. The
//! first term is a leg from the port to the common node, the second one a leg between the ports.
//!
//! Holds as a tee does, and only for k < 1: at k = 1 D is zero. A leg whose divisor is zero is
//! infinite and left out. Mutual resistance stays outside as a dependent source. The three legs
//! form a loop of windings, which is singular at f = 0. (Textbook: the inverse of the tee, as in
//! Guillemin, Introductory Circuit Theory; from memory.)

use crate::swap::algebra::Maybe;
use crate::swap::build::{Build, Laid, Role};
use crate::swap::pair;
use crate::swap::sets::CoupledSet;
use crate::swap::tee::note_amps;
use crate::swap::{Condition, Kind, SwapError};

pub(crate) fn build(build: &mut Build, set: &CoupledSet) -> Result<Condition, SwapError> {
    let refused = || {
        let (names, span) = (set.names(), set.span);
        SwapError::FullyCoupled { kind: Kind::Pi, names, span }
    };
    if set.len() == 2 && set.determinant(&mut build.algebra).is_none() {
        return Err(refused());
    }
    let pair = pair::prepare(build, set, Kind::Pi, true)?;
    let own = set.determinant(&mut build.algebra).ok_or_else(refused)?;
    let determinant = match pair.ratio_squared {
        Some(square) => build.algebra.product(square, own),
        None => own,
    };
    build.name_value(&format!("D_{}", pair.joint), determinant);
    let mut into = [Some(Vec::new()), Some(Vec::new())];
    for (i, terms) in into.iter_mut().flatten().enumerate() {
        let divisor = build.algebra.difference(Some(pair.own[1 - i]), pair.mutual);
        let name = format!("{}_shunt", set.windings[i].name);
        let Some(value) = over(build, determinant, divisor) else {
            build.infinite_leg(&name);
            continue;
        };
        let ends = pair.inward(i, pair.common);
        let laid = build.leg(&name, ends, (Some(value), None), Role::Shunt);
        if let Laid::Element(id) = laid {
            terms.push((!pair.ports[i].forward, id));
        }
    }
    let name = format!("{}_between", pair.joint);
    let [first, second] = [pair.ports[0].outer, pair.ports[1].outer];
    // Windings in parallel: both ends of the third leg are one node, and it carries nothing.
    if build.same_node(first, second) {
        note_amps(build, set, &pair, into);
        return Ok(pair.condition);
    }
    let Some(value) = over(build, determinant, pair.mutual) else {
        build.infinite_leg(&name);
        note_amps(build, set, &pair, into);
        return Ok(pair.condition);
    };
    let known = |i: usize| build.amps.contains_key(&set.windings[i].id);
    let readable = known(0) && known(1);
    let between = match build.leg(&name, (first, second), (Some(value), None), Role::Series) {
        Laid::Element(id) => Some(id),
        Laid::Wire if readable => {
            build.merge(first, second);
            None
        }
        Laid::Wire => Some(build.ammeter(&name, first, second)),
        Laid::Open => None,
    };
    if let Some(id) = between {
        for (i, terms) in into.iter_mut().flatten().enumerate() {
            terms.push((i == 1, id));
        }
    }
    note_amps(build, set, &pair, into);
    Ok(pair.condition)
}

fn over(build: &mut Build, determinant: crate::circuit::FormulaId, divisor: Maybe) -> Maybe {
    divisor.map(|divisor| build.algebra.quotient(determinant, divisor))
}
