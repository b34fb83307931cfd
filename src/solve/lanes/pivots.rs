//! Which entry is eliminated when: a sparse elimination of one representative matrix that looks
//! for pivots of little fill (Markowitz, 1957) among those large enough in their column.
//!
//! What is found serves all frequencies, so every structural entry is kept, also where the sample
//! happens to cancel. When what remains is nearly full it is handed over as one dense block.

use num_complex::Complex64;
use std::collections::BTreeSet;

/// A pivot is at least this share of the largest entry of its column. Smaller shares let more
/// frequencies fail for whom the sample does not speak; larger ones cost fill.
const THRESHOLD: f64 = 0.1;

/// Columns and rows looked at before the best pivot so far is taken.
const CANDIDATES: usize = 6;

/// What remains is called dense from this share of entries on …
const DENSE_SHARE: f64 = 0.7;

/// … and from this number of rows on; below, the lists are as fast.
const LEAST_DENSE: usize = 24;

/// The order of elimination.
#[derive(Debug, Default)]
pub(super) struct Elimination {
    /// Row and column of each pivot in turn.
    pub pivots: Vec<(u32, u32)>,
    /// Columns of each pivot row when it is chosen, without the pivot's own.
    pub upper: Vec<Vec<u32>>,
    /// For each row the pivots subtracted from it, ascending.
    pub lower: Vec<Vec<u32>>,
    /// Rows of the dense block in the order of their pivots, which are on its diagonal.
    pub dense_rows: Vec<u32>,
    /// Columns of the dense block.
    pub dense_columns: Vec<u32>,
}

/// No pivot is left: the matrix of the sample is singular at this column.
#[derive(Debug)]
pub(super) struct NoPivot {
    pub column: usize,
}

struct Active {
    /// Entries of each row, ascending by column.
    rows: Vec<Vec<(u32, Complex64)>>,
    /// Rows that have an entry in each column.
    columns: Vec<Vec<u32>>,
    /// Open rows and columns by number of entries.
    row_queue: BTreeSet<(u32, u32)>,
    column_queue: BTreeSet<(u32, u32)>,
    entries: usize,
}

#[derive(Clone, Copy)]
struct Choice {
    cost: u64,
    off_diagonal: bool,
    row: u32,
    column: u32,
}

impl Choice {
    fn better_than(&self, other: &Option<Choice>) -> bool {
        other.is_none_or(|o| (self.cost, self.off_diagonal) < (o.cost, o.off_diagonal))
    }
}

impl Active {
    fn new(n: usize, column_start: &[usize], row: &[usize], values: &[Complex64]) -> Self {
        let mut rows = vec![Vec::new(); n];
        let mut columns = vec![Vec::new(); n];
        for j in 0..n {
            for at in column_start[j]..column_start[j + 1] {
                rows[row[at]].push((j as u32, values[at]));
                columns[j].push(row[at] as u32);
            }
        }
        let queue = |lengths: Vec<usize>| {
            lengths.into_iter().enumerate().map(|(i, len)| (len as u32, i as u32)).collect()
        };
        Active {
            row_queue: queue(rows.iter().map(Vec::len).collect()),
            column_queue: queue(columns.iter().map(Vec::len).collect()),
            entries: row.len(),
            rows,
            columns,
        }
    }

    fn value(&self, row: u32, column: u32) -> Complex64 {
        let entries = &self.rows[row as usize];
        match entries.binary_search_by_key(&column, |e| e.0) {
            Ok(at) => entries[at].1,
            Err(_) => Complex64::default(),
        }
    }

    fn largest_in_column(&self, column: u32) -> f64 {
        let rows = &self.columns[column as usize];
        rows.iter().map(|&row| self.value(row, column).norm()).fold(0.0, f64::max)
    }

    /// The pivot of least Markowitz cost among the shortest columns and rows.
    fn choose(&self) -> Option<Choice> {
        let mut best: Option<Choice> = None;
        let mut seen = 0;
        let mut columns = self.column_queue.iter().peekable();
        let mut rows = self.row_queue.iter().peekable();
        while columns.peek().is_some() || rows.peek().is_some() {
            let column_first = match (columns.peek(), rows.peek()) {
                (Some(c), Some(r)) => c.0 <= r.0,
                (c, _) => c.is_some(),
            };
            let &(count, which) = if column_first { columns.next()? } else { rows.next()? };
            let least = u64::from(count.saturating_sub(1)).pow(2);
            if best.is_some_and(|b| b.cost <= least) {
                break;
            }
            let found = if column_first { self.in_column(which) } else { self.in_row(which) };
            if let Some(found) = found {
                seen += 1;
                if found.better_than(&best) {
                    best = Some(found);
                }
                if seen >= CANDIDATES {
                    break;
                }
            }
        }
        best
    }

    fn cost(&self, row: u32, column: u32) -> u64 {
        let others = |len: usize| len.saturating_sub(1) as u64;
        others(self.rows[row as usize].len()) * others(self.columns[column as usize].len())
    }

    fn in_column(&self, column: u32) -> Option<Choice> {
        let least = THRESHOLD * self.largest_in_column(column);
        let mut best = None;
        for &row in &self.columns[column as usize] {
            let size = self.value(row, column).norm();
            if size >= least && size > 0.0 {
                let cost = self.cost(row, column);
                let choice = Choice { cost, off_diagonal: row != column, row, column };
                if choice.better_than(&best) {
                    best = Some(choice);
                }
            }
        }
        best
    }

    fn in_row(&self, row: u32) -> Option<Choice> {
        let mut best = None;
        for &(column, value) in &self.rows[row as usize] {
            let cost = self.cost(row, column);
            let choice = Choice { cost, off_diagonal: row != column, row, column };
            let size = value.norm();
            // The column is only searched for its largest entry where that can change the choice.
            if size > 0.0
                && choice.better_than(&best)
                && size >= THRESHOLD * self.largest_in_column(column)
            {
                best = Some(choice);
            }
        }
        best
    }

    /// Neither zeros nor a cheap pivot are worth going on for.
    fn is_dense(&self, cheapest: u64) -> bool {
        let left = self.row_queue.len();
        let full = (left * left) as f64;
        left >= LEAST_DENSE
            && self.entries as f64 >= DENSE_SHARE * full
            && cheapest as f64 >= DENSE_SHARE * full
    }

    /// Takes the pivot's row and column out and subtracts the row from all that need it.
    fn eliminate(&mut self, choice: Choice, step: u32, out: &mut Elimination) {
        let (row, column) = (choice.row, choice.column);
        let pivot_row = std::mem::take(&mut self.rows[row as usize]);
        let pivot_column = std::mem::take(&mut self.columns[column as usize]);
        self.row_queue.remove(&(pivot_row.len() as u32, row));
        self.column_queue.remove(&(pivot_column.len() as u32, column));
        self.entries -= pivot_row.len() + pivot_column.len() - 1;
        let pivot = pivot_row.iter().find(|e| e.0 == column).map(|e| e.1).unwrap_or_default();
        let others: Vec<_> = pivot_row.into_iter().filter(|e| e.0 != column).collect();
        for &(other, _) in &others {
            let rows = &mut self.columns[other as usize];
            self.column_queue.remove(&(rows.len() as u32, other));
            if let Some(at) = rows.iter().position(|&r| r == row) {
                rows.swap_remove(at);
            }
        }
        for &target in pivot_column.iter().filter(|&&r| r != row) {
            out.lower[target as usize].push(step);
            let factor = self.value(target, column) / pivot;
            let old = std::mem::take(&mut self.rows[target as usize]);
            self.row_queue.remove(&(old.len() as u32, target));
            let new = self.subtract(target, &old, column, factor, &others);
            self.entries = self.entries + new.len() - (old.len() - 1);
            self.row_queue.insert((new.len() as u32, target));
            self.rows[target as usize] = new;
        }
        for &(other, _) in &others {
            self.column_queue.insert((self.columns[other as usize].len() as u32, other));
        }
        out.pivots.push((row, column));
        out.upper.push(others.into_iter().map(|e| e.0).collect());
    }

    /// old − factor·others without the pivot's column; new entries are told to their columns.
    fn subtract(
        &mut self,
        target: u32,
        old: &[(u32, Complex64)],
        column: u32,
        factor: Complex64,
        others: &[(u32, Complex64)],
    ) -> Vec<(u32, Complex64)> {
        let mut new = Vec::with_capacity(old.len() + others.len());
        let mut old = old.iter().filter(|e| e.0 != column).peekable();
        for &(other, value) in others {
            while let Some(&&entry) = old.peek().filter(|e| e.0 < other) {
                new.push(entry);
                old.next();
            }
            let here = match old.peek().filter(|e| e.0 == other) {
                Some(entry) => {
                    let here = entry.1;
                    old.next();
                    here
                }
                None => {
                    self.columns[other as usize].push(target);
                    Complex64::default()
                }
            };
            new.push((other, here - factor * value));
        }
        new.extend(old);
        new
    }

    /// Orders the rows of the dense rest by partial pivoting.
    fn finish_dense(&self, out: &mut Elimination) -> Result<(), NoPivot> {
        let columns: Vec<u32> = self.column_queue.iter().map(|c| c.1).collect();
        let mut rows: Vec<u32> = self.row_queue.iter().map(|r| r.1).collect();
        let size = columns.len();
        let mut full: Vec<Vec<Complex64>> =
            rows.iter().map(|&r| columns.iter().map(|&c| self.value(r, c)).collect()).collect();
        for k in 0..size {
            let size_at = |i: &usize| full[*i][k].norm();
            let best = (k..size).max_by(|a, b| size_at(a).total_cmp(&size_at(b))).unwrap_or(k);
            if full[best][k].norm() == 0.0 || !full[best][k].is_finite() {
                return Err(NoPivot { column: columns[k] as usize });
            }
            full.swap(k, best);
            rows.swap(k, best);
            let (done, rest) = full.split_at_mut(k + 1);
            let pivot = &done[k];
            for row in rest {
                let factor = row[k] / pivot[k];
                if factor != Complex64::default() {
                    for j in k + 1..size {
                        row[j] -= factor * pivot[j];
                    }
                }
            }
        }
        out.dense_rows = rows;
        out.dense_columns = columns;
        Ok(())
    }
}

/// Finds pivots for the matrix of the sample.
pub(super) fn find(
    n: usize,
    column_start: &[usize],
    row: &[usize],
    values: &[Complex64],
) -> Result<Elimination, NoPivot> {
    let mut active = Active::new(n, column_start, row, values);
    let mut out = Elimination { lower: vec![Vec::new(); n], ..Elimination::default() };
    for step in 0..n {
        let Some(choice) = active.choose() else {
            let column = active.column_queue.first().map_or(0, |c| c.1 as usize);
            return Err(NoPivot { column });
        };
        if active.is_dense(choice.cost) {
            active.finish_dense(&mut out)?;
            break;
        }
        active.eliminate(choice, step as u32, &mut out);
    }
    Ok(out)
}
