//! The values of the equations, in the order in which a plan uses them.

use crate::number::ComplexTwofold;
use crate::solve::lanes::lane::{Coefficient, Lane};

/// A value constant + slope·f with the frequency f in hertz.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Affine {
    /// The value at f = 0.
    pub constant: ComplexTwofold,
    /// What each hertz adds.
    pub slope: ComplexTwofold,
}

impl Affine {
    fn rounded(&self) -> Coefficient {
        Coefficient { constant: self.constant.to_complex(), slope: self.slope.to_complex() }
    }
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
        let coefficients = slots.iter().map(|&s| equations.entries[s as usize].rounded()).collect();
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
            if *value != Affine::default() {
                values.push((place(at), value.rounded()));
            }
        }
        values.sort_unstable_by_key(|v| v.0);
        let first = equations.extra_entries.len() as u32;
        let numbered = equations.extra_right.iter().zip(first..);
        let extras = numbered.map(|(&at, which)| (place(at as usize), which)).collect();
        Driven { sides, values, extras }
    }

    /// Writes the right-hand sides of all lanes.
    #[inline(always)]
    pub fn write<const W: usize, const FMA: bool>(
        &self,
        frequency: &[f64; W],
        extras: &[Lane<W>],
        out: &mut [Lane<W>],
    ) {
        out.fill(Lane::ZERO);
        for (place, coefficient) in &self.values {
            out[*place as usize] = coefficient.at::<W, FMA>(frequency);
        }
        for &(place, which) in &self.extras {
            let place = place as usize;
            out[place] = out[place].plus(&extras[which as usize]);
        }
    }
}
