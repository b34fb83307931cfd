//! Connected sets of coupled windings with their matrices, as formulas.

use crate::circuit::{
    Circuit, Coupling, ElementId, End, FormulaId, Law, NodeId, Operation, Stated,
};
use crate::source::Span;
use crate::swap::algebra::{Algebra, Maybe};
use std::collections::HashMap;

/// One winding of a set.
#[derive(Clone, Debug)]
pub(crate) struct Winding {
    pub id: ElementId,
    pub name: String,
    pub left: NodeId,
    pub right: NodeId,
    pub dot: End,
    /// In henries.
    pub inductance: FormulaId,
    /// In ohms.
    pub series: Maybe,
    pub tolerance: bool,
}

impl Winding {
    pub(crate) fn node(&self, end: End) -> NodeId {
        match end {
            End::Left => self.left,
            End::Right => self.right,
        }
    }

    /// The node at the end without the dot.
    pub(crate) fn plain(&self) -> NodeId {
        self.node(other(self.dot))
    }
}

/// The other end.
pub(crate) fn other(end: End) -> End {
    match end {
        End::Left => End::Right,
        End::Right => End::Left,
    }
}

/// How two windings couple, for currents into the dots.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Mutual {
    /// In henries; nothing where it is zero.
    pub inductance: Maybe,
    /// In ohms; nothing where it is zero.
    pub resistance: Maybe,
    pub stated: Stated,
}

/// A connected set, windings in the order written.
#[derive(Clone, Debug)]
pub(crate) struct CoupledSet {
    pub windings: Vec<Winding>,
    /// Row-major; nothing on the diagonal and where no coupling is stated.
    mutual: Vec<Option<Mutual>>,
    pub span: Span,
}

impl CoupledSet {
    pub(crate) fn len(&self) -> usize {
        self.windings.len()
    }

    pub(crate) fn mutual(&self, i: usize, j: usize) -> Option<Mutual> {
        self.mutual[i * self.len() + j]
    }

    /// L or M of two places; nothing where it is zero.
    pub(crate) fn inductance(&self, i: usize, j: usize) -> Maybe {
        match i == j {
            true => Some(self.windings[i].inductance),
            false => self.mutual(i, j)?.inductance,
        }
    }

    /// `dock`, `buoy` and `keel`, for messages.
    pub(crate) fn names(&self) -> String {
        let names: Vec<_> = self.windings.iter().map(|w| format!("`{}`", w.name)).collect();
        match names.split_last() {
            Some((last, rest)) if !rest.is_empty() => format!("{} and {last}", rest.join(", ")),
            _ => names.concat(),
        }
    }

    /// 1 − k² of a pair, from what was stated.
    pub(crate) fn leakage_factor(&self, algebra: &mut Algebra) -> Maybe {
        let one = algebra.one();
        let [a, b] = [0, 1].map(|i| self.windings[i].inductance);
        let Some(mutual) = self.mutual(0, 1) else { return Some(one) };
        match (mutual.stated, mutual.inductance) {
            (_, None) => Some(one),
            (Stated::Factor(k), _) => {
                let square = algebra.square(k);
                algebra.difference(Some(one), Some(square))
            }
            (Stated::Leakage { value, at }, _) => {
                let own = if at == self.windings[0].id { a } else { b };
                let value = algebra.unless_zero(value)?;
                Some(algebra.quotient(value, own))
            }
            (_, Some(m)) => {
                let square = algebra.square(m);
                let product = algebra.product(a, b);
                let part = algebra.quotient(square, product);
                algebra.difference(Some(one), Some(part))
            }
        }
    }

    /// L1·L2 − M² of a pair, from what was stated; nothing at k = 1.
    pub(crate) fn determinant(&self, algebra: &mut Algebra) -> Maybe {
        let [a, b] = [0, 1].map(|i| self.windings[i].inductance);
        let product = algebra.product(a, b);
        let mutual = self.mutual(0, 1)?;
        match (mutual.stated, mutual.inductance) {
            (Stated::Factor(_) | Stated::Leakage { .. }, Some(_)) => {
                let factor = self.leakage_factor(algebra)?;
                Some(algebra.product(product, factor))
            }
            (_, None) => Some(product),
            (_, Some(m)) => {
                let square = algebra.square(m);
                algebra.difference(Some(product), Some(square))
            }
        }
    }

    /// √(L1/L2) of a pair, without a root of its own where k was stated.
    pub(crate) fn voltage_ratio(&self, algebra: &mut Algebra) -> FormulaId {
        let [a, b] = [0, 1].map(|i| self.windings[i].inductance);
        if let Some(Mutual { stated: Stated::Factor(k), inductance: Some(m), .. }) =
            self.mutual(0, 1)
            && let Operation::Product(factor, mean) = algebra.tape.get(m).operation
            && factor == k
        {
            return algebra.quotient(mean, b);
        }
        let ratio = algebra.quotient(a, b);
        algebra.sqrt(ratio)
    }
}

/// The connected sets of a circuit, in the order of their first windings.
pub(crate) fn find(circuit: &Circuit, algebra: &Algebra) -> Vec<CoupledSet> {
    let mut group: HashMap<ElementId, ElementId> = HashMap::new();
    let root = |group: &HashMap<ElementId, ElementId>, mut id: ElementId| {
        while let Some(&up) = group.get(&id).filter(|&&up| up != id) {
            id = up;
        }
        id
    };
    for coupling in &circuit.couplings {
        let [a, b] = [coupling.first, coupling.second].map(|id| root(&group, id));
        let (low, high) = (a.min(b), a.max(b));
        group.insert(high, low);
        group.insert(low, low);
        // Every winding points straight at its root, so that chains stay short.
        group.insert(coupling.first, low);
        group.insert(coupling.second, low);
    }
    let mut members: Vec<(ElementId, Vec<ElementId>)> = Vec::new();
    let mut place: HashMap<ElementId, usize> = HashMap::new();
    let mut all: Vec<ElementId> = group.keys().copied().collect();
    all.sort();
    for id in all {
        let top = root(&group, id);
        let at = *place.entry(top).or_insert_with(|| {
            members.push((top, Vec::new()));
            members.len() - 1
        });
        members[at].1.push(id);
    }
    let mut couplings: HashMap<ElementId, Vec<&Coupling>> = HashMap::new();
    for coupling in &circuit.couplings {
        couplings.entry(root(&group, coupling.first)).or_default().push(coupling);
    }
    members.iter().map(|(top, ids)| set(circuit, algebra, ids, &couplings[top])).collect()
}

fn set(
    circuit: &Circuit,
    algebra: &Algebra,
    ids: &[ElementId],
    couplings: &[&Coupling],
) -> CoupledSet {
    let windings: Vec<Winding> =
        ids.iter().filter_map(|&id| winding(circuit, algebra, id)).collect();
    let n = windings.len();
    let mut mutual = vec![None; n * n];
    for coupling in couplings {
        let place = |id| ids.iter().position(|&i| i == id).unwrap_or(0);
        let (i, j) = (place(coupling.first), place(coupling.second));
        let stated = Mutual {
            inductance: algebra.unless_zero(coupling.mutual),
            resistance: coupling.resistance.and_then(|r| algebra.unless_zero(r)),
            stated: coupling.stated,
        };
        mutual[i * n + j] = Some(stated);
        mutual[j * n + i] = Some(stated);
    }
    CoupledSet { windings, mutual, span: couplings[0].span }
}

fn winding(circuit: &Circuit, algebra: &Algebra, id: ElementId) -> Option<Winding> {
    let element = circuit.element(id);
    // Elaboration has seen to it that only windings with dots are coupled.
    let Law::Winding { inductance, series, dot: Some(dot) } = element.law else { return None };
    Some(Winding {
        id,
        name: element.name.clone(),
        left: element.left,
        right: element.right,
        dot,
        inductance,
        series: series.and_then(|r| algebra.unless_zero(r)),
        tolerance: element.tolerance.is_some(),
    })
}
