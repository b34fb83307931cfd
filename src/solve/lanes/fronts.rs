//! The plan for matrices that equal their transpose: full square fronts, half of the work.
//!
//! Unknowns that a single equation gives (the nodes of grounded sources) come first, unknowns
//! that stand in a single equation (the currents of those sources) last. What is between is
//! eliminated along its diagonal, front by front up the tree (multifrontal method, Duff and Reid,
//! 1983), in an order of approximate minimum degree (Amestoy, Davis and Duff, 1996).

use crate::solve::lanes::dense::BlockPlan;
use crate::solve::lanes::values::{Equations, Listing};
use faer::dyn_stack::{MemBuffer, MemStack};
use faer::sparse::SymbolicSparseColMatRef;
use faer::sparse::linalg::amd;
use std::collections::HashMap;

/// A column joins the front of its parent where it has at most one in so many rows to spare:
/// a few zeros are computed with, and a contribution need not be added up.
const SPARE_SHARE: usize = 6;

/// One front.
#[derive(Clone, Debug)]
pub(super) struct Front {
    /// Unknowns eliminated here.
    pub pivots: u32,
    /// Its rows in `FrontPlan::rows`.
    pub rows: (u32, u32),
    /// Entries of the matrix that begin here.
    pub entries: u32,
    /// Which of the block plans it follows.
    pub block: u32,
    /// Fronts whose contributions it takes up: the last so many that are waiting.
    pub children: u32,
    /// Where its part of the factors begins.
    pub start: u32,
}

/// The lists.
#[derive(Clone, Debug)]
pub(super) struct FrontPlan {
    /// The equations: those of single unknowns, the fronts', and those of last unknowns.
    pub listing: Listing,
    /// Unknown that each equation of the listing gives.
    pub unknowns: Vec<u32>,
    /// How many equations come before the fronts.
    pub before: usize,
    /// How many belong to the fronts.
    pub inside: usize,
    /// Fronts, children before parents.
    pub fronts: Vec<Front>,
    /// Places in the order of elimination of the rows of each front.
    pub rows: Vec<u32>,
    /// Slot and place in its front of each entry.
    pub slots: Vec<u32>,
    pub places: Vec<u32>,
    /// Equation (as placed in the listing) and entry of the listing of known unknowns in fronts.
    pub known: Vec<(u32, u32)>,
    /// For each contribution in the order of use, its number of rows and their places in the parent.
    pub maps: Vec<u32>,
    /// Block plans shared by fronts of one shape.
    pub blocks: Vec<BlockPlan>,
    /// Lanes needed for factors, for the largest front, and for contributions waiting.
    pub storage: usize,
    pub largest: usize,
    pub waiting: usize,
    /// Complex multiply-adds of one factorisation and one solve.
    pub work: u64,
}

/// Pattern by columns.
#[derive(Clone, Copy)]
pub(super) struct Columns<'a> {
    pub n: usize,
    pub start: &'a [usize],
    pub row: &'a [usize],
}

struct Peeled {
    /// Row and column of each unknown that a single equation gives, in order.
    first: Vec<(usize, usize)>,
    /// Row and column of each unknown of a single equation, in order of solving.
    last: Vec<(usize, usize)>,
    /// Rows and columns taken.
    row_taken: Vec<bool>,
    column_taken: Vec<bool>,
}

fn peel(columns: Columns, by_row: &[Vec<(u32, u32)>]) -> Peeled {
    let n = columns.n;
    let mut of_row: Vec<usize> = by_row.iter().map(Vec::len).collect();
    let mut of_column: Vec<usize> =
        (0..n).map(|j| columns.start[j + 1] - columns.start[j]).collect();
    let mut out = Peeled {
        first: Vec::new(),
        last: Vec::new(),
        row_taken: vec![false; n],
        column_taken: vec![false; n],
    };
    let mut waiting: Vec<(bool, usize)> =
        (0..n).flat_map(|i| [(true, i), (false, i)]).rev().collect();
    while let Some((is_row, which)) = waiting.pop() {
        let rows_of = |j: usize| &columns.row[columns.start[j]..columns.start[j + 1]];
        let (row, column) = if is_row {
            let open = by_row[which].iter().map(|e| e.0 as usize).find(|&j| !out.column_taken[j]);
            let alone = !out.row_taken[which] && of_row[which] == 1;
            let Some(column) = open.filter(|_| alone) else { continue };
            (which, column)
        } else {
            let open = rows_of(which).iter().copied().find(|&i| !out.row_taken[i]);
            let alone = !out.column_taken[which] && of_column[which] == 1;
            let Some(row) = open.filter(|_| alone) else { continue };
            (row, which)
        };
        if is_row {
            out.first.push((row, column))
        } else {
            out.last.push((row, column))
        }
        out.row_taken[row] = true;
        out.column_taken[column] = true;
        for &i in rows_of(column) {
            of_row[i] -= 1;
            waiting.push((true, i));
        }
        for &(j, _) in &by_row[row] {
            of_column[j as usize] -= 1;
            waiting.push((false, j as usize));
        }
    }
    out.last.reverse();
    out
}

/// Order of approximate minimum degree of a symmetric pattern given by columns.
fn minimum_degree(start: &[usize], row: &[usize]) -> Option<Vec<usize>> {
    let n = start.len() - 1;
    let matrix = SymbolicSparseColMatRef::new_checked(n, n, start, None, row);
    let (mut forward, mut backward) = (vec![0usize; n], vec![0usize; n]);
    let mut memory = MemBuffer::try_new(amd::order_scratch::<usize>(n, row.len())).ok()?;
    let stack = MemStack::new(&mut memory);
    amd::order(&mut forward, &mut backward, matrix, Default::default(), stack).ok()?;
    Some(forward)
}

/// Structure of each column of the factor below the diagonal, and its parent in the tree.
fn structure(neighbours: &[Vec<u32>], order: &[usize]) -> (Vec<Vec<u32>>, Vec<u32>) {
    let n = order.len();
    let mut place = vec![0u32; n];
    order.iter().enumerate().for_each(|(at, &old)| place[old] = at as u32);
    let mut below: Vec<Vec<u32>> = Vec::with_capacity(n);
    let mut parent = vec![u32::MAX; n];
    let mut children: Vec<Vec<u32>> = vec![Vec::new(); n];
    let mut seen = vec![u32::MAX; n];
    for j in 0..n {
        let here = j as u32;
        seen[j] = here;
        let mut rows = Vec::new();
        let own = neighbours[order[j]].iter().map(|&i| place[i as usize]);
        let inherited = children[j].iter().flat_map(|&c| below[c as usize].iter().copied());
        for i in own.chain(inherited) {
            if i > here && seen[i as usize] != here {
                seen[i as usize] = here;
                rows.push(i);
            }
        }
        rows.sort_unstable();
        if let Some(&first) = rows.first() {
            parent[j] = first;
            children[first as usize].push(here);
        }
        below.push(rows);
    }
    (below, parent)
}

/// Nodes of the forest, children before parents and next to them.
fn postorder(parent: &[u32]) -> Vec<usize> {
    let n = parent.len();
    let mut children: Vec<Vec<usize>> = vec![Vec::new(); n];
    let mut roots = Vec::new();
    for j in 0..n {
        match parent[j] {
            u32::MAX => roots.push(j),
            p => children[p as usize].push(j),
        }
    }
    let mut out = Vec::with_capacity(n);
    let mut waiting = roots;
    while let Some(j) = waiting.pop() {
        out.push(j);
        waiting.extend(&children[j]);
    }
    out.reverse();
    out
}

impl FrontPlan {
    /// `None` where the matrix between the peeled unknowns does not equal its transpose.
    pub fn new(columns: Columns, equations: &Equations, sides: usize) -> Option<FrontPlan> {
        let n = columns.n;
        let mut by_row: Vec<Vec<(u32, u32)>> = vec![Vec::new(); n];
        for j in 0..n {
            for slot in columns.start[j]..columns.start[j + 1] {
                by_row[columns.row[slot]].push((j as u32, slot as u32));
            }
        }
        let peeled = peel(columns, &by_row);
        let open: Vec<usize> = (0..n).filter(|&j| !peeled.column_taken[j]).collect();
        if open.iter().any(|&i| peeled.row_taken[i]) || open.is_empty() {
            return None;
        }
        let neighbours = symmetric_neighbours(&by_row, &open, equations)?;
        let order = elimination_order(&neighbours)?;
        let (below, parent) = structure(&neighbours, &order);
        let order: Vec<usize> = order.into_iter().map(|core| open[core]).collect();
        let mut plan = FrontPlan {
            listing: Listing::default(),
            unknowns: Vec::new(),
            before: peeled.first.len(),
            inside: order.len(),
            fronts: Vec::new(),
            rows: Vec::new(),
            slots: Vec::new(),
            places: Vec::new(),
            known: Vec::new(),
            maps: Vec::new(),
            blocks: Vec::new(),
            storage: 0,
            largest: 0,
            waiting: 0,
            work: 0,
        };
        let inside = order.iter().map(|&j| (j, j));
        for (row, column) in peeled.first.iter().copied().chain(inside).chain(peeled.last) {
            plan.listing.push(row as u32, &by_row[row]);
            plan.unknowns.push(column as u32);
        }
        plan.find_known(&peeled.first);
        plan.grow(&below, &parent, sides);
        plan.place_entries(&by_row, &order);
        Some(plan)
    }

    /// Entries of fronts' equations whose unknown is known before.
    fn find_known(&mut self, first: &[(usize, usize)]) {
        let mut is_first = vec![false; self.unknowns.len()];
        first.iter().for_each(|&(_, column)| is_first[column] = true);
        let mut entry = 0;
        for (at, &count) in self.listing.counts.iter().enumerate() {
            let inside = (self.before..self.before + self.inside).contains(&at);
            for e in entry..entry + count as usize {
                if inside && is_first[self.listing.columns[e] as usize] {
                    self.known.push((at as u32, e as u32));
                }
            }
            entry += count as usize;
        }
    }

    /// Joins columns of one structure to fronts, and says how contributions add up.
    fn grow(&mut self, below: &[Vec<u32>], parent: &[u32], sides: usize) {
        let n = below.len();
        let mut shapes: HashMap<(usize, usize), u32> = HashMap::new();
        let mut stack: Vec<usize> = Vec::new();
        let mut waiting = 0;
        let mut place = vec![0u32; n];
        let mut first = 0;
        while first < n {
            let mut last = first;
            while last + 1 < n && parent[last] as usize == last + 1 {
                let spare = below[last + 1].len() + 1 - below[last].len();
                if spare > below[last].len() / SPARE_SHARE {
                    break;
                }
                last += 1;
            }
            let pivots = last + 1 - first;
            let begin = self.rows.len();
            self.rows.extend((first..=last).map(|j| j as u32).chain(below[last].iter().copied()));
            let size = self.rows.len() - begin;
            let block = *shapes.entry((size, pivots)).or_insert_with(|| {
                self.blocks.push(BlockPlan::new(size, pivots, sides, true));
                self.blocks.len() as u32 - 1
            });
            self.rows[begin..]
                .iter()
                .enumerate()
                .for_each(|(at, &j)| place[j as usize] = at as u32);
            let mut children = 0;
            // A child's first row outside is one of these pivots.
            while let Some(&child) = stack.last() {
                let rows = self.outside(child);
                if (self.rows[rows.0] as usize) > last {
                    break;
                }
                self.maps.push((rows.1 - rows.0) as u32);
                for at in rows.0..rows.1 {
                    self.maps.push(place[self.rows[at] as usize]);
                }
                waiting -= contribution(rows.1 - rows.0, sides);
                stack.pop();
                children += 1;
            }
            let area = self.blocks[block as usize].area();
            self.largest = self.largest.max(area);
            self.fronts.push(Front {
                pivots: pivots as u32,
                rows: (begin as u32, self.rows.len() as u32),
                entries: 0,
                block,
                children,
                start: self.storage as u32,
            });
            for k in 0..pivots {
                let right = (size - k - 1) as u64;
                self.storage += size - k;
                self.work += right * (right + 1) / 2 + 2 * right + 1;
            }
            if size > pivots {
                waiting += contribution(size - pivots, sides);
                self.waiting = self.waiting.max(waiting);
                stack.push(self.fronts.len() - 1);
            }
            first = last + 1;
        }
    }

    /// Rows of a front that are not eliminated in it.
    pub fn outside(&self, front: usize) -> (usize, usize) {
        let front = &self.fronts[front];
        ((front.rows.0 + front.pivots) as usize, front.rows.1 as usize)
    }

    /// Gives each entry on and below the diagonal its place in the front of its column.
    fn place_entries(&mut self, by_row: &[Vec<(u32, u32)>], order: &[usize]) {
        let mut at_order = vec![u32::MAX; by_row.len()];
        order.iter().enumerate().for_each(|(at, &j)| at_order[j] = at as u32);
        let mut place = vec![0u32; order.len()];
        for front in &mut self.fronts {
            let rows = &self.rows[front.rows.0 as usize..front.rows.1 as usize];
            rows.iter().enumerate().for_each(|(at, &j)| place[j as usize] = at as u32);
            let stride = self.blocks[front.block as usize].stride as u32;
            let before = self.slots.len();
            for &pivot in &rows[..front.pivots as usize] {
                // The matrix equals its transpose, so the row serves as the column.
                for &(j, slot) in &by_row[order[pivot as usize]] {
                    let other = at_order[j as usize];
                    if other != u32::MAX && other >= pivot {
                        self.slots.push(slot);
                        self.places.push(place[other as usize] * stride + place[pivot as usize]);
                    }
                }
            }
            front.entries = (self.slots.len() - before) as u32;
        }
    }
}

/// Lanes of a contribution of some rows: its lower half and its right-hand sides.
pub(super) fn contribution(rows: usize, sides: usize) -> usize {
    rows * (rows + 1) / 2 + rows * sides
}

/// Neighbours of each open unknown among the open ones; `None` where an entry has no equal
/// opposite it.
fn symmetric_neighbours(
    by_row: &[Vec<(u32, u32)>],
    open: &[usize],
    equations: &Equations,
) -> Option<Vec<Vec<u32>>> {
    let mut core = vec![u32::MAX; by_row.len()];
    open.iter().enumerate().for_each(|(at, &j)| core[j] = at as u32);
    let mut has_extra = vec![false; equations.entries.len()];
    equations.extra_entries.iter().for_each(|&e| has_extra[e as usize] = true);
    let mut out = vec![Vec::new(); open.len()];
    for (at, &i) in open.iter().enumerate() {
        for &(j, slot) in &by_row[i] {
            if core[j as usize] == u32::MAX {
                continue;
            }
            let opposite = &by_row[j as usize];
            let other = opposite.binary_search_by_key(&(i as u32), |e| e.0).ok()?;
            let (slot, other) = (slot as usize, opposite[other].1 as usize);
            let equal = equations.entries[slot] == equations.entries[other]
                && has_extra[slot] == has_extra[other];
            if !equal {
                return None;
            }
            out[at].push(core[j as usize]);
        }
    }
    Some(out)
}

/// Minimum degree, then children next to their parents.
fn elimination_order(neighbours: &[Vec<u32>]) -> Option<Vec<usize>> {
    let mut start = vec![0];
    let mut row = Vec::new();
    for rows in neighbours {
        row.extend(rows.iter().map(|&i| i as usize));
        start.push(row.len());
    }
    let order = minimum_degree(&start, &row)?;
    let (_, parent) = structure(neighbours, &order);
    Some(postorder(&parent).into_iter().map(|at| order[at]).collect())
}
