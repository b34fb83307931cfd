//! Results as JSON: SI units, shortest digits that read back to the same number.

use crate::quantity::Dimension;
use crate::render::check::CheckPage;
use crate::render::compare::{self, ComparePage};
use crate::render::{Render, SolvedPage, Style, unit_of};
use crate::study::{ElementResult, SweepHead, SweepRow, Value};
use num_complex::Complex64;
use serde::Serialize;
use serde::ser::{SerializeMap, Serializer};

/// The JSON renderer.
pub struct Json {
    style: Style,
    head: SweepHead,
}

impl Json {
    /// A renderer; only the choice of amplitudes matters to it.
    pub fn new(style: Style) -> Self {
        let head = SweepHead { varied: Vec::new(), readings: Vec::new(), rows: 0 };
        Json { style, head }
    }
}

#[derive(Serialize)]
struct Parts {
    re: f64,
    im: f64,
}

impl From<Complex64> for Parts {
    fn from(value: Complex64) -> Self {
        Parts { re: value.re, im: value.im }
    }
}

#[derive(Serialize)]
struct Node<'a> {
    name: &'a str,
    reference: &'a str,
    re: f64,
    im: f64,
    error: f64,
}

#[derive(Serialize)]
struct Element<'a> {
    name: &'a str,
    kind: &'a str,
    left: &'a str,
    right: &'a str,
    drop: Option<Parts>,
    current: Parts,
    power: Parts,
}

#[derive(Serialize)]
struct Reading<'a> {
    name: &'a str,
    unit: String,
    re: f64,
    im: f64,
    error: f64,
}

#[derive(Serialize)]
struct Balance {
    delivered: Parts,
    absorbed: Parts,
    mismatch: f64,
}

#[derive(Serialize)]
struct Solved<'a> {
    schema: &'static str,
    circuit: &'a str,
    title: Option<&'a str>,
    frequency: f64,
    amplitude: &'static str,
    nodes: Vec<Node<'a>>,
    elements: Vec<Element<'a>>,
    readings: Vec<Reading<'a>>,
    balance: Balance,
    notes: &'a [String],
}

fn element<'a>(element: &'a ElementResult, style: Style, frequency_hz: f64) -> Element<'a> {
    let shown = |value, dimension| style.shown(value, dimension, frequency_hz).value.into();
    Element {
        name: &element.name,
        kind: element.kind,
        left: &element.left,
        right: &element.right,
        drop: element.drop.map(|drop| shown(drop, Dimension::VOLTAGE)),
        current: shown(element.current, Dimension::CURRENT),
        power: element.power.value.into(),
    }
}

fn solved<'a>(page: &SolvedPage<'a>, style: Style) -> Solved<'a> {
    let solution = page.solution;
    let shown = |value, dimension| style.shown(value, dimension, solution.frequency_hz);
    let nodes = solution.nodes.iter().map(|node| {
        let Value { value, error } = shown(node.voltage, Dimension::VOLTAGE);
        Node { name: &node.name, reference: &node.reference, re: value.re, im: value.im, error }
    });
    let readings = solution.readings.iter().map(|reading| {
        let Value { value, error } = shown(reading.value, reading.dimension);
        let unit = unit_of(reading.dimension, reading.real);
        Reading { name: &reading.name, unit, re: value.re, im: value.im, error }
    });
    Solved {
        schema: "bifilar.solve.1",
        circuit: page.circuit,
        title: page.title,
        frequency: solution.frequency_hz,
        amplitude: style.amplitude(),
        nodes: nodes.collect(),
        elements: solution
            .elements
            .iter()
            .map(|e| element(e, style, solution.frequency_hz))
            .collect(),
        readings: readings.collect(),
        balance: Balance {
            delivered: solution.balance.delivered.into(),
            absorbed: solution.balance.absorbed.into(),
            mismatch: solution.balance.mismatch,
        },
        notes: &solution.notes,
    }
}

/// One line of a sweep; serialised by hand since the parameters' names are keys.
struct Line<'a> {
    style: Style,
    head: &'a SweepHead,
    row: &'a SweepRow,
}

struct LineReadings<'a>(&'a Line<'a>);

#[derive(Serialize)]
struct LineReading<'a> {
    name: &'a str,
    re: f64,
    im: f64,
    error: f64,
}

impl Serialize for LineReadings<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let Line { style, head, row } = self.0;
        let readings = head.readings.iter().zip(&row.values);
        serializer.collect_seq(readings.map(|((name, dimension, _), value)| {
            let Value { value, error } = style.shown(*value, *dimension, row.frequency_hz);
            LineReading { name, re: value.re, im: value.im, error }
        }))
    }
}

impl Serialize for Line<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut map = serializer.serialize_map(None)?;
        map.serialize_entry("frequency", &self.row.frequency_hz)?;
        for ((name, _), value) in self.head.varied.iter().zip(&self.row.varied) {
            map.serialize_entry(name, value)?;
        }
        map.serialize_entry("readings", &LineReadings(self))?;
        map.end()
    }
}

/// Appends one line. Writing to memory and string keys leave nothing that could fail.
pub fn line(value: &impl Serialize, out: &mut Vec<u8>) {
    let written = serde_json::to_writer(&mut *out, value);
    debug_assert!(written.is_ok());
    out.push(b'\n');
}

impl Render for Json {
    fn solution(&mut self, page: &SolvedPage<'_>, out: &mut Vec<u8>) {
        line(&solved(page, self.style), out);
    }

    fn sweep_head(&mut self, head: &SweepHead, _: &mut Vec<u8>) {
        self.head = head.clone();
    }

    fn sweep_row(&mut self, row: &SweepRow, out: &mut Vec<u8>) {
        line(&Line { style: self.style, head: &self.head, row }, out);
    }

    fn comparison(&mut self, page: &ComparePage<'_>, out: &mut Vec<u8>) {
        compare::json(page, self.style, out);
    }

    fn check(&mut self, page: &CheckPage<'_>, out: &mut Vec<u8>) {
        line(&page.as_data(), out);
    }
}

#[cfg(test)]
mod tests {
    use crate::render::{Form, Format, SolvedPage, Style, renderer, samples};
    use expect_test::{Expect, expect};

    #[track_caller]
    fn solved_as(peak: bool, expected: Expect) {
        let style = Style { form: Form::Polar, peak, digits: 6, bounds: false };
        let mut solution = samples::solution();
        solution.elements.remove(0);
        solution.nodes.truncate(1);
        let page = SolvedPage { circuit: "link.bfl", title: None, solution: &solution };
        let mut out = Vec::new();
        renderer(Format::Json, style).solution(&page, &mut out);
        expected.assert_eq(&String::from_utf8(out).unwrap());
    }

    #[test]
    fn a_solution_is_one_object_in_the_documented_order() {
        solved_as(
            false,
            expect![[r#"
            {"schema":"bifilar.solve.1","circuit":"link.bfl","title":null,"frequency":85000.0,"amplitude":"rms","nodes":[{"name":"in","reference":"gnd","re":48.0,"im":0.0,"error":1e-14}],"elements":[{"name":"load","kind":"resistor","left":"bus","right":"keel","drop":{"re":24.0,"im":-9.0},"current":{"re":2.0,"im":-0.75},"power":{"re":54.75,"im":0.0}},{"name":"shield","kind":"capacitor","left":"bus","right":"gnd","drop":null,"current":{"re":0.0,"im":0.0},"power":{"re":0.0,"im":0.0}}],"readings":[{"name":"bus_voltage","unit":"V","re":24.0,"im":-9.0,"error":1e-13},{"name":"efficiency","unit":"","re":0.9125,"im":0.0,"error":1e-14}],"balance":{"delivered":{"re":60.0,"im":18.0},"absorbed":{"re":60.0,"im":18.0},"mismatch":1.5e-16},"notes":["one note"]}
        "#]],
        );
    }

    #[test]
    fn amplitudes_scale_volts_and_amperes_but_no_power() {
        solved_as(
            true,
            expect![[r#"
            {"schema":"bifilar.solve.1","circuit":"link.bfl","title":null,"frequency":85000.0,"amplitude":"peak","nodes":[{"name":"in","reference":"gnd","re":67.88225099390857,"im":0.0,"error":4.428791083045944e-14}],"elements":[{"name":"load","kind":"resistor","left":"bus","right":"keel","drop":{"re":33.941125496954285,"im":-12.727922061357857},"current":{"re":2.8284271247461903,"im":-1.0606601717798214},"power":{"re":54.75,"im":0.0}},{"name":"shield","kind":"capacitor","left":"bus","right":"gnd","drop":null,"current":{"re":0.0,"im":0.0},"power":{"re":0.0,"im":0.0}}],"readings":[{"name":"bus_voltage","unit":"V","re":33.941125496954285,"im":-12.727922061357857,"error":1.575192072542963e-13},{"name":"efficiency","unit":"","re":0.9125,"im":0.0,"error":1e-14}],"balance":{"delivered":{"re":60.0,"im":18.0},"absorbed":{"re":60.0,"im":18.0},"mismatch":1.5e-16},"notes":["one note"]}
        "#]],
        );
    }

    #[test]
    fn a_sweep_is_one_object_a_line() {
        let style = Style { form: Form::Polar, peak: false, digits: 6, bounds: false };
        let (head, rows) = samples::sweep();
        let (mut json, mut out) = (renderer(Format::Json, style), Vec::new());
        json.sweep_head(&head, &mut out);
        rows.iter().for_each(|row| json.sweep_row(row, &mut out));
        expect![[r#"
            {"frequency":10000.0,"L_dock":0.00024,"readings":[{"name":"out","re":3.0,"im":4.0,"error":1e-15},{"name":"max(a, b)","re":0.0,"im":-50.0,"error":1e-12},{"name":"efficiency","re":0.5,"im":0.0,"error":0.0}]}
            {"frequency":12345.5,"L_dock":0.00024,"readings":[{"name":"out","re":-0.001,"im":0.0,"error":1e-7},{"name":"max(a, b)","re":0.0,"im":-50.0,"error":1e-12},{"name":"efficiency","re":0.5,"im":0.0,"error":0.0}]}
        "#]].assert_eq(&String::from_utf8(out).unwrap());
    }
}
