//! The arithmetic of a [`FrontPlan`], in all lanes at once.

use crate::solve::lanes::Buffers;
use crate::solve::lanes::fronts::{Front, FrontPlan, contribution};
use crate::solve::lanes::lane::Lane;
use crate::solve::lanes::values::Given;

/// Solves completely: single unknowns, fronts, last unknowns. With `again`, the factors that
/// stand are used for the right-hand sides in `carried`.
#[inline(always)]
pub(super) fn solve<const W: usize, const V: usize, const FMA: bool>(
    plan: &FrontPlan,
    buffers: &mut Buffers<W>,
    again: bool,
) {
    let mut given = (!again).then(Given::default);
    let mut entry = 0;
    single::<W, FMA>(plan, buffers, &mut given, 0..plan.before, &mut entry);
    match &mut given {
        Some(given) => factor::<W, V, FMA>(plan, buffers, given),
        None => carry::<W, FMA>(plan, buffers),
    }
    back::<W, FMA>(plan, buffers);
    let last = plan.before + plan.inside;
    entry += plan.listing.counts[plan.before..last].iter().sum::<u32>() as usize;
    single::<W, FMA>(plan, buffers, &mut given, last..plan.unknowns.len(), &mut entry);
}

/// Equations in which only one unknown is still open.
#[inline(always)]
fn single<const W: usize, const FMA: bool>(
    plan: &FrontPlan,
    buffers: &mut Buffers<W>,
    given: &mut Option<Given>,
    which: std::ops::Range<usize>,
    entry: &mut usize,
) {
    let Buffers { frequency, extras, right, solution, entries, driven, carried, .. } = buffers;
    let sides = driven.sides;
    for at in which {
        match given {
            Some(given) => driven.begin::<W, FMA>(given, at, frequency, extras, right),
            None => right.copy_from_slice(&carried[at * sides..(at + 1) * sides]),
        }
        let unknown = plan.unknowns[at];
        let mut inverse = Lane::ZERO;
        for e in *entry..*entry + plan.listing.counts[at] as usize {
            let column = plan.listing.columns[e];
            let value = entries.value::<W, FMA>(e, frequency, extras);
            if column == unknown {
                inverse = value.inverse::<FMA>();
                continue;
            }
            for side in 0..sides {
                let x = &solution[column as usize * sides + side];
                right[side] = right[side].less::<FMA>(&value, x);
            }
        }
        *entry += plan.listing.counts[at] as usize;
        for side in 0..sides {
            solution[unknown as usize * sides + side] = right[side].times::<FMA>(&inverse);
        }
    }
}

#[inline(always)]
fn factor<const W: usize, const V: usize, const FMA: bool>(
    plan: &FrontPlan,
    buffers: &mut Buffers<W>,
    given: &mut Given,
) {
    let Buffers {
        frequency,
        extras,
        factors,
        dense: block,
        waiting,
        carried,
        right,
        solution,
        entries,
        front_entries,
        driven,
        ..
    } = buffers;
    let sides = driven.sides;
    let (mut entry, mut known, mut map, mut top) = (0, 0, 0, 0);
    let mut next_extra = 0;
    let mut order = plan.before;
    for front in &plan.fronts {
        let shape = &plan.blocks[front.block as usize];
        let (size, stride) = (shape.size, shape.stride);
        let pivots = front.pivots as usize;
        for i in 0..size {
            let row = &mut block[i * stride..i * stride + size + sides];
            row[..=i].fill(Lane::ZERO);
            row[size..].fill(Lane::ZERO);
        }
        let last = entry + front.entries as usize;
        let (places, coefficients) =
            (&plan.places[entry..last], &front_entries.coefficients[entry..last]);
        for e in 0..places.len() {
            block[places[e] as usize] = coefficients[e].at::<W, FMA>(frequency);
        }
        while let Some(&(at, which)) = front_entries.extras.get(next_extra)
            && (at as usize) < last
        {
            let place = plan.places[at as usize] as usize;
            block[place] = block[place].plus(&extras[which as usize]);
            next_extra += 1;
        }
        entry = last;
        for k in 0..pivots {
            driven.begin::<W, FMA>(given, order, frequency, extras, right);
            while let Some(&(at, e)) = plan.known.get(known)
                && at as usize == order
            {
                let value = entries.value::<W, FMA>(e as usize, frequency, extras);
                let column = plan.listing.columns[e as usize] as usize;
                for side in 0..sides {
                    right[side] = right[side].less::<FMA>(&value, &solution[column * sides + side]);
                }
                known += 1;
            }
            for side in 0..sides {
                block[k * stride + size + side] = right[side];
            }
            order += 1;
        }
        // The contributions on top are this front's children, the youngest first.
        for _ in 0..front.children {
            let rows = map_length(&plan.maps[map..]);
            let places = &plan.maps[map + 1..map + 1 + rows];
            map += rows + 1;
            top -= contribution(rows, sides);
            add::<W>(block, stride, size, sides, places, &waiting[top..]);
        }
        shape.eliminate::<W, V, FMA>(block);
        keep::<W>(front, shape.size, stride, block, factors);
        for k in 0..pivots {
            for side in 0..sides {
                let at = order - pivots + k;
                carried[at * sides + side] = block[k * stride + size + side];
            }
        }
        for i in pivots..size {
            let row = &block[i * stride..i * stride + size + sides];
            let length = i + 1 - pivots;
            waiting[top..top + length].copy_from_slice(&row[pivots..=i]);
            waiting[top + length..top + length + sides].copy_from_slice(&row[size..]);
            top += length + sides;
        }
    }
}

/// Carries the right-hand sides in `carried` through the lower factor, which is the upper one
/// divided by its pivots.
#[inline(always)]
fn carry<const W: usize, const FMA: bool>(plan: &FrontPlan, buffers: &mut Buffers<W>) {
    let Buffers { frequency, extras, factors, carried, solution, entries, driven, .. } = buffers;
    let sides = driven.sides;
    for &(at, e) in &plan.known {
        let value = entries.value::<W, FMA>(e as usize, frequency, extras);
        let column = plan.listing.columns[e as usize] as usize;
        for side in 0..sides {
            let to = &mut carried[at as usize * sides + side];
            *to = to.less::<FMA>(&value, &solution[column * sides + side]);
        }
    }
    for front in &plan.fronts {
        let rows = &plan.rows[front.rows.0 as usize..front.rows.1 as usize];
        let mut begin = front.start as usize;
        for k in 0..front.pivots as usize {
            let row = &factors[begin..begin + rows.len() - k];
            begin += row.len();
            for side in 0..sides {
                let place = |row: u32| (plan.before + row as usize) * sides + side;
                let scaled = carried[place(rows[k])].times::<FMA>(&row[0]);
                for j in 1..row.len() {
                    let to = &mut carried[place(rows[k + j])];
                    *to = to.less::<FMA>(&row[j], &scaled);
                }
            }
        }
    }
}

#[inline(always)]
fn map_length(maps: &[u32]) -> usize {
    maps[0] as usize
}

/// Adds a contribution to a front.
#[inline(always)]
fn add<const W: usize>(
    block: &mut [Lane<W>],
    stride: usize,
    size: usize,
    sides: usize,
    places: &[u32],
    from: &[Lane<W>],
) {
    let mut at = 0;
    for (i, &row) in places.iter().enumerate() {
        // Places ascend, so what is below the diagonal stays below.
        let row = &mut block[row as usize * stride..row as usize * stride + size + sides];
        for &column in &places[..=i] {
            let to = &mut row[column as usize];
            *to = to.plus(&from[at]);
            at += 1;
        }
        for side in 0..sides {
            row[size + side] = row[size + side].plus(&from[at]);
            at += 1;
        }
    }
}

/// Copies the upper factor of a front to where it stays.
#[inline(always)]
fn keep<const W: usize>(
    front: &Front,
    size: usize,
    stride: usize,
    block: &[Lane<W>],
    factors: &mut [Lane<W>],
) {
    let mut to = front.start as usize;
    for k in 0..front.pivots as usize {
        let row = &block[k * stride + k..k * stride + size];
        factors[to..to + row.len()].copy_from_slice(row);
        to += row.len();
    }
}

#[inline(always)]
fn back<const W: usize, const FMA: bool>(plan: &FrontPlan, buffers: &mut Buffers<W>) {
    let Buffers { factors, dense: gathered, carried, solution, driven, .. } = buffers;
    let sides = driven.sides;
    for front in plan.fronts.iter().rev() {
        let rows = &plan.rows[front.rows.0 as usize..front.rows.1 as usize];
        let (size, pivots) = (rows.len(), front.pivots as usize);
        for side in 0..sides {
            let unknown = |place: u32| plan.unknowns[plan.before + place as usize] as usize;
            for i in pivots..size {
                gathered[i] = solution[unknown(rows[i]) * sides + side];
            }
            let mut end = front.start as usize + pivots * size - pivots * (pivots - 1) / 2;
            for k in (0..pivots).rev() {
                let row = &factors[end - (size - k)..end];
                end -= size - k;
                let mut sum = carried[(plan.before + rows[k] as usize) * sides + side];
                for j in k + 1..size {
                    sum = sum.less::<FMA>(&row[j - k], &gathered[j]);
                }
                gathered[k] = sum.times::<FMA>(&row[0]);
                solution[unknown(rows[k]) * sides + side] = gathered[k];
            }
        }
    }
}
