//! Elimination in full square blocks, tile by tile.
//!
//! A block stands row by row. After its first `pivots` columns are eliminated it holds, as usual,
//! the multipliers below the diagonal, the upper factor right of it and the inverse pivots on it;
//! what is left of the other rows is the block's contribution to the rest. A symmetric block is
//! computed below the diagonal only: row k of the upper factor is column k before it is divided
//! by its pivot, so both kinds are stored and solved with alike.
//!
//! The order of the work is a list made once, so that the arithmetic stands in one place and is
//! compiled for each vector width once.

use crate::solve::lanes::lane::{Lane, fused};

/// Columns of a panel: its multipliers and its part of the upper factor stay in the nearest cache.
const PANEL: usize = 24;

/// Columns factored entry by entry before tiles take over.
const STRIP: usize = 3;

/// What follows the tile product of a step.
#[derive(Clone, Copy, Debug, PartialEq)]
enum After {
    Nothing,
    /// Eliminate the columns of the step from the rows of the step.
    Columns,
    /// Solve the rows of the upper factor within the diagonal strip beginning at `first_row`.
    Rows,
}

/// block[rows, columns] −= block[rows, inner]·block[inner, columns], then what follows.
#[derive(Clone, Copy, Debug)]
struct Step {
    rows: (u32, u32),
    columns: (u32, u32),
    inner: (u32, u32),
    /// Only entries on and below the diagonal are wanted.
    lower_only: bool,
    after: After,
}

/// The work on one block.
#[derive(Clone, Debug)]
pub(super) struct BlockPlan {
    /// Rows, and columns without those of right-hand sides.
    pub size: usize,
    /// Distance from one row to the next.
    pub stride: usize,
    symmetric: bool,
    steps: Vec<Step>,
}

impl BlockPlan {
    /// A block of `size` rows and columns and `sides` right-hand sides after them, of which the
    /// first `pivots` columns are eliminated.
    pub fn new(size: usize, pivots: usize, sides: usize, symmetric: bool) -> Self {
        let all = size + sides;
        let mut plan = BlockPlan { size, stride: all, symmetric, steps: Vec::new() };
        if size > PANEL {
            // An odd distance spreads the rows over the sets of the caches.
            plan.stride |= 1;
        }
        for panel in (0..pivots).step_by(PANEL) {
            let end = (panel + PANEL).min(pivots);
            for strip in (panel..end).step_by(STRIP) {
                let strip_end = (strip + STRIP).min(end);
                let (inner, columns) = ((panel, strip), (strip, strip_end));
                plan.step((strip, size), columns, inner, symmetric, After::Columns);
                let right = if symmetric { size } else { strip_end };
                plan.step((strip, strip_end), (right, all), inner, false, After::Rows);
            }
            let (rows, inner) = ((end, size), (panel, end));
            plan.step(rows, (end, size), inner, symmetric, After::Nothing);
            plan.step(rows, (size, all), inner, false, After::Nothing);
        }
        plan
    }

    fn step(
        &mut self,
        rows: (usize, usize),
        columns: (usize, usize),
        inner: (usize, usize),
        lower_only: bool,
        after: After,
    ) {
        let idle = after == After::Nothing && inner.0 == inner.1;
        if rows.0 < rows.1 && columns.0 < columns.1 && !idle {
            let pair = |p: (usize, usize)| (p.0 as u32, p.1 as u32);
            let (rows, columns, inner) = (pair(rows), pair(columns), pair(inner));
            self.steps.push(Step { rows, columns, inner, lower_only, after });
        }
    }

    /// Lanes a block takes.
    pub fn area(&self) -> usize {
        self.size * self.stride
    }

    /// Eliminates. `V` lanes go through the tiles at once.
    #[inline(always)]
    pub fn eliminate<const W: usize, const V: usize, const FMA: bool>(
        &self,
        block: &mut [Lane<W>],
    ) {
        for step in &self.steps {
            let (rows, columns, inner) = (range(step.rows), range(step.columns), range(step.inner));
            let stride = self.stride;
            if !inner.is_empty() {
                if V == 8 {
                    product::<W, V, 3, 3, FMA>(block, stride, step);
                } else {
                    product::<W, V, 2, 2, FMA>(block, stride, step);
                }
            }
            match step.after {
                After::Nothing => {}
                After::Columns => {
                    for k in columns.clone() {
                        let inverse = block[k * stride + k].inverse::<FMA>();
                        block[k * stride + k] = inverse;
                        for i in k + 1..rows.end {
                            let entry = block[i * stride + k];
                            let factor = entry.times::<FMA>(&inverse);
                            block[i * stride + k] = factor;
                            if self.symmetric {
                                block[k * stride + i] = entry;
                            }
                        }
                        for j in k + 1..columns.end {
                            let upper = block[k * stride + j];
                            let first = if self.symmetric { j } else { k + 1 };
                            for i in first..rows.end {
                                let factor = block[i * stride + k];
                                let at = i * stride + j;
                                block[at] = block[at].less::<FMA>(&factor, &upper);
                            }
                        }
                    }
                }
                After::Rows => {
                    for i in rows.start + 1..rows.end {
                        for k in rows.start..i {
                            let factor = block[i * stride + k];
                            for j in columns.clone() {
                                let upper = block[k * stride + j];
                                let at = i * stride + j;
                                block[at] = block[at].less::<FMA>(&factor, &upper);
                            }
                        }
                    }
                }
            }
        }
    }
}

#[inline(always)]
fn range(pair: (u32, u32)) -> std::ops::Range<usize> {
    pair.0 as usize..pair.1 as usize
}

/// The product of a step in tiles of R rows and C columns.
#[inline(always)]
fn product<const W: usize, const V: usize, const R: usize, const C: usize, const FMA: bool>(
    block: &mut [Lane<W>],
    stride: usize,
    step: &Step,
) {
    let (rows, columns, inner) = (range(step.rows), range(step.columns), range(step.inner));
    let mut j = columns.start;
    while j < columns.end {
        let wide = columns.end - j >= C;
        let next = if wide { j + C } else { j + 1 };
        let mut i = rows.start;
        if step.lower_only {
            // Tiles that cross the diagonal are computed whole; the entries above it are spare.
            i = i.max(j);
        }
        while i < rows.end {
            let high = rows.end - i >= R;
            match (high, wide) {
                (true, true) => tile::<W, V, R, C, FMA>(block, stride, (i, j), &inner),
                (true, false) => tile::<W, V, R, 1, FMA>(block, stride, (i, j), &inner),
                (false, true) => tile::<W, V, 1, C, FMA>(block, stride, (i, j), &inner),
                (false, false) => tile::<W, V, 1, 1, FMA>(block, stride, (i, j), &inner),
            }
            i += if high { R } else { 1 };
        }
        j = next;
    }
}

#[inline(always)]
fn tile<const W: usize, const V: usize, const R: usize, const C: usize, const FMA: bool>(
    block: &mut [Lane<W>],
    stride: usize,
    (i, j): (usize, usize),
    inner: &std::ops::Range<usize>,
) {
    for part in (0..W).step_by(V) {
        let mut re = [[[0.0; V]; C]; R];
        let mut im = [[[0.0; V]; C]; R];
        for r in 0..R {
            for c in 0..C {
                let from = &block[(i + r) * stride + j + c];
                re[r][c].copy_from_slice(&from.re[part..part + V]);
                im[r][c].copy_from_slice(&from.im[part..part + V]);
            }
        }
        for k in inner.clone() {
            let upper = &block[k * stride + j..k * stride + j + C];
            for r in 0..R {
                let left = &block[(i + r) * stride + k];
                let (left_re, left_im) = (&left.re[part..part + V], &left.im[part..part + V]);
                for c in 0..C {
                    let (up_re, up_im) =
                        (&upper[c].re[part..part + V], &upper[c].im[part..part + V]);
                    for v in 0..V {
                        let sum = fused::<FMA>(-left_re[v], up_re[v], re[r][c][v]);
                        re[r][c][v] = fused::<FMA>(left_im[v], up_im[v], sum);
                    }
                    for v in 0..V {
                        let sum = fused::<FMA>(-left_re[v], up_im[v], im[r][c][v]);
                        im[r][c][v] = fused::<FMA>(-left_im[v], up_re[v], sum);
                    }
                }
            }
        }
        for r in 0..R {
            for c in 0..C {
                let to = &mut block[(i + r) * stride + j + c];
                to.re[part..part + V].copy_from_slice(&re[r][c]);
                to.im[part..part + V].copy_from_slice(&im[r][c]);
            }
        }
    }
}
