//! The values of the equations, in the order in which a plan uses them.

use crate::number::Affine;
use crate::solve::lanes::lane::{Coefficient, Lane};

/// The line in doubles.
fn rounded(line: &Affine) -> Coefficient {
    Coefficient { constant: line.constant.to_complex(), slope: line.slope.to_complex() }
}

/// Equations whose values follow the frequency: matrix and right-hand sides.
#[derive(Clone, Debug, Default)]
pub struct Equations {
    /// The value of each entry of the pattern.
    pub entries: Vec<Affine>,
    /// Right-hand sides, one after the other, each with a value for every row.
    pub right: Vec<Affine>,
    /// Entries to which a further value is added that is given frequency by frequency.
    pub extra_entries: Vec<u32>,
    /// Places in `right` to which a further value is added.
    pub extra_right: Vec<u32>,
}

impl Equations {
    /// Further values given at each frequency: those of entries, then those of right-hand sides.
    pub fn extras(&self) -> usize {
        self.extra_entries.len() + self.extra_right.len()
    }
}

/// The equations row by row in some order.
#[derive(Clone, Debug, Default)]
pub(super) struct Listing {
    /// The row that stands here.
    pub rows: Vec<u32>,
    /// Its number of entries.
    pub counts: Vec<u32>,
    /// Unknown and slot of each entry.
    pub columns: Vec<u32>,
    pub slots: Vec<u32>,
}

impl Listing {
    /// Appends a row with its entries as (column, slot).
    pub fn push(&mut self, row: u32, entries: &[(u32, u32)]) {
        self.rows.push(row);
        self.counts.push(entries.len() as u32);
        self.columns.extend(entries.iter().map(|e| e.0));
        self.slots.extend(entries.iter().map(|e| e.1));
    }
}

/// Coefficients of entries in the order of a list of slots.
#[derive(Clone, Debug, Default)]
pub(super) struct Entries {
    pub coefficients: Vec<Coefficient>,
    /// Place in the list and number of each further value, by place.
    pub extras: Vec<(u32, u32)>,
}

impl Entries {
    pub fn new(slots: &[u32], equations: &Equations) -> Self {
        let coefficients = slots.iter().map(|&s| rounded(&equations.entries[s as usize])).collect();
        let mut extras = Vec::new();
        if !equations.extra_entries.is_empty() {
            let mut place = vec![u32::MAX; equations.entries.len()];
            slots.iter().enumerate().for_each(|(at, &slot)| place[slot as usize] = at as u32);
            for (which, &slot) in equations.extra_entries.iter().enumerate() {
                if place[slot as usize] != u32::MAX {
                    extras.push((place[slot as usize], which as u32));
                }
            }
            extras.sort_unstable();
        }
        Entries { coefficients, extras }
    }

    /// One value with what is added to it, found by search: for the few outside the main loops.
    #[inline(always)]
    pub fn value<const W: usize, const FMA: bool>(
        &self,
        at: usize,
        frequency: &[f64; W],
        extras: &[Lane<W>],
    ) -> Lane<W> {
        let value = self.coefficients[at].at::<W, FMA>(frequency);
        match self.extras.binary_search_by_key(&(at as u32), |e| e.0) {
            Ok(found) => value.plus(&extras[self.extras[found].1 as usize]),
            Err(_) => value,
        }
    }
}

/// Right-hand sides in the order of elimination.
#[derive(Clone, Debug, Default)]
pub(super) struct Driven {
    /// How many.
    pub sides: usize,
    /// Place (order · sides + side) and value where it is not always zero.
    values: Vec<(u32, Coefficient)>,
    /// Place and number of each further value.
    extras: Vec<(u32, u32)>,
}

impl Driven {
    /// `rows` is the order of elimination.
    pub fn new(rows: &[u32], equations: &Equations) -> Self {
        let n = rows.len().max(1);
        let sides = equations.right.len() / n;
        let mut order = vec![0; n];
        rows.iter().enumerate().for_each(|(at, &row)| order[row as usize] = at);
        let place = |at: usize| (order[at % n] * sides + at / n) as u32;
        let mut values = Vec::new();
        for (at, value) in equations.right.iter().enumerate() {
            if !value.is_zero() {
                values.push((place(at), rounded(value)));
            }
        }
        values.sort_unstable_by_key(|v| v.0);
        let first = equations.extra_entries.len() as u32;
        let numbered = equations.extra_right.iter().zip(first..);
        let mut extras: Vec<_> = numbered.map(|(&at, which)| (place(at as usize), which)).collect();
        extras.sort_unstable();
        Driven { sides, values, extras }
    }

    /// Writes the right-hand sides of the row that is `order`-th in the order of elimination.
    /// Rows must be asked for in that order; `given` is how far they have come.
    #[inline(always)]
    pub fn begin<const W: usize, const FMA: bool>(
        &self,
        given: &mut Given,
        order: usize,
        frequency: &[f64; W],
        extras: &[Lane<W>],
        out: &mut [Lane<W>],
    ) {
        for side in 0..self.sides {
            out[side] = Lane::ZERO;
        }
        let (first, end) = (order * self.sides, (order + 1) * self.sides);
        while let Some((place, value)) = self.values.get(given.values) {
            let place = *place as usize;
            if place >= end {
                break;
            }
            out[place - first] = value.at::<W, FMA>(frequency);
            given.values += 1;
        }
        while let Some(&(place, which)) = self.extras.get(given.extras) {
            let place = place as usize;
            if place >= end {
                break;
            }
            out[place - first] = out[place - first].plus(&extras[which as usize]);
            given.extras += 1;
        }
    }
}

/// How far the right-hand sides have been given out.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Given {
    values: usize,
    extras: usize,
}
