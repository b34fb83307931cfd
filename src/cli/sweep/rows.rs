//! Takes the rows of a sweep as they are computed and passes them on.

use crate::cli::output::RowWriter;
use crate::cli::report::{self, Ending, Stop};
use crate::render::Render;
use crate::render::number::exact;
use crate::study::point::caution;
use crate::study::sweep::Event;
use crate::study::{SweepHead, SweepRow};
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::io::{self, IsTerminal, StdoutLock};
use std::ops::ControlFlow;

/// How often one reading missed its limits.
struct Missed {
    name: String,
    rows: usize,
    first_hz: f64,
}

/// Rows on their way to standard output.
pub struct Rows {
    renderer: Box<dyn Render>,
    writer: RowWriter<StdoutLock<'static>>,
    failure: Option<io::Error>,
    bar: ProgressBar,
    say_peak: bool,
    count: usize,
    missed: Vec<Missed>,
    /// The highest voltages seen, at 0 Hz and above.
    highest_volts: [f64; 2],
}

/// A bar on standard error, where somebody sees it and the rows do not.
fn progress() -> ProgressBar {
    let seen = io::stderr().is_terminal() && !io::stdout().is_terminal();
    let target = if seen { ProgressDrawTarget::stderr() } else { ProgressDrawTarget::hidden() };
    let style = ProgressStyle::with_template("{bar:40} {pos} of {len} rows, {eta} left");
    let bar = ProgressBar::with_draw_target(None, target);
    match style {
        Ok(style) => bar.with_style(style),
        Err(_) => bar,
    }
}

impl Rows {
    /// Rows drawn by `renderer`; `say_peak` where the output itself cannot say that it shows
    /// amplitudes.
    pub fn new(renderer: Box<dyn Render>, say_peak: bool) -> Self {
        Rows {
            renderer,
            writer: RowWriter::stdout(),
            failure: None,
            bar: progress(),
            say_peak,
            count: 0,
            missed: Vec::new(),
            highest_volts: [0.0; 2],
        }
    }

    /// Takes what the sweep delivers; breaks where it cannot be written.
    pub fn take(&mut self, event: Event) -> ControlFlow<()> {
        let written = match event {
            Event::Head(head) => self.head(head),
            Event::Row(row) => self.row(row),
        };
        match written {
            Ok(()) => ControlFlow::Continue(()),
            Err(error) => {
                self.failure = Some(error);
                ControlFlow::Break(())
            }
        }
    }

    fn head(&mut self, head: &SweepHead) -> io::Result<()> {
        self.bar.set_length(head.rows as u64);
        let missed =
            |(name, _, _): &(String, _, _)| Missed { name: name.clone(), rows: 0, first_hz: 0.0 };
        self.missed = head.readings.iter().map(missed).collect();
        self.renderer.sweep_head(head, &mut self.writer.pending);
        self.writer.flush()
    }

    fn row(&mut self, row: &SweepRow) -> io::Result<()> {
        self.count += 1;
        let highest = &mut self.highest_volts[usize::from(row.frequency_hz > 0.0)];
        *highest = highest.max(row.highest_volts);
        for (missed, _) in self.missed.iter_mut().zip(&row.missed).filter(|(_, now)| **now) {
            if missed.rows == 0 {
                missed.first_hz = row.frequency_hz;
            }
            missed.rows += 1;
        }
        self.renderer.sweep_row(row, &mut self.writer.pending);
        if self.writer.row_done()? {
            self.bar.set_position(self.count as u64);
        }
        Ok(())
    }

    /// Passes on what is left, and says beside the output which limits were missed.
    pub fn finish(mut self) -> Result<Ending, Stop> {
        self.bar.finish_and_clear();
        if let Some(error) = self.failure.take() {
            return Err(error.into());
        }
        self.writer.flush()?;
        if self.say_peak {
            report::note("volts and amperes are amplitudes (peak); powers are means");
        }
        let [direct, alternating] = self.highest_volts;
        for text in [caution(direct, 0.0), caution(alternating, 1.0)].into_iter().flatten() {
            report::note(&text);
        }
        let mut ending = Ending::Done;
        for missed in self.missed.iter().filter(|missed| missed.rows > 0) {
            ending = Ending::LimitMissed;
            let first = exact(missed.first_hz, 9, "Hz").flat();
            let Missed { name, rows, .. } = missed;
            report::missed(&format!("{name} in {rows} of {} rows, first at {first}", self.count));
        }
        Ok(ending)
    }
}
