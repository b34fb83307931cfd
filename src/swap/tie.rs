//! Where two windings meet: at a node they share, at a tie, or across an ideal transformer.
//!
//! Two sides may be joined at one node each exactly when that closes no loop: a wire between two
//! separate trees carries no current, a second one between the same two would. One union-find over
//! the whole circuit, with every element and every tie already made as an edge, decides it.

use crate::circuit::{End, NodeId};
use crate::swap::build::Build;
use crate::swap::sets::{CoupledSet, Winding, other};
use crate::swap::{Condition, Reason, SwapError};

/// How the two windings of a pair meet.
pub(crate) enum Meeting {
    /// At one node: which end of each winding is there.
    Node([End; 2]),
    /// Across an ideal transformer.
    Transformer(Reason),
}

/// Decides how a pair meets, and makes the tie where one is needed and allowed.
pub(crate) fn meet(build: &mut Build, set: &CoupledSet) -> Result<(Meeting, Condition), SwapError> {
    let transformer = |reason| Ok((Meeting::Transformer(reason), Condition::Transformer(reason)));
    if build.options.ratio.is_some() {
        return transformer(Reason::Ratio);
    }
    let [a, b] = [&set.windings[0], &set.windings[1]];
    let asked = asked(build, a, b);
    for end_a in [other(a.dot), a.dot] {
        for end_b in [other(b.dot), b.dot] {
            if build.same_node(a.node(end_a), b.node(end_b)) {
                refuse_loop(build, asked)?;
                let name = build.node_name(a.node(end_a));
                return Ok((Meeting::Node([end_a, end_b]), Condition::Shared(name)));
            }
        }
    }
    if build.same_tree(a.left, b.left) {
        refuse_loop(build, asked)?;
        return transformer(Reason::Loop);
    }
    if build.options.keep_isolation {
        return transformer(Reason::KeepIsolation);
    }
    let ends = asked.unwrap_or_else(|| best_ends(build, set));
    build.tie_used |= asked.is_some();
    let nodes = [a.node(ends[0]), b.node(ends[1])];
    let pair = build.tie(nodes);
    Ok((Meeting::Node(ends), Condition::Tied(vec![pair])))
}

/// The ends at the nodes that `--tie` names, if it names one end of each winding.
fn asked(build: &Build, a: &Winding, b: &Winding) -> Option<[End; 2]> {
    let (first, second) = build.tie_nodes?;
    let end = |w: &Winding, node: NodeId| {
        [other(w.dot), w.dot].into_iter().find(|&end| build.same_node(w.node(end), node))
    };
    let straight = end(a, first).zip(end(b, second));
    straight.or_else(|| end(a, second).zip(end(b, first))).map(|(a, b)| [a, b])
}

fn refuse_loop(build: &Build, asked: Option<[End; 2]>) -> Result<(), SwapError> {
    match (&build.options.tie, asked) {
        (Some((first, second)), Some(_)) => {
            let (first, second) = (first.clone(), second.clone());
            Err(SwapError::TieMakesLoop { first, second })
        }
        _ => Ok(()),
    }
}

/// Like ends for a positive M, unlike ends for a negative one, so that the common leg is positive;
/// of the two ways left the one that meets more references of islands.
fn best_ends(build: &Build, set: &CoupledSet) -> [End; 2] {
    let [a, b] = [&set.windings[0], &set.windings[1]];
    let negative = build.algebra.real_or_zero(set.inductance(0, 1)).is_some_and(|m| m < 0.0);
    let partner = |end_a| if (end_a == a.dot) != negative { b.dot } else { other(b.dot) };
    let references = |ends: [End; 2]| {
        let is_reference = |node: NodeId| build.same_node(node, build.reference[node.index()]);
        let both = [a.node(ends[0]), b.node(ends[1])];
        both.into_iter().filter(|node| is_reference(*node)).count()
    };
    let [plain, dotted] = [other(a.dot), a.dot].map(|end| [end, partner(end)]);
    if references(dotted) > references(plain) { dotted } else { plain }
}

/// Joins the trees of two nodes that legs will be laid between: at the nodes asked for, else at
/// their references, so that what was measured against a reference stays the same.
pub(crate) fn join_islands(build: &mut Build, nodes: &[NodeId; 2]) -> Option<(String, String)> {
    let [p, q] = *nodes;
    if build.same_tree(p, q) {
        return None;
    }
    let mut chosen = nodes.map(|node| build.reference[node.index()]);
    if let Some((a, b)) = build.tie_nodes {
        let between = |a, b| build.same_tree(a, p) && build.same_tree(b, q);
        if between(a, b) || between(b, a) {
            build.tie_used = true;
            chosen = [a, b];
        }
    }
    Some(build.tie(chosen))
}
