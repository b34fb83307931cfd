//! A comparison as JSON: SI units, shortest digits that read back to the same number.

use crate::render::Style;
use crate::render::compare::{ComparePage, word};
use crate::render::json::line;
use crate::study::Value;
use crate::study::compare::Worst;
use crate::study::prove::{Difference, Proof, Verdict};
use serde::Serialize;

#[derive(Serialize)]
struct Parts {
    re: f64,
    im: f64,
}

#[derive(Serialize)]
struct Furthest<'a> {
    quantity: &'a str,
    frequency: f64,
    relative: f64,
    first: Parts,
    second: Parts,
}

#[derive(Serialize)]
struct Stretch {
    from: f64,
    to: f64,
    pass: bool,
}

#[derive(Serialize)]
struct Identity<'a> {
    verdict: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    log2_error_bound: Option<f64>,
    rounds: usize,
    #[serde(skip_serializing_if = "Option::is_none")]
    for_any_sources: Option<bool>,
    #[serde(skip_serializing_if = "Option::is_none")]
    quantity: Option<&'a str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    frequency: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    solvable: Option<&'static str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    reason: Option<&'a str>,
    #[serde(skip_serializing_if = "<[String]>::is_empty")]
    without_value: &'a [String],
}

#[derive(Serialize)]
struct Document<'a> {
    schema: &'static str,
    within: f64,
    pass: bool,
    worst: Option<Furthest<'a>>,
    bands: Vec<Stretch>,
    #[serde(skip_serializing_if = "Option::is_none")]
    identity: Option<Identity<'a>>,
    first: &'a str,
    second: &'a str,
    quantities: Vec<Furthest<'a>>,
    unmatched: &'a [String],
    notes: &'a [String],
}

fn furthest(worst: &Worst, style: Style) -> Furthest<'_> {
    let parts = |value: Value| {
        let z = style.shown(value, worst.dimension, worst.frequency_hz).value;
        Parts { re: z.re, im: z.im }
    };
    Furthest {
        quantity: &worst.quantity,
        frequency: worst.frequency_hz,
        relative: worst.relative,
        first: parts(worst.first),
        second: parts(worst.second),
    }
}

fn identity(proof: &Proof) -> Identity<'_> {
    let mut identity = Identity {
        verdict: word(&proof.verdict),
        log2_error_bound: proof.log2_error_bound.is_finite().then_some(proof.log2_error_bound),
        rounds: proof.rounds,
        for_any_sources: None,
        quantity: None,
        frequency: None,
        solvable: None,
        reason: None,
        without_value: &proof.without_value,
    };
    match &proof.verdict {
        Verdict::Identical { for_any_sources } => identity.for_any_sources = Some(*for_any_sources),
        Verdict::Different(Difference::Quantity { name, shows_best }) => {
            identity.quantity = Some(shows_best.as_ref().map_or(name, |s| &s.quantity));
            identity.frequency = shows_best.as_ref().map(|s| s.frequency_hz);
        }
        Verdict::Different(Difference::Solvable { first }) => {
            identity.solvable = Some(if *first { "first" } else { "second" });
        }
        Verdict::Undecided(why) => identity.reason = Some(why),
    }
    identity
}

/// Appends the comparison as one line.
pub fn json(page: &ComparePage<'_>, style: Style, out: &mut Vec<u8>) {
    let found = page.comparison;
    let document = Document {
        schema: "bifilar.compare.1",
        within: found.within,
        pass: found.pass,
        worst: found.worst.map(|i| furthest(&found.quantities[i], style)),
        bands: found
            .bands
            .iter()
            .map(|band| Stretch { from: band.from_hz, to: band.to_hz, pass: band.pass })
            .collect(),
        identity: found.proof.as_ref().map(identity),
        first: page.first,
        second: page.second,
        quantities: found.quantities.iter().map(|worst| furthest(worst, style)).collect(),
        unmatched: &found.unmatched,
        notes: &found.notes,
    };
    line(&document, out);
}
