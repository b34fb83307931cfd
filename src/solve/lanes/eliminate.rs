//! The arithmetic of a [`RowPlan`], in all lanes at once.

use crate::solve::lanes::Buffers;
use crate::solve::lanes::lane::Lane;
use crate::solve::lanes::rows::RowPlan;
use crate::solve::lanes::values::Given;

/// Factors, and carries the right-hand sides through the lower factor on the way.
#[inline(always)]
pub(super) fn factor<const W: usize, const V: usize, const FMA: bool>(
    plan: &RowPlan,
    buffers: &mut Buffers<W>,
) {
    let Buffers { frequency, factors, carried, dense, extras, entries, driven, .. } = buffers;
    let sides = driven.sides;
    let mut entry = 0;
    let (mut fill, mut source, mut target) = (0, 0, 0);
    let mut extra = entries.extras.iter().peekable();
    let mut given = Given::default();
    for (step, head) in plan.heads.iter().enumerate() {
        let (done, work) = factors.split_at_mut(head.start as usize);
        let upper = head.upper as usize;
        let work = &mut work[..upper + head.lower as usize];
        for &place in &plan.fills[fill..fill + head.fills as usize] {
            work[place as usize] = Lane::ZERO;
        }
        fill += head.fills as usize;
        let last = entry + head.entries as usize;
        let places = &plan.entry_places[entry..last];
        let coefficients = &entries.coefficients[entry..last];
        for at in 0..places.len() {
            work[places[at] as usize] = coefficients[at].at::<W, FMA>(frequency);
        }
        while let Some(&&(at, which)) = extra.peek().filter(|e| (e.0 as usize) < last) {
            let place = plan.entry_places[at as usize] as usize;
            work[place] = work[place].plus(&extras[which as usize]);
            extra.next();
        }
        entry = last;
        let (before, here) = carried.split_at_mut(step * sides);
        driven.begin::<W, FMA>(&mut given, step, frequency, extras, here);
        for t in 0..head.lower as usize {
            let from = plan.sources[source] as usize;
            source += 1;
            let origin = plan.heads[from];
            let row = &done[origin.start as usize..(origin.start + origin.upper) as usize];
            let Some((inverse, row)) = row.split_first() else { continue };
            let factor = work[upper + t].times::<FMA>(inverse);
            work[upper + t] = factor;
            let targets = &plan.targets[target..target + row.len()];
            target += row.len();
            for at in 0..row.len() {
                let place = targets[at] as usize;
                work[place] = work[place].less::<FMA>(&factor, &row[at]);
            }
            for side in 0..sides {
                here[side] = here[side].less::<FMA>(&factor, &before[from * sides + side]);
            }
        }
        if step < plan.sparse {
            work[0] = work[0].inverse::<FMA>();
        } else {
            let row = &mut dense[(step - plan.sparse) * plan.dense.stride..][..upper];
            for at in 0..upper {
                row[at] = work[at];
            }
        }
    }
    if plan.dense.size > 0 {
        plan.dense.eliminate::<W, V, FMA>(&mut buffers.dense);
        carry_dense::<W, FMA>(plan, sides, buffers);
    }
}

/// Carries the right-hand sides through the lower factor of the dense block.
#[inline(always)]
fn carry_dense<const W: usize, const FMA: bool>(
    plan: &RowPlan,
    sides: usize,
    buffers: &mut Buffers<W>,
) {
    let carried = &mut buffers.carried[plan.sparse * sides..];
    for i in 1..plan.dense.size {
        let row = &buffers.dense[i * plan.dense.stride..][..i];
        let (before, here) = carried.split_at_mut(i * sides);
        for side in 0..sides {
            let mut sum = here[side];
            for (k, factor) in row.iter().enumerate() {
                sum = sum.less::<FMA>(factor, &before[k * sides + side]);
            }
            here[side] = sum;
        }
    }
}

/// Carries new right-hand sides, standing in the order of elimination, through a kept lower
/// factor.
#[inline(always)]
pub(super) fn carry<const W: usize, const FMA: bool>(
    plan: &RowPlan,
    sides: usize,
    buffers: &mut Buffers<W>,
) {
    let mut source = 0;
    for (step, head) in plan.heads.iter().enumerate() {
        let (before, here) = buffers.carried.split_at_mut(step * sides);
        let first = (head.start + head.upper) as usize;
        for factor in &buffers.factors[first..first + head.lower as usize] {
            let from = plan.sources[source] as usize;
            source += 1;
            for side in 0..sides {
                here[side] = here[side].less::<FMA>(factor, &before[from * sides + side]);
            }
        }
    }
    carry_dense::<W, FMA>(plan, sides, buffers);
}

/// Solves with the upper factor; the solutions stand in the order of the unknowns.
#[inline(always)]
pub(super) fn back<const W: usize, const FMA: bool>(
    plan: &RowPlan,
    sides: usize,
    buffers: &mut Buffers<W>,
) {
    let Buffers { factors, carried, dense, solution, .. } = buffers;
    let size = plan.dense.size;
    for i in (0..size).rev() {
        let row = &dense[i * plan.dense.stride..][..size];
        for side in 0..sides {
            let mut sum = carried[(plan.sparse + i) * sides + side];
            for j in i + 1..size {
                let column = plan.dense_columns[j] as usize;
                sum = sum.less::<FMA>(&row[j], &solution[column * sides + side]);
            }
            solution[plan.dense_columns[i] as usize * sides + side] = sum.times::<FMA>(&row[i]);
        }
    }
    let mut last = plan.upper_columns.len();
    for (step, head) in plan.heads[..plan.sparse].iter().enumerate().rev() {
        let row = &factors[head.start as usize..(head.start + head.upper) as usize];
        let Some((inverse, row)) = row.split_first() else { continue };
        let columns = &plan.upper_columns[last - row.len()..last];
        last -= row.len();
        for side in 0..sides {
            let mut sum = carried[step * sides + side];
            for at in 0..row.len() {
                let column = columns[at] as usize;
                sum = sum.less::<FMA>(&row[at], &solution[column * sides + side]);
            }
            solution[head.column as usize * sides + side] = sum.times::<FMA>(inverse);
        }
    }
}

/// Solves the transposed equations on the same factors. On entry `solution` has the right-hand
/// sides in the order of the unknowns; on return `carried` has the solutions in the order of
/// elimination of the equations.
#[inline(always)]
pub(super) fn transposed<const W: usize, const FMA: bool>(
    plan: &RowPlan,
    sides: usize,
    buffers: &mut Buffers<W>,
) {
    let Buffers { factors, carried, dense, solution, .. } = buffers;
    let mut first = 0;
    for (step, head) in plan.heads[..plan.sparse].iter().enumerate() {
        let row = &factors[head.start as usize..(head.start + head.upper) as usize];
        let Some((inverse, row)) = row.split_first() else { continue };
        let columns = &plan.upper_columns[first..first + row.len()];
        first += row.len();
        for side in 0..sides {
            let here = solution[head.column as usize * sides + side].times::<FMA>(inverse);
            carried[step * sides + side] = here;
            for (entry, &column) in row.iter().zip(columns) {
                let at = column as usize * sides + side;
                solution[at] = solution[at].less::<FMA>(entry, &here);
            }
        }
    }
    let size = plan.dense.size;
    for i in 0..size {
        let row = &dense[i * plan.dense.stride..][..size];
        for side in 0..sides {
            let column = plan.dense_columns[i] as usize;
            let here = solution[column * sides + side].times::<FMA>(&row[i]);
            carried[(plan.sparse + i) * sides + side] = here;
            for (entry, &column) in row[i + 1..].iter().zip(&plan.dense_columns[i + 1..]) {
                let at = column as usize * sides + side;
                solution[at] = solution[at].less::<FMA>(entry, &here);
            }
        }
    }
    for i in (0..size).rev() {
        let row = &dense[i * plan.dense.stride..][..i];
        let (before, here) = carried[plan.sparse * sides..].split_at_mut(i * sides);
        for (k, factor) in row.iter().enumerate() {
            for side in 0..sides {
                let at = k * sides + side;
                before[at] = before[at].less::<FMA>(factor, &here[side]);
            }
        }
    }
    let mut last = plan.sources.len();
    for (step, head) in plan.heads.iter().enumerate().rev() {
        let (before, here) = carried.split_at_mut(step * sides);
        let begin = (head.start + head.upper) as usize;
        let lower = &factors[begin..begin + head.lower as usize];
        let sources = &plan.sources[last - lower.len()..last];
        last -= lower.len();
        for (factor, &from) in lower.iter().zip(sources) {
            for side in 0..sides {
                let at = from as usize * sides + side;
                before[at] = before[at].less::<FMA>(factor, &here[side]);
            }
        }
    }
}
