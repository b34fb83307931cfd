//! Two windings that share a node as a tee: legs L1 − M', L2 − M' and M' around a star point.
//!
//! With currents i1, i2 into the outer ends of the windings, both leaving at the common node,
//! v1 = s·L1·i1 + s·M'·i2 = s·(L1 − M')·i1 + s·M'·(i1 + i2), and likewise v2: the first term is a
//! leg of its own, the second one carries both currents. M' is M if both windings have like ends at
//! the common node, else −M. Mutual resistance divides in the same way.
//!
//! Holds for two windings that share a node, may be tied at one, or meet across an ideal
//! transformer; also at k = 1 and at f = 0. Legs may be negative. (Textbook: Terman, Radio
//! Engineers' Handbook, sec. 3; Guillemin, Introductory Circuit Theory; from memory.)

use crate::circuit::ElementId;
use crate::swap::build::{Build, Laid, Role};
use crate::swap::pair::{self, Pair};
use crate::swap::sets::CoupledSet;
use crate::swap::{Condition, Kind, SwapError};

pub(crate) fn build(build: &mut Build, set: &CoupledSet) -> Result<Condition, SwapError> {
    let pair = pair::prepare(build, set, Kind::Tee, false)?;
    let star = build.node(&format!("{}_star", pair.joint), pair.common);
    let outer = [0, 1].map(|i| {
        let inductance = build.algebra.difference(Some(pair.own[i]), pair.mutual);
        let series = build.algebra.difference(None, pair.resistance);
        let name = format!("{}_leg", set.windings[i].name);
        build.leg(&name, pair.inward(i, star), (inductance, series), Role::Series)
    });
    let name = format!("{}_common", pair.joint);
    let ends = (star, pair.common);
    let common = build.leg(&name, ends, (pair.mutual, pair.resistance), Role::Shunt);
    if let Laid::Wire = common {
        build.merge(star, pair.common);
    }
    // The current into the star from each side; a leg that is a wire has none to be read.
    let mut into = [0, 1].map(|i| match outer[i] {
        Laid::Element(id) => Some(vec![(!pair.ports[i].forward, id)]),
        _ => pair.ports[i].known.map(|known| vec![known]),
    });
    for i in 0..2 {
        if !matches!(outer[i], Laid::Wire) {
            continue;
        }
        if into[i].is_none() {
            into[i] = from_the_others(&common, &into[1 - i]);
        }
        if into[i].is_none() {
            let (left, right) = pair.inward(i, star);
            let id = build.ammeter(&format!("{}_leg", set.windings[i].name), left, right);
            into[i] = Some(vec![(!pair.ports[i].forward, id)]);
        } else {
            build.merge(pair.ports[i].outer, star);
        }
    }
    note_amps(build, set, &pair, into);
    Ok(pair.condition)
}

/// What flows in on one side is what flows on through the common leg less the other side's.
fn from_the_others(
    common: &Laid,
    other: &Option<Vec<(bool, ElementId)>>,
) -> Option<Vec<(bool, ElementId)>> {
    let mut terms = match common {
        Laid::Element(id) => vec![(false, *id)],
        Laid::Open => Vec::new(),
        Laid::Wire => return None,
    };
    terms.extend(other.as_ref()?.iter().map(|(negative, id)| (!negative, *id)));
    Some(terms)
}

/// Says how the windings' currents read, where nothing in series with them does.
pub(crate) fn note_amps(
    build: &mut Build,
    set: &CoupledSet,
    pair: &Pair,
    into: [Option<Vec<(bool, ElementId)>>; 2],
) {
    for (i, terms) in into.into_iter().enumerate() {
        let flip = !pair.ports[i].forward;
        let terms = terms.unwrap_or_default().into_iter().map(|(n, id)| (n != flip, id));
        build.amps.entry(set.windings[i].id).or_insert_with(|| terms.collect());
    }
}
