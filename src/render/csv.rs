//! Results as CSV: full precision, ASCII units in the column names.

use crate::quantity::Dimension;
use crate::render::check::CheckPage;
use crate::render::compare::{self, ComparePage};
use crate::render::number::decibels;
use crate::render::{Form, Render, SolvedPage, Style, ascii_unit, unit_of};
use crate::study::{NodeResult, Solution, SweepHead, SweepRow, Value};
use num_complex::Complex64;

/// The CSV renderer.
pub struct Csv {
    style: Style,
    /// Dimension and realness of every reading of the sweep.
    readings: Vec<(Dimension, bool)>,
}

impl Csv {
    /// A renderer; digits do not matter to it.
    pub fn new(style: Style) -> Self {
        Csv { style, readings: Vec::new() }
    }

    /// The two columns of a complex value. A real one keeps its sign and has the angle zero.
    fn columns(&self, value: Complex64, dimension: Dimension, real: bool) -> [f64; 2] {
        match self.style.form {
            Form::Rect => [value.re, value.im],
            Form::Polar if real => [value.re, 0.0],
            Form::Polar => [value.norm(), value.arg().to_degrees()],
            Form::Decibel => {
                [decibels(value, dimension == Dimension::POWER), value.arg().to_degrees()]
            }
        }
    }
}

/// Appends a number with the fewest digits that read back to it.
fn number(value: f64, out: &mut Vec<u8>) {
    let mut buffer = zmij::Buffer::new();
    let text = buffer.format(value);
    out.extend_from_slice(text.strip_suffix(".0").unwrap_or(text).as_bytes());
}

fn number_text(value: f64) -> String {
    let mut out = Vec::new();
    number(value, &mut out);
    String::from_utf8(out).unwrap_or_default()
}

/// Appends one record, quoted where needed.
fn record<'a>(fields: impl IntoIterator<Item = &'a str>, out: &mut Vec<u8>) {
    // Writing to memory cannot fail.
    let mut writer = csv::WriterBuilder::new().from_writer(out);
    let _ = writer.write_record(fields);
    let _ = writer.flush();
}

fn column_names(name: &str, dimension: Dimension, real: bool, form: Form) -> [String; 2] {
    let unit = ascii_unit(&unit_of(dimension, real));
    let tail = if unit.is_empty() { unit } else { format!("_{unit}") };
    match form {
        Form::Polar => [format!("{name}{tail}"), format!("{name}_deg")],
        Form::Rect => [format!("{name}_re{tail}"), format!("{name}_im{tail}")],
        Form::Decibel => [format!("{name}_dB"), format!("{name}_deg")],
    }
}

/// The reading that gives the voltage of a node.
fn volts(node: &NodeResult) -> String {
    match node.reference.as_str() {
        "gnd" => format!("volts({})", node.name),
        reference => format!("volts({} to {reference})", node.name),
    }
}

/// One line of the long form.
struct Quantity {
    name: String,
    dimension: Dimension,
    unit: String,
    value: Option<Value>,
    /// Carries no error bound.
    bare: bool,
}

fn quantity(name: String, dimension: Dimension, real: bool, value: Option<Value>) -> Quantity {
    Quantity { name, dimension, unit: ascii_unit(&unit_of(dimension, real)), value, bare: false }
}

/// A value without a bound of its own.
fn bare(name: &str, dimension: Dimension, unit: &str, value: Complex64) -> Quantity {
    let value = Some(Value { value, error: 0.0 });
    Quantity { name: name.to_owned(), dimension, unit: unit.to_owned(), value, bare: true }
}

fn quantities(solution: &Solution) -> Vec<Quantity> {
    let (volt, ampere, power) = (Dimension::VOLTAGE, Dimension::CURRENT, Dimension::POWER);
    let mut list =
        vec![bare("frequency", Dimension::FREQUENCY, "Hz", solution.frequency_hz.into())];
    list.extend(solution.nodes.iter().map(|n| quantity(volts(n), volt, false, Some(n.voltage))));
    for element in &solution.elements {
        let name = &element.name;
        list.push(quantity(format!("drop({name})"), volt, false, element.drop));
        list.push(quantity(format!("amps({name})"), ampere, false, Some(element.current)));
        list.push(quantity(format!("power({name})"), power, false, Some(element.power)));
    }
    let readings = solution.readings.iter();
    list.extend(readings.map(|r| quantity(r.name.clone(), r.dimension, r.real, Some(r.value))));
    let balance = solution.balance;
    list.push(bare("delivered", power, "VA", balance.delivered));
    list.push(bare("absorbed", power, "VA", balance.absorbed));
    list.push(bare("mismatch", Dimension::NONE, "", balance.mismatch.into()));
    let energy = power.times(Dimension::TIME).unwrap_or_default();
    list.push(bare("magnetic_energy", energy, "J", solution.magnetic_energy_j.into()));
    list.push(bare("electric_energy", energy, "J", solution.electric_energy_j.into()));
    list
}

impl Render for Csv {
    fn solution(&mut self, page: &SolvedPage<'_>, out: &mut Vec<u8>) {
        let size = if self.style.form == Form::Decibel { "dB" } else { "magnitude" };
        record(["quantity", "unit", "re", "im", size, "deg", "error"], out);
        for quantity in quantities(page.solution) {
            let Quantity { name, dimension, unit, value, bare } = quantity;
            let Some(value) = value else {
                record([name.as_str(), unit.as_str(), "", "", "", "", ""], out);
                continue;
            };
            let Value { value, error } =
                self.style.shown(value, dimension, page.solution.frequency_hz);
            let size = match self.style.form {
                Form::Decibel => decibels(value, dimension == Dimension::POWER),
                _ => value.norm(),
            };
            let numbers = [value.re, value.im, size, value.arg().to_degrees()].map(number_text);
            let error = if bare { String::new() } else { number_text(error) };
            let texts = [name, unit].into_iter().chain(numbers).chain([error]);
            record(texts.collect::<Vec<_>>().iter().map(String::as_str), out);
        }
    }

    fn sweep_head(&mut self, head: &SweepHead, out: &mut Vec<u8>) {
        let varied = head.varied.iter().map(|(name, dimension)| {
            let [column, _] = column_names(name, *dimension, true, Form::Polar);
            column
        });
        let readings = head.readings.iter().flat_map(|(name, dimension, real)| {
            column_names(name, *dimension, *real, self.style.form)
        });
        let names: Vec<_> =
            std::iter::once("frequency_Hz".to_owned()).chain(varied).chain(readings).collect();
        record(names.iter().map(String::as_str), out);
        self.readings = head.readings.iter().map(|(_, d, real)| (*d, *real)).collect();
    }

    fn sweep_row(&mut self, row: &SweepRow, out: &mut Vec<u8>) {
        number(row.frequency_hz, out);
        for value in &row.varied {
            out.push(b',');
            number(*value, out);
        }
        for ((dimension, real), value) in self.readings.iter().zip(&row.values) {
            let value = self.style.shown(*value, *dimension, row.frequency_hz).value;
            for column in self.columns(value, *dimension, *real) {
                out.push(b',');
                // A row without a solution has empty cells.
                if !value.is_nan() {
                    number(column, out);
                }
            }
        }
        out.push(b'\n');
    }

    fn comparison(&mut self, page: &ComparePage<'_>, out: &mut Vec<u8>) {
        compare::csv(page, self.style, out);
    }

    fn check(&mut self, page: &CheckPage<'_>, out: &mut Vec<u8>) {
        record(["severity", "file", "line", "column", "message"], out);
        let data = page.as_data();
        for (severity, findings) in [("error", &data.errors), ("remark", &data.remarks)] {
            for found in findings {
                let place = |n: Option<usize>| n.map_or(String::new(), |n| n.to_string());
                let file = found.file.unwrap_or_default();
                let (line, column) = (place(found.line), place(found.column));
                record([severity, file, &line, &column, found.message], out);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use crate::render::{Form, Format, SolvedPage, Style, renderer, samples};
    use expect_test::{Expect, expect};

    #[track_caller]
    fn swept_as(form: Form, peak: bool, expected: Expect) {
        let (head, rows) = samples::sweep();
        let style = Style { form, peak, digits: 6, bounds: false };
        let (mut csv, mut out) = (renderer(Format::Csv, style), Vec::new());
        csv.sweep_head(&head, &mut out);
        rows.iter().for_each(|row| csv.sweep_row(row, &mut out));
        expected.assert_eq(&String::from_utf8(out).unwrap());
    }

    #[test]
    fn a_sweep_has_two_columns_a_reading() {
        swept_as(
            Form::Polar,
            false,
            expect![[r#"
            frequency_Hz,L_dock_H,out_V,out_deg,"max(a, b)_ohm","max(a, b)_deg",efficiency,efficiency_deg
            10000,0.00024,5,53.13010235415598,50,-90,0.5,0
            12345.5,0.00024,0.001,180,50,-90,0.5,0
        "#]],
        );
        swept_as(
            Form::Rect,
            false,
            expect![[r#"
            frequency_Hz,L_dock_H,out_re_V,out_im_V,"max(a, b)_re_ohm","max(a, b)_im_ohm",efficiency_re,efficiency_im
            10000,0.00024,3,4,0,-50,0.5,0
            12345.5,0.00024,-0.001,0,0,-50,0.5,0
        "#]],
        );
        swept_as(
            Form::Decibel,
            false,
            expect![[r#"
            frequency_Hz,L_dock_H,out_dB,out_deg,"max(a, b)_dB","max(a, b)_deg",efficiency_dB,efficiency_deg
            10000,0.00024,13.979400086720377,53.13010235415598,33.979400086720375,-90,-6.020599913279624,0
            12345.5,0.00024,-60,180,33.979400086720375,-90,-6.020599913279624,0
        "#]],
        );
    }

    #[test]
    fn amplitudes_scale_volts_and_no_ohms() {
        swept_as(
            Form::Rect,
            true,
            expect![[r#"
            frequency_Hz,L_dock_H,out_re_V,out_im_V,"max(a, b)_re_ohm","max(a, b)_im_ohm",efficiency_re,efficiency_im
            10000,0.00024,4.242640687119286,5.656854249492381,0,-50,0.5,0
            12345.5,0.00024,-0.0014142135623730952,0,0,-50,0.5,0
        "#]],
        );
    }

    #[test]
    fn a_solution_is_one_quantity_a_line() {
        let style = Style { form: Form::Polar, peak: false, digits: 6, bounds: false };
        let solution = samples::solution();
        let page = SolvedPage { circuit: "link.bfl", title: None, solution: &solution };
        let mut out = Vec::new();
        renderer(Format::Csv, style).solution(&page, &mut out);
        expect![[r#"
            quantity,unit,re,im,magnitude,deg,error
            frequency,Hz,85000,0,85000,0,
            volts(in),V,48,0,48,0,1e-14
            volts(a),V,3.5,-312,312.01963079267944,-89.35728584298766,0.04
            volts(bus to keel),V,24,-9,25.632011235952593,-20.556045219583467,1e-13
            drop(drive),V,-48,0,48,180,0
            amps(drive),A,1.25,-0.375,1.3050383136138188,-16.69924423399362,2e-15
            power(drive),VA,-60,-18,62.6418390534633,-163.3007557660064,1e-13
            drop(load),V,24,-9,25.632011235952593,-20.556045219583467,1e-13
            amps(load),A,2,-0.75,2.1360009363293826,-20.556045219583467,1e-14
            power(load),VA,54.75,0,54.75,0,4e-13
            drop(shield),V,,,,,
            amps(shield),A,0,0,0,0,0
            power(shield),VA,0,0,0,0,0
            bus_voltage,V,24,-9,25.632011235952593,-20.556045219583467,1e-13
            efficiency,,0.9125,0,0.9125,0,1e-14
            delivered,VA,60,18,62.6418390534633,16.69924423399362,
            absorbed,VA,60,18,62.6418390534633,16.69924423399362,
            mismatch,,1.5e-16,0,1.5e-16,0,
            magnetic_energy,J,0.001234,0,0.001234,0,
            electric_energy,J,0.0009,0,0.0009,0,
        "#]]
        .assert_eq(&String::from_utf8(out).unwrap());
    }
}
