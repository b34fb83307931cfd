//! A comparison as CSV: one row a quantity, full precision.

use crate::render::Style;
use crate::render::compare::ComparePage;

/// Appends the comparison; SI units, real and imaginary parts.
pub fn csv(page: &ComparePage<'_>, style: Style, out: &mut Vec<u8>) {
    let mut writer = csv::Writer::from_writer(&mut *out);
    let head = [
        "quantity",
        "unit",
        "frequency_Hz",
        "relative",
        "first_re",
        "first_im",
        "second_re",
        "second_im",
        "pass",
    ];
    // Writing to memory does not fail.
    let _ = writer.write_record(head);
    for worst in &page.comparison.quantities {
        let shown = |v| style.shown(v, worst.dimension, worst.frequency_hz).value;
        let (first, second) = (shown(worst.first), shown(worst.second));
        let numbers =
            [worst.frequency_hz, worst.relative, first.re, first.im, second.re, second.im];
        let mut row = vec![worst.quantity.clone(), worst.dimension.to_string()];
        row.extend(numbers.map(|x| x.to_string()));
        row.push(worst.pass.to_string());
        let _ = writer.write_record(&row);
    }
    let _ = writer.flush();
}
