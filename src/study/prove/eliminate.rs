//! Gaussian elimination over a finite field: no rounding, so pivots are chosen for sparsity alone
//! (Markowitz, 1957).

use crate::number::prime::{Prime, Residue};

/// A row: columns ascending, no zeros.
type Row = Vec<(u32, Residue)>;

/// Solves A·x = b, A given by compressed columns; `None` if A is singular in this field.
pub(super) fn solve(
    prime: Prime,
    column_start: &[usize],
    row_of: &[usize],
    entries: &[Residue],
    rhs: &[Residue],
) -> Option<Vec<Residue>> {
    let n = rhs.len();
    assert!(column_start.len() == n + 1 && row_of.len() == entries.len());
    let mut work = Work::new(prime, column_start, row_of, entries, rhs);
    let mut pivots = Vec::with_capacity(n);
    for _ in 0..n {
        let pivot = work.choose()?;
        work.eliminate(pivot);
        pivots.push(pivot);
    }
    let mut x = vec![Residue::ZERO; n];
    for &(row, column, inverse) in pivots.iter().rev() {
        let known = |&(c, a): &(u32, Residue)| prime.mul(a, x[c as usize]);
        let others = work.rows[row].iter().filter(|(c, _)| *c != column);
        let sum = others.map(known).fold(work.rhs[row], |left, term| prime.sub(left, term));
        x[column as usize] = prime.mul(sum, inverse);
    }
    Some(x)
}

struct Work {
    prime: Prime,
    rows: Vec<Row>,
    rhs: Vec<Residue>,
    /// Rows not used as a pivot yet.
    active: Vec<usize>,
    /// How many active rows have an entry in each column.
    column_count: Vec<u32>,
    /// Rows that may have an entry in each column.
    holders: Vec<Vec<usize>>,
    done: Vec<bool>,
}

/// Row, column, and one over the entry there.
type Pivot = (usize, u32, Residue);

impl Work {
    fn new(
        prime: Prime,
        column_start: &[usize],
        row_of: &[usize],
        entries: &[Residue],
        rhs: &[Residue],
    ) -> Self {
        let n = rhs.len();
        let mut rows = vec![Row::new(); n];
        let mut holders = vec![Vec::new(); n];
        for column in 0..n {
            for at in column_start[column]..column_start[column + 1] {
                if !entries[at].is_zero() {
                    rows[row_of[at]].push((column as u32, entries[at]));
                    holders[column].push(row_of[at]);
                }
            }
        }
        let column_count = holders.iter().map(|h| h.len() as u32).collect();
        let (active, rhs, done) = ((0..n).collect(), rhs.to_vec(), vec![false; n]);
        Work { prime, rows, rhs, active, column_count, holders, done }
    }

    /// The shortest active row, and in it the column with the fewest entries.
    fn choose(&mut self) -> Option<Pivot> {
        let shortest = (0..self.active.len()).min_by_key(|&i| self.rows[self.active[i]].len())?;
        let row = self.active.swap_remove(shortest);
        self.done[row] = true;
        let entry = self.rows[row].iter().min_by_key(|(c, _)| self.column_count[*c as usize])?;
        let (column, value) = *entry;
        Some((row, column, self.prime.inverse(value)?))
    }

    fn eliminate(&mut self, (row, column, inverse): Pivot) {
        let pivot = std::mem::take(&mut self.rows[row]);
        for (c, _) in &pivot {
            self.column_count[*c as usize] -= 1;
        }
        for other in std::mem::take(&mut self.holders[column as usize]) {
            if self.done[other] {
                continue;
            }
            let Ok(at) = self.rows[other].binary_search_by_key(&column, |(c, _)| *c) else {
                continue;
            };
            let factor = self.prime.mul(self.rows[other][at].1, inverse);
            let rhs = self.prime.mul(factor, self.rhs[row]);
            self.rhs[other] = self.prime.sub(self.rhs[other], rhs);
            self.subtract(other, factor, &pivot, column);
        }
        self.rows[row] = pivot;
    }

    /// row ← row − factor·pivot; the entry in the pivot's column is zero afterwards.
    fn subtract(&mut self, row: usize, factor: Residue, pivot: &Row, column: u32) {
        let old = std::mem::take(&mut self.rows[row]);
        let mut new = Row::with_capacity(old.len() + pivot.len());
        let (mut own, mut from) = (old.iter().peekable(), pivot.iter().peekable());
        loop {
            let next = match (own.peek(), from.peek()) {
                (None, None) => break,
                (Some((a, _)), Some((b, _))) => *a.min(b),
                (Some((a, _)), None) => *a,
                (None, Some((b, _))) => *b,
            };
            let had = own.next_if(|(c, _)| *c == next).map(|(_, value)| *value);
            let taken = from.next_if(|(c, _)| *c == next);
            let less = taken.map_or(Residue::ZERO, |(_, value)| self.prime.mul(factor, *value));
            let value = self.prime.sub(had.unwrap_or(Residue::ZERO), less);
            match (had.is_some(), next != column && !value.is_zero()) {
                (true, true) => new.push((next, value)),
                (false, true) => {
                    new.push((next, value));
                    self.column_count[next as usize] += 1;
                    self.holders[next as usize].push(row);
                }
                (true, false) => self.column_count[next as usize] -= 1,
                (false, false) => {}
            }
        }
        self.rows[row] = new;
    }
}

#[cfg(test)]
mod tests {
    use crate::number::prime::{Prime, Residue};
    use crate::study::prove::eliminate::solve;
    use rand::rngs::StdRng;
    use rand::{Rng, SeedableRng};

    /// A random matrix with about `filled` entries a column, by columns.
    fn matrix(
        n: usize,
        filled: usize,
        prime: Prime,
        random: &mut StdRng,
    ) -> (Vec<usize>, Vec<usize>, Vec<Residue>) {
        let (mut start, mut rows, mut entries) = (vec![0], Vec::new(), Vec::new());
        for _ in 0..n {
            for row in 0..n {
                if (random.next_u64() as usize) % n < filled {
                    rows.push(row);
                    entries.push(prime.random_residue(random));
                }
            }
            start.push(rows.len());
        }
        (start, rows, entries)
    }

    #[test]
    fn the_solution_fulfils_every_equation() {
        let mut random = StdRng::seed_from_u64(11);
        let mut solved = 0;
        for round in 0..60 {
            let prime = Prime::random(&mut random);
            let n = 1 + round % 30;
            let (start, rows, entries) = matrix(n, 4 + round / 20 * 13, prime, &mut random);
            let rhs: Vec<_> = (0..n).map(|_| prime.random_residue(&mut random)).collect();
            let Some(x) = solve(prime, &start, &rows, &entries, &rhs) else { continue };
            let mut left = rhs.clone();
            for column in 0..n {
                for at in start[column]..start[column + 1] {
                    let term = prime.mul(entries[at], x[column]);
                    left[rows[at]] = prime.sub(left[rows[at]], term);
                }
            }
            assert!(left.iter().all(|r| r.is_zero()));
            solved += 1;
        }
        assert!(solved > 20, "{solved}");
    }

    #[test]
    fn a_matrix_with_a_repeated_row_is_singular() {
        let prime = Prime::random(&mut StdRng::seed_from_u64(1));
        let [a, b] = [prime.whole(3), prime.whole(5)];
        let singular = solve(prime, &[0, 2, 4], &[0, 1, 0, 1], &[a, a, b, b], &[a, b]);
        assert_eq!(singular, None);
    }
}
