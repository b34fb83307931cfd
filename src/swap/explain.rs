//! What was done, in words and numbers.

use crate::circuit::Circuit;
use crate::circuit::print::Printer;
use crate::number::{Ball, Balls, Field};
use crate::quantity::{Decimal, Dimension};
use crate::swap::algebra::Algebra;
use crate::swap::sets::CoupledSet;
use crate::swap::{Condition, Fate, Leg, Purchase, Reason, Series, Swapped, Twin};

/// Inductances outside this range are in no catalogue, in henries.
const MADE_INDUCTANCES: std::ops::RangeInclusive<f64> = 1e-9..=100.0;

/// Resistances outside this range are in no catalogue, in ohms.
const MADE_RESISTANCES: std::ops::RangeInclusive<f64> = 1e-4..=1e9;

/// The numbers that describe a set.
pub(crate) struct Matrices {
    pub inductance: Vec<Option<f64>>,
    pub k: Vec<Option<f64>>,
    pub leakage: Vec<Option<f64>>,
}

impl Matrices {
    pub(crate) fn of(algebra: &mut Algebra, set: &CoupledSet) -> Self {
        let n = set.len();
        let inductance: Vec<_> =
            (0..n * n).map(|at| algebra.real_or_zero(set.inductance(at / n, at % n))).collect();
        let k = (0..n * n)
            .map(|at| {
                let (i, j) = (at / n, at % n);
                let [own, other] = [inductance[i * n + i]?, inductance[j * n + j]?];
                match inductance[at]? {
                    0.0 => Some(0.0),
                    _ if i == j => Some(1.0),
                    m => Some(m / (own * other).sqrt()),
                }
            })
            .collect();
        let leakage = (0..n).map(|i| leakage(algebra, set, i)).collect();
        Matrices { inductance, k, leakage }
    }
}

/// What is left of a winding's inductance with all the others shorted.
fn leakage(algebra: &mut Algebra, set: &CoupledSet, own: usize) -> Option<f64> {
    let n = set.len();
    if n == 2 {
        let Some(factor) = set.leakage_factor(algebra) else { return Some(0.0) };
        return Some(algebra.real(factor)? * algebra.real(set.windings[own].inductance)?);
    }
    let mut a: Vec<Ball> = Vec::with_capacity(n * n);
    for at in 0..n * n {
        a.push(match set.inductance(at / n, at % n) {
            Some(id) => algebra.ball(id).filter(Ball::may_be_real)?,
            None => Ball::ZERO,
        });
    }
    let mut left: Vec<usize> = (0..n).filter(|&i| i != own).collect();
    // A winding that is used up by the others leaves nothing to take away.
    while let Some(place) = left.iter().position(|&i| !a[i * n + i].contains_zero()) {
        let p = left.swap_remove(place);
        let rest: Vec<usize> = left.iter().copied().chain([own]).collect();
        for &i in &rest {
            let factor = Balls.div(&a[i * n + p], &a[p * n + p]).ok()?;
            for &j in &rest {
                a[i * n + j] = Balls.sub(&a[i * n + j], &Balls.mul(&factor, &a[p * n + j]));
            }
        }
    }
    let ball = &a[own * n + own];
    Some(if ball.contains_zero() { 0.0 } else { ball.centre.to_complex().re })
}

/// Whether a part of this value could be bought.
pub(crate) fn purchase(value: Option<f64>, dimension: Dimension) -> Purchase {
    let made = match dimension {
        Dimension::RESISTANCE => MADE_RESISTANCES,
        _ => MADE_INDUCTANCES,
    };
    match value {
        None => Purchase::Varies,
        Some(value) if value < 0.0 => Purchase::Negative,
        Some(value) if !made.contains(&value) => Purchase::OutOfRange,
        Some(value) => {
            let nearest = Series::E24.nearest(value).to_f64();
            Purchase::Yes { nearest, off: (nearest - value) / value }
        }
    }
}

/// The lines that say what was replaced, under which condition and by which formulas.
pub fn explain(circuit: &Circuit, twin: &Twin) -> Vec<String> {
    let mut lines = Vec::new();
    let printer = Printer::new(&twin.circuit);
    for record in &twin.records {
        if !lines.is_empty() {
            lines.push(String::new());
        }
        lines.extend(explain_set(record));
        for name in &record.windings {
            let reading = twin.readings.iter().find(|reading| &reading.name == name);
            if let Some(reading) = reading {
                let own = circuit.element(reading.winding).name.replace('.', "_");
                let amps = printer.definition(reading.amps_formula);
                let drop = printer.definition(reading.drop_formula);
                lines.push(format!("  amps({own}) is {amps}; drop({own}) is {drop}"));
            }
        }
    }
    lines
}

/// The lines that say what was replaced, what allowed it, and by which formulas, in short.
pub fn summary(record: &Swapped) -> Vec<String> {
    let mut lines =
        vec![format!("{}, now {}:", record.windings.join(", "), record.kind.in_words())];
    lines.push(format!("  {}", condition(&record.condition)));
    for leg in &record.legs {
        let what = match (leg.fate, &leg.purchase) {
            (Fate::Element, Purchase::Negative) => " (negative: no real part)".to_owned(),
            (Fate::Element, _) if leg.rounded_from.is_some() => {
                format!(", rounded to {}", quantity(leg.value, leg.unit))
            }
            (Fate::Element, _) => String::new(),
            _ => format!(" ({})", to_buy(leg)),
        };
        lines.push(format!("  {} = {}{what}", leg.name, leg.formula));
    }
    lines
}

fn explain_set(record: &Swapped) -> Vec<String> {
    let mut lines =
        vec![format!("{}, now {}:", record.windings.join(", "), record.kind.in_words())];
    lines.push(format!("  {}", condition(&record.condition)));
    if record.isolation_lost {
        lines
            .push("  lost: the windings were isolated from each other, the twin joins them".into());
    }
    let n = record.windings.len();
    let mut rows = vec![["winding", "L", "leakage", "k to the others"].map(String::from).to_vec()];
    for (i, name) in record.windings.iter().enumerate() {
        let k = (0..n).filter(|&j| j != i).map(|j| match record.k[i * n + j] {
            Some(k) => format!("{} {}", record.windings[j], significant(k)),
            None => format!("{} varies", record.windings[j]),
        });
        let own = quantity(record.inductance[i * n + i], "H");
        let leakage = quantity(record.leakage[i], "H");
        rows.push(vec![name.clone(), own, leakage, k.collect::<Vec<_>>().join(", ")]);
    }
    lines.extend(aligned(&rows));
    let mut rows = vec![["part", "value", "formula", "to buy"].map(String::from).to_vec()];
    for leg in &record.legs {
        let value = match (leg.fate, leg.rounded_from) {
            (Fate::Open, _) => "infinite".into(),
            (Fate::Wire, _) => "0".into(),
            (_, Some(exact)) => {
                let exact = quantity(Some(exact), leg.unit);
                format!("{} (rounded from {exact})", quantity(leg.value, leg.unit))
            }
            _ => quantity(leg.value, leg.unit),
        };
        rows.push(vec![leg.name.clone(), value, leg.formula.clone(), to_buy(leg)]);
    }
    lines.extend(aligned(&rows));
    lines
}

fn condition(condition: &Condition) -> String {
    match condition {
        Condition::Always => "allowed: this kind needs no common node".into(),
        Condition::Shared(node) => format!("allowed: the windings meet at node {node}"),
        Condition::Tied(pairs) => {
            let pairs: Vec<_> = pairs.iter().map(|(a, b)| format!("{a} and {b}")).collect();
            format!("allowed: {} joined; a single tie carries no current", pairs.join(", "))
        }
        Condition::Transformer(Reason::Loop) => {
            "an ideal 1:1 transformer was added: the windings share no node, and a tie would close \
             a loop"
                .into()
        }
        Condition::Transformer(Reason::KeepIsolation) => {
            "an ideal 1:1 transformer was added: isolation is kept".into()
        }
        Condition::Transformer(Reason::Ratio) => {
            "an ideal transformer was added for the ratio; isolation is kept".into()
        }
    }
}

fn to_buy(leg: &Leg) -> String {
    match (&leg.fate, &leg.purchase) {
        (Fate::Wire, _) => "a wire".into(),
        (Fate::DroppedWire, _) => "left out as asked: a wire".into(),
        (Fate::DroppedOpen, _) => "left out as asked: open".into(),
        (Fate::Open, _) => "left out: infinite".into(),
        (_, Purchase::Yes { nearest, off }) => {
            format!("yes, E24 {} ({:+.1} %)", quantity(Some(*nearest), leg.unit), 100.0 * off)
        }
        (_, Purchase::Negative) => "no: negative".into(),
        (_, Purchase::OutOfRange) => "no: outside what is made".into(),
        (_, Purchase::Varies) => "no: depends on the frequency".into(),
        (_, Purchase::Ideal) => "no: ideal".into(),
        (_, Purchase::NoPart) => String::new(),
    }
}

/// Six significant digits, and a prefix where there is a unit.
fn quantity(value: Option<f64>, unit: &str) -> String {
    let Some(value) = value else { return "varies".into() };
    if unit.is_empty() || value == 0.0 || !value.is_finite() {
        let space = if unit.is_empty() { "" } else { " " };
        return format!("{}{space}{unit}", significant(value));
    }
    const PREFIXES: [&str; 10] = ["f", "p", "n", "µ", "m", "", "k", "M", "G", "T"];
    let step = ((value.abs().log10() / 3.0).floor() as i32).clamp(-5, 4);
    let scaled = value / 10f64.powi(3 * step);
    format!("{} {}{unit}", significant(scaled), PREFIXES[(step + 5) as usize])
}

fn significant(value: f64) -> String {
    let rounded: f64 = format!("{value:.5e}").parse().unwrap_or(value);
    let decimal = Decimal::from_f64(rounded);
    if (1e-5..1e9).contains(&rounded.abs()) || decimal.mantissa == 0 {
        format!("{rounded}")
    } else {
        format!("{rounded:e}")
    }
}

fn aligned(rows: &[Vec<String>]) -> Vec<String> {
    let columns = rows.iter().map(Vec::len).max().unwrap_or(0);
    let width = |c: usize| rows.iter().map(|r| r[c].chars().count()).max().unwrap_or(0);
    let widths: Vec<usize> = (0..columns).map(width).collect();
    rows.iter()
        .map(|row| {
            let cells = row.iter().zip(&widths).map(|(cell, &width)| format!("{cell:width$}"));
            format!("  {}", cells.collect::<Vec<_>>().join("  ")).trim_end().to_owned()
        })
        .collect()
}
