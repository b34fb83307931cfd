//! Results as tables for a terminal of 80 columns.

use crate::quantity::Dimension;
use crate::render::check::CheckPage;
use crate::render::columns::{draw, draw_in_lots, fits, numbers, phasor, words};
use crate::render::compare::{self, ComparePage};
use crate::render::number::{Bounded, Scale, Text, engineering, exact};
use crate::render::sweep_table::SweepTable;
use crate::render::{Render, SolvedPage, Style, unit_of};
use crate::study::{NodeResult, Solution, SweepHead, SweepRow, Value};

/// Digits of the stored energy, which comes without an error bound.
const ENERGY_DIGITS: usize = 3;

/// A bound is an order of magnitude with a little more.
const BOUND_DIGITS: usize = 2;
/// The table renderer.
pub struct Table {
    style: Style,
    sweep: SweepTable,
}

impl Table {
    /// A renderer.
    pub fn new(style: Style) -> Self {
        Table { style, sweep: SweepTable::new(style) }
    }
}

/// The largest volts, amperes and volt-amperes of a solution, against which zero is judged.
struct Scales {
    volt: f64,
    ampere: f64,
    power: f64,
}

impl Scales {
    fn of(solution: &Solution) -> Self {
        let largest = |values: &mut dyn Iterator<Item = Value>| {
            values.map(|v| v.value.norm()).fold(0.0, f64::max)
        };
        let drops = solution.elements.iter().filter_map(|e| e.drop);
        Scales {
            volt: largest(&mut solution.nodes.iter().map(|n| n.voltage).chain(drops)),
            ampere: largest(&mut solution.elements.iter().map(|e| e.current)),
            power: largest(&mut solution.elements.iter().map(|e| e.power)),
        }
    }

    fn of_dimension(&self, dimension: Dimension) -> Scale {
        match dimension {
            Dimension::VOLTAGE => Some(self.volt),
            Dimension::CURRENT => Some(self.ampere),
            Dimension::POWER => Some(self.power),
            _ => None,
        }
    }
}

/// One page being written.
struct Page<'a> {
    style: Style,
    solution: &'a Solution,
    scales: Scales,
    text: String,
}

impl Page<'_> {
    fn shown(&self, value: Value, dimension: Dimension, real: bool) -> [Text; 2] {
        let shown = self.style.shown(value, dimension, self.solution.frequency_hz);
        let scale = self.scales.of_dimension(dimension);
        phasor(shown, &unit_of(dimension, real), real, self.style, scale)
    }

    fn heading(&mut self, page: &SolvedPage<'_>) {
        if let Some(title) = page.title {
            self.text.push_str(title);
            self.text.push('\n');
        }
        let frequency = exact(self.solution.frequency_hz, 17, "Hz").flat();
        let kind = match (self.solution.frequency_hz == 0.0, self.style.peak) {
            (true, _) => "direct current",
            (false, true) => "peak amplitudes, mean powers",
            (false, false) => "rms amplitudes",
        };
        self.text.push_str(&format!("{} at {frequency}, {kind}\n\n", page.circuit));
    }

    /// How far a result may be off, two digits of it.
    fn bound(&self, value: Value, dimension: Dimension) -> String {
        let error = self.style.shown(value, dimension, self.solution.frequency_hz).error;
        exact(error, BOUND_DIGITS, &unit_of(dimension, false)).flat()
    }

    /// One table for every reference, in the order the references first occur.
    fn nodes(&mut self) {
        let mut references: Vec<&str> = Vec::new();
        let mut groups: Vec<Vec<&NodeResult>> = Vec::new();
        let mut places = std::collections::HashMap::new();
        for node in self.solution.nodes.iter().filter(|n| n.name != n.reference) {
            let place = *places.entry(node.reference.as_str()).or_insert_with(|| {
                references.push(&node.reference);
                groups.push(Vec::new());
                groups.len() - 1
            });
            groups[place].push(node);
        }
        for (reference, nodes) in references.into_iter().zip(groups) {
            self.text.push_str(&format!("Volts to {reference}\n"));
            let values = nodes.iter().map(|n| self.shown(n.voltage, Dimension::VOLTAGE, false));
            let mut columns = vec![
                words("node", nodes.iter().map(|n| n.name.clone())),
                numbers("voltage", values),
            ];
            let bounds = nodes.iter().map(|n| self.bound(n.voltage, Dimension::VOLTAGE));
            columns.extend(self.style.bounds.then(|| words("±", bounds)));
            draw(columns, &mut self.text);
        }
    }

    fn elements(&mut self) {
        let elements = &self.solution.elements;
        if elements.is_empty() {
            return;
        }
        let drops = elements.iter().map(|e| match e.drop {
            Some(drop) => self.shown(drop, Dimension::VOLTAGE, false),
            None => [Text { whole: "undetermined".into(), ..Text::default() }, Text::default()],
        });
        let currents = elements.iter().map(|e| self.shown(e.current, Dimension::CURRENT, false));
        let names = words("element", elements.iter().map(|e| e.name.clone()));
        let ends = elements.iter().map(|e| format!("{} → {}", e.left, e.right));
        let ends = words("left → right", ends);
        let (drops, currents) = (numbers("drop", drops), numbers("current", currents));
        let all = vec![names.clone(), ends.clone(), drops.clone(), currents.clone()];
        let heading = "Across and through (drop = left minus right, current left to right)\n";
        if fits(&all) {
            self.text.push_str(heading);
            return draw(all, &mut self.text);
        }
        self.text.push_str("Ends\n");
        draw(vec![names.clone(), ends], &mut self.text);
        self.text.push_str(heading);
        draw_in_lots(vec![names, drops, currents], &mut self.text);
    }

    fn powers(&mut self) {
        let elements = &self.solution.elements;
        if elements.is_empty() {
            return;
        }
        self.text.push_str("Power taken up\n");
        let scale = Some(self.scales.power);
        let part = |value, error, unit| {
            let bounded = Bounded { value, error };
            [engineering(bounded, self.style.digits, unit, scale), Text::default()]
        };
        let real = elements.iter().map(|e| part(e.power.value.re, e.power.error, "W"));
        let reactive = elements.iter().map(|e| part(e.power.value.im, e.power.error, "var"));
        // Sums of the elements' powers are off by no more than the sum of their bounds.
        let error = elements.iter().map(|e| e.power.error).sum::<f64>()
            + elements.iter().map(|e| e.power.value.norm()).sum::<f64>() * f64::EPSILON;
        let balance = self.solution.balance;
        let sums = [("sources give", balance.delivered), ("the rest takes", balance.absorbed)];
        let sum_real = sums.iter().map(|(_, s)| part(s.re, error, "W"));
        let sum_reactive = sums.iter().map(|(_, s)| part(s.im, error, "var"));
        let names = elements.iter().map(|e| (e.name.clone(), e.kind.to_owned()));
        let (names, kinds): (Vec<_>, Vec<_>) = names.unzip();
        let (real, reactive) = (
            numbers("real", real.chain(sum_real)),
            numbers("reactive", reactive.chain(sum_reactive)),
        );
        let labels = sums.map(|(label, _)| label.to_owned());
        let blanks = || [String::new(), String::new()];
        let columns = |names: &[String], kinds: &[String], label_first: bool| {
            let (a, b) =
                if label_first { (labels.clone(), blanks()) } else { (blanks(), labels.clone()) };
            let names = words("element", names.iter().cloned().chain(a));
            let kinds = words("what it is", kinds.iter().cloned().chain(b));
            vec![names, kinds, real.clone(), reactive.clone()]
        };
        let all = columns(&names, &kinds, false);
        match fits(&all) {
            true => draw(all, &mut self.text),
            // Every lot has the first column, so the labels of the sums stand there.
            false => draw_in_lots(columns(&names, &kinds, true), &mut self.text),
        }
    }

    fn readings(&mut self) {
        let readings = &self.solution.readings;
        if readings.is_empty() {
            return;
        }
        self.text.push_str("Readings\n");
        let values = readings.iter().map(|r| self.shown(r.value, r.dimension, r.real));
        let mut columns = vec![
            words("reading", readings.iter().map(|r| r.name.clone())),
            numbers("value", values),
        ];
        let bounds = readings.iter().map(|r| self.bound(r.value, r.dimension));
        columns.extend(self.style.bounds.then(|| words("±", bounds)));
        if readings.iter().any(|r| !r.missed.is_empty()) {
            let missed = |words: &[String]| match words {
                [] => String::new(),
                words => format!("MISSED: {}", words.join(", ")),
            };
            columns.push(words("limit", readings.iter().map(|r| missed(&r.missed))));
        }
        draw(columns, &mut self.text);
    }

    fn footer(&mut self) {
        let mut lines = vec![format!("Power balance   {}", closes(self.solution.balance.mismatch))];
        let highest = self.solution.highest_drop.and_then(|i| self.solution.elements.get(i));
        if let Some((element, drop)) = highest.and_then(|e| Some((e, e.drop?))) {
            let shown = self.style.shown(drop, Dimension::VOLTAGE, self.solution.frequency_hz);
            let size = Bounded::rounded_once(shown.value.norm(), shown.error);
            let size = engineering(size, self.style.digits, "V", Some(self.scales.volt)).flat();
            lines.push(format!("Highest drop    {size} across {}", element.name));
        }
        let energy = |value: f64| exact(value, ENERGY_DIGITS, "J").flat();
        let (magnetic, electric) =
            (self.solution.magnetic_energy_j, self.solution.electric_energy_j);
        if magnetic != 0.0 || electric != 0.0 {
            let (magnetic, electric) = (energy(magnetic), energy(electric));
            lines.push(format!("Stored, mean    {magnetic} magnetic, {electric} electric"));
        }
        for line in lines {
            self.text.push_str(&line);
            self.text.push('\n');
        }
    }
}

/// How well the power balance closes, in words.
fn closes(mismatch: f64) -> String {
    match mismatch == 0.0 {
        true => "closes to the last bit".to_owned(),
        false => format!("closes to {mismatch:.1e} of all powers added up"),
    }
}

impl Render for Table {
    fn solution(&mut self, page: &SolvedPage<'_>, out: &mut Vec<u8>) {
        let solution = page.solution;
        let scales = Scales::of(solution);
        let mut written = Page { style: self.style, solution, scales, text: String::new() };
        written.heading(page);
        written.readings();
        written.nodes();
        written.elements();
        written.powers();
        written.footer();
        out.extend_from_slice(written.text.as_bytes());
    }

    fn sweep_head(&mut self, head: &SweepHead, out: &mut Vec<u8>) {
        self.sweep.head(head, out);
    }

    fn sweep_row(&mut self, row: &SweepRow, out: &mut Vec<u8>) {
        self.sweep.row(row, out);
    }

    fn comparison(&mut self, page: &ComparePage<'_>, out: &mut Vec<u8>) {
        compare::table(page, self.style, out);
    }

    fn check(&mut self, page: &CheckPage<'_>, out: &mut Vec<u8>) {
        for diagnostic in page.diagnostics {
            out.extend_from_slice(diagnostic.render(page.sources, false).as_bytes());
            out.extend_from_slice(b"\n\n");
        }
        let line = format!("{}: {}\n", page.circuit, page.summary());
        out.extend_from_slice(line.as_bytes());
    }
}

#[cfg(test)]
mod tests {
    use crate::render::{Form, Format, SolvedPage, Style, renderer, samples};
    use expect_test::{Expect, expect};
    use unicode_width::UnicodeWidthStr;

    fn solved(style: Style) -> String {
        let solution = samples::solution();
        let page =
            SolvedPage { circuit: "link.bfl", title: Some("A small link"), solution: &solution };
        let mut out = Vec::new();
        renderer(Format::Table, style).solution(&page, &mut out);
        String::from_utf8(out).unwrap()
    }

    #[track_caller]
    fn solved_as(form: Form, peak: bool, expected: Expect) {
        let text = solved(Style { form, peak, digits: 6, bounds: false });
        assert!(text.lines().all(|line| line.width() <= 80), "{text}");
        expected.assert_eq(&text);
    }

    #[test]
    fn a_solution_fits_a_plain_terminal() {
        solved_as(
            Form::Polar,
            false,
            expect![[r#"
                A small link
                link.bfl at 85 kHz, rms amplitudes

                Readings
                  reading       value                   limit
                  ────────────────────────────────────────────────────────
                  bus_voltage   25.6320   V  -20.56°
                  efficiency     0.912500               MISSED: least 0.95

                Volts to gnd
                  node   voltage
                  ──────────────────────────
                  in      48.0000 V    0.00°
                  a      312      V  -89°

                Volts to keel
                  node   voltage
                  ─────────────────────────
                  bus    25.6320 V  -20.56°

                Across and through (drop = left minus right, current left to right)
                  element   left → right   drop                            current
                  ────────────────────────────────────────────────────────────────────────────
                  drive     gnd → in                 48.0000 V  180.00°    1.30504 A  -16.70°
                  load      bus → keel               25.6320 V  -20.56°    2.13600 A  -20.56°
                  shield    bus → gnd      undetermined                    0       A

                Power taken up
                  element   what it is       real         reactive
                  ────────────────────────────────────────────────────
                  drive     voltage source   -60.0000 W   -18.0000 var
                  load      resistor          54.7500 W     0      var
                  shield    capacitor          0      W     0      var
                            sources give      60.0000 W    18.0000 var
                            the rest takes    60.0000 W    18.0000 var

                Power balance   closes to 1.5e-16 of all powers added up
                Highest drop    25.6320 V across load
                Stored, mean    1.23 mJ magnetic, 900 µJ electric
            "#]],
        );
    }

    #[test]
    fn amplitudes_are_named_in_the_heading() {
        solved_as(
            Form::Rect,
            true,
            expect![[r#"
                A small link
                link.bfl at 85 kHz, peak amplitudes, mean powers

                Readings
                  reading       value                      limit
                  ───────────────────────────────────────────────────────────
                  bus_voltage   33.9411   V  -j12.7279 V
                  efficiency     0.912500                  MISSED: least 0.95

                Volts to gnd
                  node   voltage
                  ─────────────────────────
                  in     67.8823 V    +j0 V
                  a       5      V  -j441 V

                Volts to keel
                  node   voltage
                  ─────────────────────────────
                  bus    33.9411 V  -j12.7279 V

                Ends
                  element   left → right
                  ──────────────────────
                  drive     gnd → in
                  load      bus → keel
                  shield    bus → gnd

                Across and through (drop = left minus right, current left to right)
                  element   drop                               current
                  ──────────────────────────────────────────────────────────────────────
                  drive              -67.8823 V   +j0      V   1.76777 A  -j530.330   mA
                  load                33.9411 V  -j12.7279 V   2.82843 A    -j1.06066  A
                  shield    undetermined                       0       A    +j0        A

                Power taken up
                  element   what it is       real         reactive
                  ────────────────────────────────────────────────────
                  drive     voltage source   -60.0000 W   -18.0000 var
                  load      resistor          54.7500 W     0      var
                  shield    capacitor          0      W     0      var
                            sources give      60.0000 W    18.0000 var
                            the rest takes    60.0000 W    18.0000 var

                Power balance   closes to 1.5e-16 of all powers added up
                Highest drop    36.2491 V across load
                Stored, mean    1.23 mJ magnetic, 900 µJ electric
            "#]],
        );
    }

    #[test]
    fn levels_are_in_decibels() {
        solved_as(
            Form::Decibel,
            false,
            expect![[r#"
                A small link
                link.bfl at 85 kHz, rms amplitudes

                Readings
                  reading       value                 limit
                  ──────────────────────────────────────────────────────
                  bus_voltage   28.18 dBV  -20.56°
                  efficiency    -0.80  dB             MISSED: least 0.95

                Volts to gnd
                  node   voltage
                  ─────────────────────────
                  in     33.62 dBV    0.00°
                  a      49.88 dBV  -89°

                Volts to keel
                  node   voltage
                  ─────────────────────────
                  bus    28.18 dBV  -20.56°

                Across and through (drop = left minus right, current left to right)
                  element   left → right   drop                            current
                  ──────────────────────────────────────────────────────────────────────────────
                  drive     gnd → in                 33.62 dBV  180.00°       2.31 dBA  -16.70°
                  load      bus → keel               28.18 dBV  -20.56°       6.59 dBA  -20.56°
                  shield    bus → gnd      undetermined                    -inf    dBA

                Power taken up
                  element   what it is       real         reactive
                  ────────────────────────────────────────────────────
                  drive     voltage source   -60.0000 W   -18.0000 var
                  load      resistor          54.7500 W     0      var
                  shield    capacitor          0      W     0      var
                            sources give      60.0000 W    18.0000 var
                            the rest takes    60.0000 W    18.0000 var

                Power balance   closes to 1.5e-16 of all powers added up
                Highest drop    25.6320 V across load
                Stored, mean    1.23 mJ magnetic, 900 µJ electric
            "#]],
        );
    }
}
