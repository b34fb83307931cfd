//! The general plan: row by row, with a dense block at the end where the rest fills up.
//!
//! Each row is gathered, the earlier pivot rows are subtracted from it, and what is left is a row
//! of the upper factor. All places are known beforehand and stand in lists that are walked from
//! front to back.

use crate::solve::lanes::dense::BlockPlan;
use crate::solve::lanes::pivots::Elimination;
use crate::solve::lanes::values::Listing;

/// One row in the order of elimination.
#[derive(Clone, Copy, Debug)]
pub(super) struct Head {
    /// The unknown that it is solved for.
    pub column: u32,
    /// Where it stands in the factors: first the pivot, then the upper factor, then multipliers.
    pub start: u32,
    /// Entries of the upper factor, the pivot with them; all columns of the block in dense rows.
    pub upper: u32,
    /// Multipliers, one for each earlier row subtracted.
    pub lower: u32,
    /// Entries of the matrix in the row.
    pub entries: u32,
    /// Entries of the factors that are not in the matrix.
    pub fills: u32,
}

/// The lists.
#[derive(Clone, Debug)]
pub(super) struct RowPlan {
    /// Rows in the order of elimination, the sparse ones first.
    pub heads: Vec<Head>,
    /// How many are sparse.
    pub sparse: usize,
    /// The equations in the order of elimination.
    pub listing: Listing,
    /// Place in its row of each entry of the listing.
    pub entry_places: Vec<u32>,
    /// Places of the fill, row by row.
    pub fills: Vec<u32>,
    /// The earlier rows subtracted, row by row.
    pub sources: Vec<u32>,
    /// For each source the places its entries are subtracted at.
    pub targets: Vec<u32>,
    /// Unknowns of the upper factor of the sparse rows, without pivots.
    pub upper_columns: Vec<u32>,
    /// The dense block.
    pub dense: BlockPlan,
    /// Unknowns of the dense block.
    pub dense_columns: Vec<u32>,
    /// Lanes the factors take.
    pub storage: usize,
    /// Multipliers stay for further right-hand sides.
    pub keeps_lower: bool,
    /// Complex multiply-adds of one factorisation and one solve.
    pub work: u64,
}

const NOWHERE: u32 = u32::MAX;

struct Builder<'a> {
    found: &'a Elimination,
    /// Slots of each row as (column, slot).
    by_row: Vec<Vec<(u32, u32)>>,
    /// Place of each column in the row at hand.
    place: Vec<u32>,
    plan: RowPlan,
}

impl RowPlan {
    pub fn new(
        n: usize,
        column_start: &[usize],
        row: &[usize],
        found: &Elimination,
        keeps_lower: bool,
    ) -> RowPlan {
        let mut by_row = vec![Vec::new(); n];
        for j in 0..n {
            for slot in column_start[j]..column_start[j + 1] {
                by_row[row[slot]].push((j as u32, slot as u32));
            }
        }
        let size = found.dense_rows.len();
        let plan = RowPlan {
            heads: Vec::with_capacity(n),
            sparse: found.pivots.len(),
            listing: Listing::default(),
            entry_places: Vec::with_capacity(row.len()),
            fills: Vec::new(),
            sources: Vec::new(),
            targets: Vec::new(),
            upper_columns: Vec::new(),
            dense: BlockPlan::new(size, size, 0, false),
            dense_columns: found.dense_columns.clone(),
            storage: 0,
            keeps_lower,
            work: 0,
        };
        let place = vec![NOWHERE; n];
        Builder { found, by_row, place, plan }.build()
    }
}

impl Builder<'_> {
    fn build(mut self) -> RowPlan {
        let found = self.found;
        for (step, &(row, column)) in found.pivots.iter().enumerate() {
            let upper: Vec<u32> =
                std::iter::once(column).chain(found.upper[step].iter().copied()).collect();
            self.row(row, column, &upper);
            self.plan.upper_columns.extend(&upper[1..]);
            self.plan.work += upper.len() as u64 + found.lower[row as usize].len() as u64;
        }
        for (&row, &column) in found.dense_rows.iter().zip(&found.dense_columns) {
            self.row(row, column, &found.dense_columns);
        }
        let size = found.dense_rows.len() as u64;
        self.plan.work += self.plan.targets.len() as u64 + size * (size * size + 2) / 3;
        // The last row may reach beyond the place the next would have.
        let reach = |h: &Head| (h.start + h.upper + h.lower) as usize;
        self.plan.storage = self.plan.heads.iter().map(reach).max().unwrap_or(0);
        self.plan
    }

    fn row(&mut self, row: u32, column: u32, upper: &[u32]) {
        let lower = &self.found.lower[row as usize];
        let entries = std::mem::take(&mut self.by_row[row as usize]);
        for (at, &c) in upper.iter().enumerate() {
            self.place[c as usize] = at as u32;
        }
        for (at, &step) in lower.iter().enumerate() {
            let eliminated = self.found.pivots[step as usize].1;
            self.place[eliminated as usize] = (upper.len() + at) as u32;
        }
        let mut filled = vec![true; upper.len() + lower.len()];
        for &(c, _) in &entries {
            let place = self.place[c as usize];
            filled[place as usize] = false;
            self.plan.entry_places.push(place);
        }
        self.plan.listing.push(row, &entries);
        let fills = (0..filled.len()).filter(|&at| filled[at]).map(|at| at as u32);
        let before = self.plan.fills.len();
        self.plan.fills.extend(fills);
        for &step in lower {
            self.plan.sources.push(step);
            for &c in &self.found.upper[step as usize] {
                self.plan.targets.push(self.place[c as usize]);
            }
        }
        let start = match self.plan.heads.last() {
            None => 0,
            // A dense row is copied into the block, its multipliers may go.
            Some(h) if self.plan.keeps_lower => h.start + h.upper + h.lower,
            Some(_) if self.plan.heads.len() > self.plan.sparse => {
                self.plan.heads[self.plan.sparse].start
            }
            Some(h) => h.start + h.upper,
        };
        self.plan.heads.push(Head {
            column,
            start,
            upper: upper.len() as u32,
            lower: lower.len() as u32,
            entries: entries.len() as u32,
            fills: (self.plan.fills.len() - before) as u32,
        });
        for &c in upper {
            self.place[c as usize] = NOWHERE;
        }
        for &step in lower {
            self.place[self.found.pivots[step as usize].1 as usize] = NOWHERE;
        }
    }
}
