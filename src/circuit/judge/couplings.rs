//! Couplings: readings checked against each other, and sets against negative energy.

use crate::circuit::judge::real;
use crate::circuit::{Circuit, Coupling, ElementId, Law, Stated, Values};
use crate::diag::Diagnostic;
use crate::number::ball::Ball;
use std::collections::HashMap;

/// Rounding allowance on the coupling matrix, whose diagonal is 1. Couplings of exactly 1 written
/// as rounded M come out a little above 1; nobody measures k to 1e-9.
pub(crate) const COUPLING_ALLOWANCE: f64 = 1e-9;

/// aiding + opposing may differ from 2(La + Lb) by this fraction before it is remarked on: the
/// class of a good bridge, twice over.
const SERIES_REMARK: f64 = 0.02;

/// … and by this fraction before the readings cannot be of these windings.
const SERIES_ERROR: f64 = 0.1;

/// A set whose smallest pivot of the coupling matrix is below this is remarked on: 1 − k² of a
/// pair with k = 0.9995.
const NEAR_ONE: f64 = 1e-3;

/// Searching all triples of a set for a forgotten pair is kept to sets of this size.
const LARGEST_TRIPLE_SEARCH: usize = 60;

/// One connected set of coupled windings with its coupling matrix.
pub(crate) struct Set {
    pub windings: Vec<ElementId>,
    /// Row-major, 1 on the diagonal; 0 where no coupling is stated.
    pub k: Vec<f64>,
    /// True where a coupling is stated.
    pub stated: Vec<bool>,
}

pub(super) fn judge(circuit: &Circuit, values: &Values<Ball>, found: &mut Vec<Diagnostic>) {
    let before = found.len();
    for coupling in &circuit.couplings {
        judge_stated(circuit, coupling, values, found);
    }
    if found[before..].iter().any(|d| d.severity == crate::diag::Severity::Error) {
        return;
    }
    for set in sets(circuit, values) {
        judge_set(circuit, &set, found);
    }
}

fn inductance(circuit: &Circuit, id: ElementId, values: &Values<Ball>) -> Option<f64> {
    match circuit.element(id).law {
        Law::Winding { inductance, .. } => real(circuit, inductance, values),
        _ => None,
    }
}

fn judge_stated(
    circuit: &Circuit,
    coupling: &Coupling,
    values: &Values<Ball>,
    found: &mut Vec<Diagnostic>,
) {
    let name = |id| &circuit.element(id).name;
    let (a, b) = (name(coupling.first), name(coupling.second));
    let pair =
        (inductance(circuit, coupling.first, values), inductance(circuit, coupling.second, values));
    let (Some(la), Some(lb)) = pair else { return };
    let span = coupling.span;
    if la <= 0.0 || lb <= 0.0 {
        if real(circuit, coupling.mutual, values) != Some(0.0) {
            found.push(
                Diagnostic::error(format!(
                    "`{a}` and `{b}` are coupled, but one of them has no positive inductance"
                ))
                .at(span, ""),
            );
        }
        return;
    }
    match coupling.stated {
        Stated::Leakage { value, at } => {
            let Some(read) = real(circuit, value, values) else { return };
            let own = if at == coupling.first { la } else { lb };
            if !(0.0..=own).contains(&read) {
                found.push(
                    Diagnostic::error(format!(
                        "the leakage read at `{}` lies outside 0 to its own inductance",
                        name(at)
                    ))
                    .at(span, format!("read {read:e} H, own inductance {own:e} H"))
                    .help("with the other winding shorted the reading can only fall"),
                );
            }
        }
        Stated::Series { aiding, opposing } => {
            let (Some(aiding), Some(opposing)) =
                (real(circuit, aiding, values), real(circuit, opposing, values))
            else {
                return;
            };
            if aiding < opposing {
                let message = format!(
                    "`{a}` and `{b}` read less aiding than opposing: one of the dots is wrong"
                );
                found.push(Diagnostic::error(message).at(span, "").help(format!(
                    "move the dot of `{a}` or of `{b}` to its other end, or swap the two readings"
                )));
                return;
            }
            let (sum, own) = (aiding + opposing, 2.0 * (la + lb));
            let off = (sum - own).abs() / own;
            let message = format!("the readings do not fit `{a}` and `{b}`");
            let place = format!(
                "aiding + opposing = {sum:.4e} H, but 2·(La + Lb) = {own:.4e} H ({:.1} % apart)",
                100.0 * off
            );
            if off > SERIES_ERROR {
                found.push(
                    Diagnostic::error(message)
                        .at(span, place)
                        .help("measure the windings and the two series readings at one frequency"),
                );
            } else if off > SERIES_REMARK {
                found.push(Diagnostic::remark(message).at(span, place));
            }
        }
        Stated::Factor(_) | Stated::Mutual => {}
    }
}

/// The connected sets whose inductances and couplings are constant.
pub(crate) fn sets(circuit: &Circuit, values: &Values<Ball>) -> Vec<Set> {
    let mut group: HashMap<ElementId, usize> = HashMap::new();
    let mut members: Vec<Vec<ElementId>> = Vec::new();
    for coupling in &circuit.couplings {
        let known = |id| group.get(&id).copied();
        let into = match (known(coupling.first), known(coupling.second)) {
            (Some(a), Some(b)) if a != b => {
                let (large, small) =
                    if members[a].len() >= members[b].len() { (a, b) } else { (b, a) };
                let moved = std::mem::take(&mut members[small]);
                moved.iter().for_each(|&id| _ = group.insert(id, large));
                members[large].extend(moved);
                large
            }
            (Some(a), _) | (None, Some(a)) => a,
            (None, None) => {
                members.push(Vec::new());
                members.len() - 1
            }
        };
        for id in [coupling.first, coupling.second] {
            if group.insert(id, into).is_none() {
                members[into].push(id);
            }
        }
    }
    let place: HashMap<ElementId, usize> =
        members.iter().flat_map(|m| m.iter().enumerate().map(|(i, &id)| (id, i))).collect();
    let mut sets: Vec<Option<Set>> = members
        .iter()
        .map(|windings| {
            let n = windings.len();
            let constant = windings.iter().all(|&id| inductance(circuit, id, values).is_some());
            (n > 0 && constant).then(|| {
                let mut k = vec![0.0; n * n];
                (0..n).for_each(|i| k[i * n + i] = 1.0);
                Set { windings: windings.clone(), k, stated: vec![false; n * n] }
            })
        })
        .collect();
    for coupling in &circuit.couplings {
        let Some(set) = &mut sets[group[&coupling.first]] else { continue };
        let n = set.windings.len();
        let (i, j) = (place[&coupling.first], place[&coupling.second]);
        let l = |id| inductance(circuit, id, values).unwrap_or(0.0);
        let mean = (l(coupling.first) * l(coupling.second)).sqrt();
        let m = real(circuit, coupling.mutual, values).unwrap_or(0.0);
        let k = if m == 0.0 { 0.0 } else { m / mean };
        for at in [i * n + j, j * n + i] {
            set.k[at] = k;
            set.stated[at] = true;
        }
    }
    let mut sets: Vec<Set> = sets.into_iter().flatten().collect();
    sets.iter_mut().for_each(Set::sort);
    sets
}

impl Set {
    /// Puts the windings in the order written.
    fn sort(&mut self) {
        let n = self.windings.len();
        let mut order: Vec<usize> = (0..n).collect();
        order.sort_by_key(|&i| self.windings[i]);
        let pick = |i: usize, j: usize| order[i] * n + order[j];
        let at: Vec<usize> = (0..n * n).map(|x| pick(x / n, x % n)).collect();
        self.k = at.iter().map(|&x| self.k[x]).collect();
        self.stated = at.iter().map(|&x| self.stated[x]).collect();
        self.windings.sort();
    }

    /// The smallest pivot of the Cholesky factorisation with the largest pivot first (Higham,
    /// Accuracy and Stability of Numerical Algorithms, ch. 10); negative where the matrix is not
    /// positive semidefinite beyond the allowance.
    pub(crate) fn smallest_pivot(&self) -> f64 {
        let n = self.windings.len();
        let mut a = self.k.clone();
        let mut left: Vec<usize> = (0..n).collect();
        let mut smallest = f64::INFINITY;
        while !left.is_empty() {
            let lowest = left.iter().map(|&i| a[i * n + i]).fold(f64::INFINITY, f64::min);
            if lowest < -COUPLING_ALLOWANCE {
                return lowest;
            }
            let best = (0..left.len())
                .max_by(|&x, &y| a[left[x] * n + left[x]].total_cmp(&a[left[y] * n + left[y]]));
            let p = left.swap_remove(best.unwrap_or(0));
            let pivot = a[p * n + p];
            smallest = smallest.min(pivot);
            if pivot <= COUPLING_ALLOWANCE {
                // What is left must be zero altogether: |a_ij| ≤ √(a_ii·a_jj).
                left.push(p);
                let off = left
                    .iter()
                    .flat_map(|&i| left.iter().filter(move |&&j| j != i).map(move |&j| (i, j)))
                    .map(|(i, j)| a[i * n + j].abs())
                    .fold(0.0, f64::max);
                return if off > COUPLING_ALLOWANCE { -off } else { smallest };
            }
            for &i in &left {
                let factor = a[i * n + p] / pivot;
                if factor != 0.0 {
                    left.iter().for_each(|&j| a[i * n + j] -= factor * a[p * n + j]);
                }
            }
        }
        smallest
    }
}

fn judge_set(circuit: &Circuit, set: &Set, found: &mut Vec<Diagnostic>) {
    let n = set.windings.len();
    let name = |i: usize| circuit.element(set.windings[i]).name.as_str();
    let span_of = |i: usize, j: usize| {
        let (a, b) = (set.windings[i], set.windings[j]);
        let same = |c: &&Coupling| (c.first, c.second) == (a, b) || (c.first, c.second) == (b, a);
        circuit.couplings.iter().find(same).map_or(circuit.element(a).span, |c| c.span)
    };
    let smallest = set.smallest_pivot();
    if smallest < 0.0 {
        let pairs = (0..n).flat_map(|i| (0..i).map(move |j| (j, i)));
        let worst = pairs
            .filter(|&(i, j)| set.k[i * n + j].abs() > 1.0 + COUPLING_ALLOWANCE / 2.0)
            .max_by(|&(i, j), &(x, y)| set.k[i * n + j].abs().total_cmp(&set.k[x * n + y].abs()));
        if let Some((i, j)) = worst {
            let k = set.k[i * n + j];
            return found.push(
                Diagnostic::error(format!(
                    "`{}` and `{}` cannot be coupled that much: k = {k:.6}",
                    name(i),
                    name(j)
                ))
                .at(span_of(i, j), "")
                .help("|k| is at most 1: M is at most the square root of La·Lb"),
            );
        }
        return found.push(impossible_set(set, &name, span_of));
    }
    if smallest < NEAR_ONE {
        let names: Vec<_> = (0..n.min(4)).map(|i| format!("`{}`", name(i))).collect();
        let more = if n > 4 { format!(" and {} more", n - 4) } else { String::new() };
        found.push(
            Diagnostic::remark(format!(
                "{}{more} are coupled so closely that only {:.2e} of an inductance is leakage",
                names.join(", "),
                smallest.max(0.0)
            ))
            .at(span_of(0, 1), "")
            .help("what depends on the leakage is only as good as the last digits of k"),
        );
    }
}

fn impossible_set<'c>(
    set: &Set,
    name: &impl Fn(usize) -> &'c str,
    span_of: impl Fn(usize, usize) -> crate::source::Span,
) -> Diagnostic {
    let n = set.windings.len();
    let list: Vec<_> = (0..n.min(6)).map(|i| format!("`{}`", name(i))).collect();
    let more = if n > 6 { format!(" and {} more", n - 6) } else { String::new() };
    let first = (1..n).find(|&j| set.stated[j]).unwrap_or(n - 1);
    let base = Diagnostic::error(format!(
        "no windings can be coupled like this: {}{more} would store negative energy",
        list.join(", ")
    ))
    .at(span_of(0, first), "");
    if n > LARGEST_TRIPLE_SEARCH {
        return base.help("the inductance matrix of a set must be positive semidefinite");
    }
    // The usual cause: a–b and b–c are strong and a–c was left out. With the three alone, k_ac
    // must lie within k_ab·k_bc ± √((1 − k_ab²)(1 − k_bc²)).
    let mut worst: Option<(f64, usize, usize, f64, f64)> = None;
    for a in 0..n {
        for c in 0..a {
            for b in (0..n).filter(|&b| b != a && b != c) {
                let (ab, bc, ac) = (set.k[a * n + b], set.k[b * n + c], set.k[a * n + c]);
                let half = ((1.0 - ab * ab).max(0.0) * (1.0 - bc * bc).max(0.0)).sqrt();
                let (low, high) = (ab * bc - half, ab * bc + half);
                let outside = (low - ac).max(ac - high);
                // A pair nobody stated is a likelier slip than one that was.
                let weight = if set.stated[a * n + c] { outside } else { outside + 1.0 };
                if outside > COUPLING_ALLOWANCE && worst.is_none_or(|w| weight > w.0) {
                    worst = Some((weight, c, a, low, high));
                }
            }
        }
    }
    match worst {
        Some((_, i, j, low, high)) if !set.stated[i * n + j] => base.help(format!(
            "no coupling is stated for `{}` and `{}`; with the others as they are, its k must \
             lie between {low:.4} and {high:.4}",
            name(i),
            name(j)
        )),
        Some((_, i, j, low, high)) => base.help(format!(
            "with the others as they are, k of `{}` and `{}` must lie between {low:.4} and \
             {high:.4}",
            name(i),
            name(j)
        )),
        None => base.help("the inductance matrix of a set must be positive semidefinite"),
    }
}
