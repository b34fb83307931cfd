//! Any number of windings as inductances and ideal transformers: repeated Schur complement.
//!
//! L = U·D·Uᵀ: with d = L_jj and u = L_·j/d, the flux of winding j is d·Σ u_i·i_i, one inductance
//! that carries the current Σ u_i·i_i; an ideal transformer hands its voltage to every other winding
//! u_i times and collects the currents in the same way. What remains is L − d·u·uᵀ, in series with
//! it, where winding j no longer takes part: the next step does the same to it. Each d is what a
//! winding has left with those before it shorted, never negative for a set that can exist. For two
//! windings: L1 across the first, ratio 1 : M/L1, and L2·(1 − k²) in series with the second.
//!
//! Holds always, k = 1 included (a d that is zero is a wire), and keeps every island apart. Turns
//! must be real constants, so inductances that depend on the frequency need another kind. (Extended
//! cantilever model: Erickson and Maksimović, 1998; from memory.)

use crate::circuit::{ElementId, End, FormulaId, NodeId};
use crate::quantity::Dimension;
use crate::swap::algebra::Maybe;
use crate::swap::build::{Build, Laid, Role, joint};
use crate::swap::sets::CoupledSet;
use crate::swap::{Condition, Fate, SwapError};

/// One step of the factorisation.
struct Step {
    /// The winding whose inductance it takes.
    pivot: usize,
    /// What is left of that inductance.
    inductance: FormulaId,
    /// Turns of the windings that remain, for one turn of the pivot; nothing where none.
    turns: Vec<Maybe>,
}

pub(crate) fn build(build: &mut Build, set: &CoupledSet) -> Result<Condition, SwapError> {
    let steps = factor(build, set)?;
    let mut ideals: Vec<Option<usize>> = Vec::new();
    // The node each winding has come to, from its dot on, and what reads its current: counted from
    // the dot to the other end.
    let mut at: Vec<NodeId> = (0..set.len())
        .map(|i| {
            let laws = build.outside(set, i, true);
            build.chain(&set.windings[i], set.windings[i].dot, laws)
        })
        .collect();
    let mut from_dot: Vec<Vec<(bool, ElementId)>> = vec![Vec::new(); set.len()];
    let last_step: Vec<Option<usize>> = (0..set.len())
        .map(|i| (0..steps.len()).rfind(|&s| steps[s].pivot == i || steps[s].turns[i].is_some()))
        .collect();
    for (s, step) in steps.iter().enumerate() {
        let winding = &set.windings[step.pivot];
        let name = if s == 0 { "magnetizing" } else { "leakage" };
        let role = if s == 0 { Role::Shunt } else { Role::Series };
        let ends = (at[step.pivot], winding.plain());
        let name = format!("{}_{name}", winding.name);
        let laid = build.leg(&name, ends, (Some(step.inductance), None), role);
        match laid {
            Laid::Element(id) if from_dot[step.pivot].is_empty() => {
                from_dot[step.pivot].push((false, id));
            }
            // A step that shorts the pivot shorts its transformer, and that all its windings.
            Laid::Wire => {
                short(build, set, step.pivot, ends, &mut from_dot);
                for i in (0..set.len()).filter(|&i| step.turns[i].is_some()) {
                    if last_step[i] == Some(s) {
                        let ends = (at[i], set.windings[i].plain());
                        short(build, set, i, ends, &mut from_dot);
                    }
                }
                ideals.push(None);
                continue;
            }
            _ => {}
        }
        let ideal = step.turns.iter().any(Option::is_some).then(|| {
            let one = build.algebra.one();
            let ideal = build.ideal(&format!("{}_ideal", winding.name));
            let main = build.ideal_winding(ideal, ends.0, ends.1, one);
            // The pivot's current divides between inductance and transformer.
            if only_own(&from_dot[step.pivot], laid) {
                from_dot[step.pivot].push((false, main));
            }
            ideal
        });
        ideals.push(ideal);
        for i in 0..set.len() {
            let (Some(turns), Some(ideal)) = (step.turns[i], ideal) else { continue };
            let winding = &set.windings[i];
            let right = match last_step[i] == Some(s) {
                true => winding.plain(),
                false => build.node(&format!("{}_in", winding.name), at[i]),
            };
            let id = build.ideal_winding(ideal, at[i], right, turns);
            if from_dot[i].is_empty() {
                from_dot[i].push((false, id));
            }
            at[i] = right;
        }
    }
    finish(build, set, &at, &last_step, from_dot);
    Ok(Condition::Always)
}

/// Only the inductance of this step reads the winding's current so far.
fn only_own(reads: &[(bool, ElementId)], laid: Laid) -> bool {
    match (reads, laid) {
        ([], _) => true,
        ([(_, id)], Laid::Element(own)) => *id == own,
        _ => false,
    }
}

/// Closes a winding of which nothing is left.
fn short(
    build: &mut Build,
    set: &CoupledSet,
    i: usize,
    ends: (NodeId, NodeId),
    from_dot: &mut [Vec<(bool, ElementId)>],
) {
    let winding = &set.windings[i];
    if from_dot[i].is_empty() && !build.amps.contains_key(&winding.id) {
        let id = build.ammeter(&format!("{}_through", winding.name), ends.0, ends.1);
        from_dot[i].push((false, id));
    } else if !build.same_node(ends.0, ends.1) {
        build.merge(ends.0, ends.1);
    }
}

fn finish(
    build: &mut Build,
    set: &CoupledSet,
    at: &[NodeId],
    last_step: &[Option<usize>],
    mut from_dot: Vec<Vec<(bool, ElementId)>>,
) {
    for i in 0..set.len() {
        let winding = &set.windings[i];
        if last_step[i].is_none() {
            short(build, set, i, (at[i], winding.plain()), &mut from_dot);
        }
        let flip = winding.dot == End::Right;
        let terms = from_dot[i].iter().map(|(negative, id)| (*negative != flip, *id));
        build.amps.entry(winding.id).or_insert_with(|| terms.collect());
    }
}

/// The steps, windings in the order written; one whose inductance is used up takes none.
fn factor(build: &mut Build, set: &CoupledSet) -> Result<Vec<Step>, SwapError> {
    let n = set.len();
    let mut a: Vec<Maybe> = (0..n * n).map(|at| set.inductance(at / n, at % n)).collect();
    let mut left: Vec<usize> = (0..n).collect();
    for (i, winding) in set.windings.iter().enumerate() {
        a[i * n + i] = build.algebra.unless_zero(winding.inductance);
    }
    let mut steps = Vec::new();
    while let Some(place) = left.iter().position(|&i| a[i * n + i].is_some()) {
        let p = left.remove(place);
        let Some(pivot) = a[p * n + p] else { break };
        if n > 2 && !steps.is_empty() {
            build.name_value(&format!("left_{}", set.windings[p].name), pivot);
        }
        let mut turns = vec![None; n];
        for &i in &left {
            let Some(entry) = a[i * n + p] else { continue };
            let ratio = build.algebra.quotient(entry, pivot);
            if build.algebra.real(ratio).is_none() {
                return Err(SwapError::TurnsVary { names: set.names(), span: set.span });
            }
            let [own, first] = [i, p].map(|i| set.windings[i].name.as_str());
            let joint = joint(own, first);
            build.name_value(&format!("n_{joint}"), ratio);
            build.note(
                &format!("n_{}", joint.replace('.', "_")),
                Some(ratio),
                Dimension::NONE,
                Fate::Element,
                true,
            );
            turns[i] = Some(ratio);
        }
        for (x, &i) in left.iter().enumerate() {
            for &j in &left[x..] {
                let (Some(factor), Some(entry)) = (turns[i], a[p * n + j]) else { continue };
                let rest = match n {
                    2 => set
                        .leakage_factor(&mut build.algebra)
                        .map(|s| build.algebra.product(set.windings[i].inductance, s)),
                    _ => {
                        let part = build.algebra.product(factor, entry);
                        build.algebra.difference(a[i * n + j], Some(part))
                    }
                };
                (a[i * n + j], a[j * n + i]) = (rest, rest);
            }
        }
        steps.push(Step { pivot: p, inductance: pivot, turns });
    }
    let leftover = left.iter().any(|&i| left.iter().any(|&j| a[i * n + j].is_some()));
    if leftover {
        return Err(SwapError::NegativeEnergy { names: set.names(), span: set.span });
    }
    Ok(steps)
}
