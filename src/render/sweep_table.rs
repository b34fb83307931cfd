//! A sweep as a table whose rows are written as they come, in columns of fixed width. Columns
//! that a terminal has no room for go on in further lines of the same row.

use crate::quantity::Dimension;
use crate::render::columns::{TERMINAL_COLUMNS, phasor};
use crate::render::number::{Widths, exact};
use crate::render::{Form, Style, unit_of};
use crate::study::{SweepHead, SweepRow};
use unicode_width::UnicodeWidthStr;

/// Blanks between columns.
const GAP: &str = "  ";

/// One column of the table, of one or two numbers.
struct Column {
    name: String,
    first: Widths,
    second: Widths,
    width: usize,
}

/// Widths chosen from the heading, so that rows need not be kept.
pub struct SweepTable {
    style: Style,
    columns: Vec<Column>,
    varied: Vec<Dimension>,
    readings: Vec<(String, Dimension, bool)>,
}

/// Room for a number with a prefix, or a plain one with its zeros or its power of ten.
fn room(unit: &str, digits: usize, signed: bool) -> Widths {
    let whole = if signed { 4 } else { 3 };
    match unit.chars().all(char::is_alphabetic) && !unit.is_empty() {
        true => Widths { whole, fraction: digits, unit: unit.width() + 1 },
        false => Widths { whole, fraction: digits + 4, unit: unit.width() },
    }
}

fn column(name: String, first: Widths, second: Widths) -> Column {
    let part = |w: Widths| w.whole + w.fraction + w.unit + usize::from(w.unit > 1);
    let numbers = match second == Widths::default() {
        true => part(first),
        false => part(first) + GAP.len() + part(second),
    };
    let width = numbers.max(name.width());
    Column { name, first, second, width }
}

impl SweepTable {
    /// A table without columns; [`SweepTable::head`] makes them.
    pub fn new(style: Style) -> Self {
        SweepTable { style, columns: Vec::new(), varied: Vec::new(), readings: Vec::new() }
    }

    /// Digits of frequencies and parameters, which are exact.
    fn exact_digits(&self) -> usize {
        (self.style.digits + 3).min(17)
    }

    fn reading_column(&self, name: &str, dimension: Dimension, real: bool) -> Column {
        let digits = self.style.digits;
        let unit = unit_of(dimension, real);
        let places = digits.saturating_sub(4).clamp(1, 13) + 1;
        let angle = Widths { whole: 4, fraction: places, unit: 1 };
        let (first, second) = match self.style.form {
            Form::Decibel => {
                let level = Widths { whole: 4, fraction: places, unit: unit.width() + 2 };
                (level, if real { Widths::default() } else { angle })
            }
            _ if real => (room(&unit, digits, true), Widths::default()),
            Form::Polar => (room(&unit, digits, false), angle),
            Form::Rect => {
                let room = room(&unit, digits, true);
                (room, Widths { whole: room.whole + 1, ..room })
            }
        };
        column(name.to_owned(), first, second)
    }

    /// Chooses the columns and appends the heading.
    pub fn head(&mut self, head: &SweepHead, out: &mut Vec<u8>) {
        let none = Widths::default();
        let exact = self.exact_digits();
        self.columns = vec![column("frequency".to_owned(), room("Hz", exact, false), none)];
        for (name, dimension) in &head.varied {
            let room = room(&dimension.to_string(), exact, true);
            self.columns.push(column(name.clone(), room, none));
        }
        for (name, dimension, real) in &head.readings {
            let column = self.reading_column(name, *dimension, *real);
            self.columns.push(column);
        }
        self.varied = head.varied.iter().map(|(_, dimension)| *dimension).collect();
        self.readings = head.readings.clone();
        let names = self.columns.iter().map(|c| c.name.clone()).collect::<Vec<_>>();
        let rules = self.columns.iter().map(|c| "─".repeat(c.width)).collect::<Vec<_>>();
        let names = self.fold(&names, &[]);
        out.extend_from_slice(names.as_bytes());
        // One line of rules serves a folded heading too: that of the first line.
        let rules = self.fold(&rules, &[]);
        out.extend_from_slice(rules.lines().next().unwrap_or_default().as_bytes());
        out.push(b'\n');
    }

    /// The lines of one row: what does not fit goes on below the first reading.
    fn fold(&self, cells: &[String], tail: &[String]) -> String {
        let known = 1 + self.varied.len();
        let start = self.columns.iter().take(known).map(|c| c.width + GAP.len()).sum::<usize>();
        let (mut lines, mut line, mut used) = (String::new(), String::new(), 0);
        let mut put = |text: &str, width: usize, is_known: bool| {
            if !is_known && used > start && used + width > TERMINAL_COLUMNS {
                lines.push_str(line.trim_end());
                lines.push('\n');
                line = " ".repeat(start);
                used = start;
            }
            line.push_str(&pad(text, width));
            line.push_str(GAP);
            used += width + GAP.len();
        };
        for (i, (column, cell)) in self.columns.iter().zip(cells).enumerate() {
            put(cell, column.width, i < known);
        }
        tail.iter().for_each(|text| put(text, text.width(), false));
        lines + line.trim_end() + "\n"
    }

    /// Appends one row, with the limits it missed at its end.
    pub fn row(&mut self, row: &SweepRow, out: &mut Vec<u8>) {
        let digits = self.exact_digits();
        let mut known = vec![exact(row.frequency_hz, digits, "Hz")];
        for (dimension, value) in self.varied.iter().zip(&row.varied) {
            known.push(exact(*value, digits, &dimension.to_string()));
        }
        let mut cells = Vec::new();
        for ((_, dimension, real), value) in self.readings.iter().zip(&row.values) {
            let shown = self.style.shown(*value, *dimension, row.frequency_hz);
            cells.push(phasor(shown, &unit_of(*dimension, *real), *real, self.style, None));
        }
        let glued = self.columns.iter().zip(&known).map(|(column, text)| text.glued(column.first));
        let mut texts: Vec<_> = glued.collect();
        for (column, [first, second]) in self.columns[known.len()..].iter().zip(&cells) {
            let cell = match column.second == Widths::default() {
                true => first.padded(column.first),
                false => {
                    format!("{}{GAP}{}", first.padded(column.first), second.padded(column.second))
                }
            };
            texts.push(cell);
        }
        let missed = self.readings.iter().zip(&row.missed).filter(|(_, missed)| **missed);
        let missed: Vec<_> = missed.map(|((name, _, _), _)| name.as_str()).collect();
        let tail = missed.iter().enumerate().map(|(i, name)| {
            let word = if i == 0 { "MISSED: " } else { "" };
            let comma = if i + 1 < missed.len() { "," } else { "" };
            format!("{word}{name}{comma}")
        });
        let tail: Vec<_> = tail.collect();
        out.extend_from_slice(self.fold(&texts, &tail).as_bytes());
    }
}

/// Blanks at the end up to a width on the screen.
fn pad(text: &str, width: usize) -> String {
    format!("{text}{}", " ".repeat(width.saturating_sub(text.width())))
}

#[cfg(test)]
mod tests {
    use crate::render::{Form, Format, Style, renderer, samples};
    use expect_test::{Expect, expect};

    #[track_caller]
    fn swept_as(form: Form, expected: Expect) {
        let (head, rows) = samples::sweep();
        let style = Style { form, peak: false, digits: 6, bounds: false };
        let (mut table, mut out) = (renderer(Format::Table, style), Vec::new());
        table.sweep_head(&head, &mut out);
        rows.iter().for_each(|row| table.sweep_row(row, &mut out));
        expected.assert_eq(&String::from_utf8(out).unwrap());
    }

    #[test]
    fn rows_stand_below_their_headings() {
        swept_as(
            Form::Polar,
            expect![[r#"
                frequency         L_dock            out
                                                    max(a, b)               efficiency
                ────────────────  ────────────────  ──────────────────────
                 10 kHz            240 µH             5.00000  V    53.13°
                                                     50.0000   Ω   -90.00°     0.500000
                 12.3455 kHz       240 µH             1.000   mV   180.0°
                                                     50.0000   Ω   -90.00°     0.500000
                                                    MISSED: efficiency
            "#]],
        );
        swept_as(
            Form::Rect,
            expect![[r#"
                frequency         L_dock            out
                                                    max(a, b)
                                                    efficiency
                ────────────────  ────────────────  ─────────────────────────────
                 10 kHz            240 µH              3.00000  V    +j4.00000  V
                                                       0        Ω   -j50.0000   Ω
                                                       0.500000
                 12.3455 kHz       240 µH             -1.000   mV    +j0        V
                                                       0        Ω   -j50.0000   Ω
                                                       0.500000     MISSED: efficiency
            "#]],
        );
        swept_as(
            Form::Decibel,
            expect![[r#"
                frequency         L_dock            out                    max(a, b)
                                                    efficiency
                ────────────────  ────────────────  ─────────────────────  ─────────────────────
                 10 kHz            240 µH             13.98 dBV    53.13°    33.98 dBΩ   -90.00°
                                                      -6.02 dB
                 12.3455 kHz       240 µH            -60.00 dBV   180.0°     33.98 dBΩ   -90.00°
                                                      -6.02 dB  MISSED: efficiency
            "#]],
        );
    }
}
