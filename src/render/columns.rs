//! Columns side by side for a terminal of 80 columns, and the complex values in them.

use crate::render::number::{Bounded, Scale, Text, UNKNOWN, Widths, angle, engineering, level};
use crate::render::{Form, Style};
use crate::study::Value;
use comfy_table::{ColumnConstraint, ContentArrangement, LineStyle, TableStyle};
use unicode_width::UnicodeWidthStr;

/// Columns of a plain terminal.
pub const TERMINAL_COLUMNS: usize = 80;
/// Blanks before every line of a table.
const INDENT: &str = "  ";
/// A thin rule below the headings and nothing else.
const RULE: TableStyle =
    TableStyle::new().header_separator(LineStyle::none().fill('─').junction('─'));

/// The two texts of a complex value, the second empty where the value is real.
pub fn phasor(value: Value, unit: &str, real: bool, style: Style, scale: Scale) -> [Text; 2] {
    let Value { value: z, error } = value;
    let digits = style.digits;
    let part = |x| engineering(Bounded { value: x, error }, digits, unit, scale);
    match style.form {
        _ if real && style.form != Form::Decibel => [part(z.re), Text::default()],
        Form::Rect => {
            let mut imaginary = part(z.im);
            let (sign, whole) = match imaginary.whole.strip_prefix('-') {
                Some(whole) => ("-", whole),
                None => ("+", imaginary.whole.as_str()),
            };
            imaginary.whole = format!("{sign}j{whole}");
            [part(z.re), imaginary]
        }
        Form::Polar => {
            let size = Bounded::rounded_once(z.norm(), error);
            let magnitude = engineering(size, digits, unit, scale);
            let blank = magnitude.whole == UNKNOWN || magnitude.whole == "0";
            let angle = if blank { Text::default() } else { angle(z, error, digits) };
            [magnitude, angle]
        }
        Form::Decibel => {
            let level = level(z, error, digits, unit, matches!(unit, "W" | "VA"));
            let blank = real || level.whole == UNKNOWN || level.whole == "-inf";
            [level, if blank { Text::default() } else { angle(z, error, digits) }]
        }
    }
}

/// Lines up a column of numbers of two parts.
fn align(column: &[[Text; 2]]) -> Vec<String> {
    let first = Widths::of(column.iter().map(|[text, _]| text));
    let second = Widths::of(column.iter().map(|[_, text]| text));
    let has_second = second != Widths::default();
    let line = |[a, b]: &[Text; 2]| match has_second {
        true => format!("{}  {}", a.padded(first), b.padded(second)),
        false => a.padded(first),
    };
    column.iter().map(line).collect()
}

/// Blanks between two columns: the last of them stands for the line that is not drawn.
const GAP: usize = 3;

/// One column: its heading, its cells, and whether they are numbers, which are never wrapped.
#[derive(Clone)]
pub struct Column {
    heading: &'static str,
    cells: Vec<String>,
    numbers: bool,
}

/// Words longer than this lose their middle.
const LONGEST_WORDS: usize = 120;

/// A column of words.
pub fn words(heading: &'static str, cells: impl IntoIterator<Item = String>) -> Column {
    Column { heading, cells: cells.into_iter().map(shortened).collect(), numbers: false }
}

/// Nobody reads names of kilobytes, and breaking them into lines takes a time that grows with
/// their square.
fn shortened(text: String) -> String {
    let count = text.chars().count();
    if count <= LONGEST_WORDS {
        return text;
    }
    let half = LONGEST_WORDS / 2;
    let first = text.chars().take(half);
    first.chain(['…']).chain(text.chars().skip(count - half)).collect()
}

/// A column of complex values.
pub fn numbers(heading: &'static str, cells: impl IntoIterator<Item = [Text; 2]>) -> Column {
    let cells: Vec<_> = cells.into_iter().collect();
    Column { heading, cells: align(&cells), numbers: true }
}

impl Column {
    fn width(&self) -> usize {
        self.cells.iter().map(|cell| cell.width()).chain([self.heading.width()]).max().unwrap_or(0)
    }
}

/// True where columns stand side by side without wrapping any.
pub fn fits(columns: &[Column]) -> bool {
    let widths: usize = columns.iter().map(Column::width).sum();
    INDENT.len() + widths + GAP * columns.len().saturating_sub(1) <= TERMINAL_COLUMNS
}

/// Draws columns below each other, as many side by side as fit, with the first one in front of
/// each lot.
pub fn draw_in_lots(mut columns: Vec<Column>, text: &mut String) {
    if columns.is_empty() {
        return;
    }
    let first = columns.remove(0);
    let mut lot = vec![first.clone()];
    for column in columns {
        lot.push(column);
        if lot.len() > 2 && !fits(&lot) {
            let next = lot.pop();
            draw(std::mem::replace(&mut lot, vec![first.clone()]), text);
            lot.extend(next);
        }
    }
    draw(lot, text);
}

/// Draws columns side by side; words wrap where there is no room.
pub fn draw(columns: Vec<Column>, text: &mut String) {
    let mut table = comfy_table::Table::new();
    table.load_style(RULE).set_content_arrangement(ContentArrangement::Dynamic);
    table.set_width((TERMINAL_COLUMNS - INDENT.len()) as u16);
    table.set_header(columns.iter().map(|c| c.heading).collect::<Vec<_>>());
    let whole = fits(&columns);
    let rows = columns.first().map_or(0, |c| c.cells.len());
    for i in 0..rows {
        table.add_row(columns.iter().map(|c| c.cells[i].as_str()).collect::<Vec<_>>());
    }
    for (i, column) in columns.iter().enumerate() {
        let last = i + 1 == columns.len();
        if let Some(drawn) = table.column_mut(i) {
            drawn.set_padding((0, if last { 0 } else { GAP as u16 - 1 }));
            if column.numbers || whole {
                drawn.set_constraint(ColumnConstraint::ContentWidth);
            }
        }
    }
    for line in table.lines() {
        text.push_str(format!("{INDENT}{line}").trim_end());
        text.push('\n');
    }
    text.push('\n');
}
