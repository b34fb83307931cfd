//! Comparisons: what a page of one is, and the words for a verdict.

mod csv;
mod json;
mod table;

pub use csv::csv;
pub use json::json;
pub use table::table;

use crate::render::number::exact;
use crate::study::compare::Comparison;
use crate::study::prove::{Difference, Proof, Verdict};

/// A comparison with the names of the circuits.
#[derive(Clone, Copy, Debug)]
pub struct ComparePage<'a> {
    /// The first circuit, usually its file name.
    pub first: &'a str,
    /// The second circuit.
    pub second: &'a str,
    /// The results.
    pub comparison: &'a Comparison,
}

/// The one word for a verdict.
pub fn word(verdict: &Verdict) -> &'static str {
    match verdict {
        Verdict::Identical { .. } => "identical",
        Verdict::Different(_) => "different",
        Verdict::Undecided(_) => "undecided",
    }
}

/// What a verdict says, in one sentence.
pub fn sentence(proof: &Proof) -> String {
    let bound = || format!("2^{}", proof.log2_error_bound.ceil());
    match &proof.verdict {
        Verdict::Identical { for_any_sources } => format!(
            "identical at every frequency above zero{} (chance of error below {})",
            if *for_any_sources { ", whatever the sources" } else { ", for these sources" },
            bound()
        ),
        Verdict::Different(Difference::Solvable { first }) => format!(
            "different: only the {} circuit has a solution (chance of error below {})",
            if *first { "first" } else { "second" },
            bound()
        ),
        Verdict::Different(Difference::Quantity { name, shows_best }) => match shows_best {
            None => format!("different in `{name}`, by less than the numbers can show"),
            Some(showing) => format!(
                "different; it shows best in `{}` at {}, by {:.2e} relative",
                showing.quantity,
                exact(showing.frequency_hz, 6, "Hz").flat(),
                showing.relative
            ),
        },
        Verdict::Undecided(why) => format!("undecided: {why}"),
    }
}

#[cfg(test)]
mod tests {
    use crate::quantity::Dimension;
    use crate::render::compare::ComparePage;
    use crate::render::samples::value;
    use crate::render::{Form, Format, Style, renderer};
    use crate::study::compare::{Band, Comparison, Worst};
    use crate::study::prove::{Proof, Verdict};
    use expect_test::{Expect, expect};

    fn comparison() -> Comparison {
        let worst = |quantity: &str, relative, pass| Worst {
            quantity: quantity.into(),
            dimension: Dimension::VOLTAGE,
            frequency_hz: 85e3,
            relative,
            first: value(3.0, 4.0, 1e-15),
            second: value(3.0, 4.5, 1e-15),
            pass,
        };
        Comparison {
            within: 1e-3,
            pass: false,
            quantities: vec![worst("volts(in)", 2.5e-5, true), worst("volts(bus)", 0.0925, false)],
            worst: Some(1),
            bands: vec![
                Band { from_hz: 10.0, to_hz: 4321.5, pass: true },
                Band { from_hz: 4321.5, to_hz: 1e6, pass: false },
            ],
            unmatched: vec!["node `star` is in the second circuit only".into()],
            notes: vec![],
            proof: Some(Proof {
                verdict: Verdict::Identical { for_any_sources: true },
                log2_error_bound: -117.25,
                rounds: 3,
                without_value: vec![],
            }),
        }
    }

    fn shows(format: Format, wanted: &Expect) {
        let comparison = comparison();
        let page = ComparePage { first: "charger.bfl", second: "its tee", comparison: &comparison };
        let mut out = Vec::new();
        let style = Style { form: Form::Polar, peak: false, digits: 6, bounds: false };
        renderer(format, style).comparison(&page, &mut out);
        wanted.assert_eq(&String::from_utf8(out).unwrap());
    }

    #[test]
    fn a_comparison_as_json() {
        shows(
            Format::Json,
            &expect![[r#"
            {"schema":"bifilar.compare.1","within":0.001,"pass":false,"worst":{"quantity":"volts(bus)","frequency":85000.0,"relative":0.0925,"first":{"re":3.0,"im":4.0},"second":{"re":3.0,"im":4.5}},"bands":[{"from":10.0,"to":4321.5,"pass":true},{"from":4321.5,"to":1000000.0,"pass":false}],"identity":{"verdict":"identical","log2_error_bound":-117.25,"rounds":3,"for_any_sources":true},"first":"charger.bfl","second":"its tee","quantities":[{"quantity":"volts(in)","frequency":85000.0,"relative":0.000025,"first":{"re":3.0,"im":4.0},"second":{"re":3.0,"im":4.5}},{"quantity":"volts(bus)","frequency":85000.0,"relative":0.0925,"first":{"re":3.0,"im":4.0},"second":{"re":3.0,"im":4.5}}],"unmatched":["node `star` is in the second circuit only"],"notes":[]}
        "#]],
        );
    }

    #[test]
    fn a_comparison_as_csv() {
        shows(
            Format::Csv,
            &expect![[r#"
            quantity,unit,frequency_Hz,relative,first_re,first_im,second_re,second_im,pass
            volts(in),V,85000,0.000025,3,4,3,4.5,true
            volts(bus),V,85000,0.0925,3,4,3,4.5,false
        "#]],
        );
    }

    #[test]
    fn a_comparison_as_a_table() {
        shows(
            Format::Table,
            &expect![[r#"
                charger.bfl against its tee: fails within 1e-3

                Furthest apart, relative to the larger of both
                  quantity     apart     at
                  ─────────────────────────────────────
                  volts(bus)   9.25e-2   85 kHz   fails
                  volts(in)    2.50e-5   85 kHz   holds

                volts(bus) at 85 kHz
                  circuit   value
                  ───────────────────────────
                  first     5.00000 V  53.13°
                  second    5.40833 V  56.31°

                Where it holds
                  from         to
                  ───────────────────────────────
                  10 Hz        4.3215 kHz   holds
                  4.3215 kHz   1 MHz        fails

                Proof: identical at every frequency above zero, whatever the sources (chance of error below 2^-117)

                Not compared
                  node `star` is in the second circuit only
            "#]],
        );
    }
}
