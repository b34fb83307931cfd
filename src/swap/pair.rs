//! What a tee and a pi have in common: two ports that meet at one node, and the values between.

use crate::circuit::{ElementId, End, FormulaId, NodeId};
use crate::quantity::Dimension;
use crate::swap::algebra::Maybe;
use crate::swap::build::{Build, joint};
use crate::swap::sets::{CoupledSet, other};
use crate::swap::tie::{self, Meeting};
use crate::swap::{Condition, Fate, Kind, Reason, SwapError, ratio};

/// One of the two outer ends of an equivalent.
pub(crate) struct Port {
    /// Where the equivalent begins, behind the losses.
    pub outer: NodeId,
    /// The current into the equivalent is that of the winding, not its negative.
    pub forward: bool,
    /// The current into the equivalent where something in series carries it: its negative, or not.
    pub known: Option<(bool, ElementId)>,
}

/// A pair ready to be replaced.
pub(crate) struct Pair {
    pub ports: [Port; 2],
    /// The node where both meet.
    pub common: NodeId,
    /// L1, and L2 as seen from the first side.
    pub own: [FormulaId; 2],
    /// M' as seen from the first side.
    pub mutual: Maybe,
    /// Mutual resistance, with the sign of M', as seen from the first side.
    pub resistance: Maybe,
    /// The square of the ratio.
    pub ratio_squared: Maybe,
    pub joint: String,
    pub condition: Condition,
}

/// Finds where the two meet, lays what stays outside, and refers the second to the first.
/// `mutual` tells whether mutual resistance stays outside, too.
pub(crate) fn prepare(
    build: &mut Build,
    set: &CoupledSet,
    kind: Kind,
    mutual: bool,
) -> Result<Pair, SwapError> {
    if set.len() != 2 {
        let (count, names, span) = (set.len(), set.names(), set.span);
        return Err(SwapError::TooMany { kind, count, names, span });
    }
    let joint = joint(&set.windings[0].name, &set.windings[1].name);
    let (meeting, condition) = tie::meet(build, set)?;
    match meeting {
        Meeting::Node(ends) => Ok(at_node(build, set, ends, mutual, joint, condition)),
        Meeting::Transformer(reason) => {
            across_transformer(build, set, reason, mutual, joint, condition)
        }
    }
}

fn at_node(
    build: &mut Build,
    set: &CoupledSet,
    ends: [End; 2],
    mutual: bool,
    joint: String,
    condition: Condition,
) -> Pair {
    let [a, b] = [&set.windings[0], &set.windings[1]];
    let like = (ends[0] == a.dot) == (ends[1] == b.dot);
    let common = a.node(ends[0]);
    let port = |build: &mut Build, i: usize| direct_port(build, set, i, other(ends[i]), mutual);
    let ports = [port(build, 0), port(build, 1)];
    let signed = |build: &mut Build, value: Maybe| value.map(|v| build.algebra.signed(!like, v));
    let stated = set.mutual(0, 1);
    Pair {
        ports,
        common,
        own: [a.inductance, b.inductance],
        mutual: signed(build, stated.and_then(|m| m.inductance)),
        resistance: signed(build, stated.and_then(|m| m.resistance)),
        ratio_squared: None,
        joint,
        condition,
    }
}

/// The port of a winding that the equivalent takes the place of.
fn direct_port(build: &mut Build, set: &CoupledSet, i: usize, end: End, mutual: bool) -> Port {
    let winding = &set.windings[i];
    let laws = build.outside(set, i, mutual);
    let outer = build.chain(winding, end, laws);
    let forward = end == End::Left;
    let known = build.amps.get(&winding.id).map(|sensor| (!forward, sensor[0].1));
    Port { outer, forward, known }
}

fn across_transformer(
    build: &mut Build,
    set: &CoupledSet,
    reason: Reason,
    mutual: bool,
    joint: String,
    condition: Condition,
) -> Result<Pair, SwapError> {
    let [a, b] = [&set.windings[0], &set.windings[1]];
    let m = set.inductance(0, 1);
    let (turns, crossed) = match build.options.ratio {
        Some(ratio) if reason == Reason::Ratio => {
            let (turns, crossed) = ratio::turns(build, set, ratio)?;
            build.name_value(&format!("n_{joint}"), turns);
            (Some(turns), crossed)
        }
        // Crossing over makes the common leg positive.
        _ => (None, build.algebra.real_or_zero(m).is_some_and(|m| m < 0.0)),
    };
    let first = direct_port(build, set, 0, a.dot, mutual);
    let common = a.plain();
    let laws = build.outside(set, 1, mutual);
    let inner = build.chain(b, b.dot, laws);
    let outer = build.node(&format!("{}_referred", b.name), common);
    let one = build.algebra.one();
    let ideal = build.ideal(&format!("{joint}_ideal"));
    let name = build.circuit.ideals[ideal].name.clone();
    let near = build.ideal_winding(ideal, outer, common, turns.unwrap_or(one));
    let (dotted, plain) = if crossed { (b.plain(), inner) } else { (inner, b.plain()) };
    let far = build.ideal_winding(ideal, dotted, plain, one);
    build.note(&name, turns.or(Some(one)), Dimension::NONE, Fate::Element, true);
    // Through the far winding flows, from its dot on, the current into the dot of b (or out of it).
    let negative = (b.dot == End::Right) != crossed;
    build.amps.entry(b.id).or_insert_with(|| vec![(negative, far)]);
    let refer = |build: &mut Build, value: Maybe| {
        let value = value.map(|v| build.algebra.signed(crossed, v));
        match (value, turns) {
            (Some(value), Some(n)) => Some(build.algebra.product(n, value)),
            _ => value,
        }
    };
    let mutual_value = refer(build, m);
    let resistance = refer(build, set.mutual(0, 1).and_then(|m| m.resistance));
    let ratio_squared = turns.map(|n| build.algebra.square(n));
    let second = match ratio_squared {
        Some(square) => build.algebra.product(square, b.inductance),
        None => b.inductance,
    };
    let second_port = Port { outer, forward: true, known: Some((true, near)) };
    Ok(Pair {
        ports: [first, second_port],
        common,
        own: [a.inductance, second],
        mutual: mutual_value,
        resistance,
        ratio_squared,
        joint,
        condition,
    })
}

impl Pair {
    /// The two ends of a leg from a port inwards, in the direction of the winding.
    pub(crate) fn inward(&self, port: usize, inner: NodeId) -> (NodeId, NodeId) {
        let own = &self.ports[port];
        if own.forward { (own.outer, inner) } else { (inner, own.outer) }
    }
}
