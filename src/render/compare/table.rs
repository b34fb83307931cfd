//! A comparison as a table for a terminal of 80 columns.

use crate::render::columns::{draw, numbers, phasor, words};
use crate::render::compare::{ComparePage, sentence};
use crate::render::number::exact;
use crate::render::{Style, unit_of};
use crate::study::Value;
use crate::study::compare::{Band, Worst};

/// Quantities shown; the rest are closer.
const MOST_ROWS: usize = 12;

/// Digits of the edges of bands, which are found to a millionth.
const EDGE_DIGITS: usize = 6;

/// Appends the comparison.
pub fn table(page: &ComparePage<'_>, style: Style, out: &mut Vec<u8>) {
    let found = page.comparison;
    let (word, within) = (if found.pass { "holds" } else { "fails" }, found.within);
    let mut text = format!("{} against {}: {word} within {within:e}\n\n", page.first, page.second);
    let mut order: Vec<&Worst> = found.quantities.iter().collect();
    order.sort_by(|a, b| b.relative.total_cmp(&a.relative));
    let shown = &order[..order.len().min(MOST_ROWS)];
    if !shown.is_empty() {
        text.push_str("Furthest apart, relative to the larger of both\n");
        let value = |worst: &Worst, value: Value| {
            let value = style.shown(value, worst.dimension, worst.frequency_hz);
            phasor(value, &unit_of(worst.dimension, false), false, style, None)
        };
        let mark = |w: &&Worst| format!("{:.2e}{}", w.relative, if w.pass { "" } else { " !" });
        let at = |w: &&Worst| exact(w.frequency_hz, EDGE_DIGITS, "Hz").flat();
        draw(
            vec![
                words("quantity", shown.iter().map(|w| w.quantity.clone())),
                words("apart", shown.iter().map(mark)),
                words("at", shown.iter().map(at)),
                numbers("first", shown.iter().map(|w| value(w, w.first))),
                numbers("second", shown.iter().map(|w| value(w, w.second))),
            ],
            &mut text,
        );
        if order.len() > shown.len() {
            let more = order.len() - shown.len();
            text.push_str(&format!("  and {more} more, no further apart than these\n\n"));
        }
    }
    bands(&found.bands, &mut text);
    if let Some(proof) = &found.proof {
        text.push_str(&format!("Proof: {}\n", sentence(proof)));
        for name in &proof.without_value {
            text.push_str(&format!("  `{name}` has a value in neither circuit\n"));
        }
        text.push('\n');
    }
    if !found.unmatched.is_empty() {
        text.push_str("Not compared\n");
        found.unmatched.iter().for_each(|line| text.push_str(&format!("  {line}\n")));
    }
    out.extend_from_slice(text.trim_end().as_bytes());
    out.push(b'\n');
}

fn bands(bands: &[Band], text: &mut String) {
    if bands.is_empty() {
        return;
    }
    text.push_str("Where it holds\n");
    let edge = |hz: f64| exact(hz, EDGE_DIGITS, "Hz").flat();
    draw(
        vec![
            words("from", bands.iter().map(|band| edge(band.from_hz))),
            words("to", bands.iter().map(|band| edge(band.to_hz))),
            words("", bands.iter().map(|b| if b.pass { "holds" } else { "fails" }.to_owned())),
        ],
        text,
    );
}
