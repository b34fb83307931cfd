//! Data files: measured tables and lists of couplings, as CSV with one header line.

use crate::circuit::Table;
use crate::circuit::error::CircuitError;
use crate::source::{SourceId, Sources, Span};
use num_complex::Complex64;

/// One row of a list of couplings.
pub(crate) struct CouplingRow {
    pub first: String,
    pub second: String,
    /// In henries.
    pub mutual: f64,
    pub span: Span,
}

/// Reads measured data: columns `x, value` or `x, real part, imaginary part`, x strictly
/// increasing.
pub(crate) fn read(source: SourceId, sources: &Sources, file: &str) -> Result<Table, CircuitError> {
    let mut points: Vec<(f64, Complex64)> = Vec::new();
    for row in rows(source, sources) {
        let (record, span) = row?;
        let bad = |problem: &str| CircuitError::BadData { problem: problem.into(), span };
        if !(2..=3).contains(&record.len()) {
            return Err(bad("a row of a table has 2 columns (x, value) or 3 (x, real, imaginary)"));
        }
        let number = |i: usize| match record.get(i).map(str::parse::<f64>) {
            Some(Ok(value)) if value.is_finite() => Ok(value),
            None => Ok(0.0),
            _ => Err(bad("this is no finite number")),
        };
        let (x, value) = (number(0)?, Complex64::new(number(1)?, number(2)?));
        if points.last().is_some_and(|(last, _)| *last >= x) {
            return Err(bad("the first column must increase from row to row"));
        }
        points.push((x, value));
    }
    if points.is_empty() {
        let problem = "a table needs a header line and at least one row of numbers".into();
        return Err(CircuitError::BadData { problem, span: Span::new(source, 0, 0) });
    }
    Ok(Table { file: file.to_owned(), points })
}

/// Reads a list of couplings: columns `a, b, M`, M in henries.
pub(crate) fn read_couplings(
    source: SourceId,
    sources: &Sources,
) -> Result<Vec<CouplingRow>, CircuitError> {
    let mut list = Vec::new();
    for row in rows(source, sources) {
        let (record, span) = row?;
        let bad = |problem: &str| CircuitError::BadData { problem: problem.into(), span };
        if record.len() != 3 {
            return Err(bad("a row of a list of couplings has 3 columns: a, b, M in henries"));
        }
        let mutual = match record[2].parse::<f64>() {
            Ok(value) if value.is_finite() => value,
            _ => return Err(bad("M must be a finite number of henries, without a unit")),
        };
        let (first, second) = (record[0].to_owned(), record[1].to_owned());
        list.push(CouplingRow { first, second, mutual, span });
    }
    Ok(list)
}

/// The rows after the header line, each with its place; `#` starts a comment.
fn rows(
    source: SourceId,
    sources: &Sources,
) -> impl Iterator<Item = Result<(csv::StringRecord, Span), CircuitError>> {
    let text = &sources.get(source).text;
    let mut reader = csv::ReaderBuilder::new()
        .flexible(true)
        .trim(csv::Trim::All)
        .comment(Some(b'#'))
        .from_reader(text.as_bytes());
    let mut record = csv::StringRecord::new();
    std::iter::from_fn(move || {
        let start = reader.position().byte() as usize;
        let read = reader.read_record(&mut record);
        let end = reader.position().byte() as usize;
        // The reader's position may lie before the row: in front of the header, blank lines or
        // comments. The row is the last line of what was read.
        let whole = text.get(start..end).unwrap_or("").trim_end();
        let from = whole.rfind('\n').map_or(0, |i| i + 1);
        let span = Span::new(source, (start + from).min(text.len()), start + whole.len());
        match read {
            Ok(true) => Some(Ok((record.clone(), span))),
            Ok(false) => None,
            Err(error) => {
                let problem = error.to_string();
                Some(Err(CircuitError::BadData { problem, span }))
            }
        }
    })
}
