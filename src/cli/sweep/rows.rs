//! Takes the rows of a sweep as they are computed and passes them on.

use crate::cli::output::RowWriter;
use crate::cli::report::{self, Ending, Stop};
use crate::diag::Diagnostic;
use crate::quantity::Dimension;
use crate::render::Render;
use crate::render::number::exact;
use crate::source::Sources;
use crate::study::adaptive::Resonance;
use crate::study::point::caution;
use crate::study::sweep::{Event, Tally};
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
    /// Names and dimensions of the varied parameters.
    varied: Vec<(String, Dimension)>,
    /// Rows without a solution, and why for the first of them.
    unsolved: usize,
    why: Vec<Diagnostic>,
    /// Resonances found, and the first of them in words.
    resonances: usize,
    resonant: Vec<String>,
    /// Where a refined sweep had to stop.
    full: Option<usize>,
    /// Say how frequencies were solved, and for each circuit how.
    verbose: bool,
    tallies: Vec<Tally>,
}

/// Frequencies without a solution that are explained one by one.
const MOST_EXPLAINED: usize = 3;

/// Resonances that are named one by one.
const MOST_NAMED: usize = 20;

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
    pub fn new(renderer: Box<dyn Render>, say_peak: bool, verbose: bool) -> Self {
        Rows {
            renderer,
            writer: RowWriter::stdout(),
            failure: None,
            bar: progress(),
            say_peak,
            count: 0,
            missed: Vec::new(),
            highest_volts: [0.0; 2],
            varied: Vec::new(),
            unsolved: 0,
            why: Vec::new(),
            resonances: 0,
            resonant: Vec::new(),
            full: None,
            verbose,
            tallies: Vec::new(),
        }
    }

    /// Takes what the sweep delivers; breaks where it cannot be written.
    pub fn take(&mut self, event: Event) -> ControlFlow<()> {
        let written = match event {
            Event::Head(head) => self.head(head),
            Event::Row(row) => self.row(row),
            Event::Unsolved { why, .. } => {
                self.unsolved += 1;
                if self.unsolved <= MOST_EXPLAINED {
                    self.why.extend_from_slice(why);
                }
                Ok(())
            }
            Event::Resonance(resonance) => {
                self.resonance(resonance);
                Ok(())
            }
            Event::Tally(tally) => {
                if self.verbose {
                    self.tallies.push(*tally);
                }
                Ok(())
            }
            Event::Full { rows } => {
                self.full = Some(rows);
                Ok(())
            }
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
        match head.rows {
            0 => self.bar.unset_length(),
            rows => self.bar.set_length(rows as u64),
        }
        self.varied.clone_from(&head.varied);
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

    fn resonance(&mut self, resonance: &Resonance) {
        self.resonances += 1;
        if self.resonances > MOST_NAMED {
            return;
        }
        let mut words = format!("resonance at {}", exact(resonance.frequency_hz, 12, "Hz").flat());
        match resonance.q.is_finite() {
            true => words.push_str(&format!(", Q = {}", exact(resonance.q, 4, "").flat())),
            false => words
                .push_str(" without loss: the nearer to it, the larger the readings, without end"),
        }
        for ((name, dimension), value) in self.varied.iter().zip(&resonance.varied) {
            let value = exact(*value, 9, &dimension.to_string()).flat();
            words.push_str(&format!(", {name} = {value}"));
        }
        self.resonant.push(words);
    }

    /// What a refined sweep came upon.
    fn say_refined(&self) {
        self.resonant.iter().for_each(|words| report::note(words));
        if self.resonances > MOST_NAMED {
            report::note(&format!("and {} more resonances", self.resonances - MOST_NAMED));
        }
        if let Some(rows) = self.full {
            report::note(&format!(
                "stopped at {rows} rows: between some of them a line is not within the tolerance; \
                 `--most` allows more"
            ));
        }
    }

    /// The frequencies that have no solution.
    fn say_unsolved(&self, sources: &Sources) {
        report::diagnostics(&self.why, sources);
        if self.unsolved > MOST_EXPLAINED {
            let more = self.unsolved - MOST_EXPLAINED;
            report::note(&format!("{more} more frequencies have no solution either"));
        }
        report::note(&match self.unsolved {
            1 => "the row of this frequency has no values".to_owned(),
            rows => format!("the rows of these {rows} frequencies have no values"),
        });
    }

    /// Passes on what is left, and says beside the output which limits were missed and where there
    /// is no solution.
    pub fn finish(mut self, sources: &Sources) -> Result<Ending, Stop> {
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
        self.say_refined();
        self.tallies.iter().for_each(|tally| report::note(&how(tally)));
        if self.unsolved > 0 {
            ending = Ending::Unsolvable;
            self.say_unsolved(sources);
        }
        Ok(ending)
    }
}

/// How the frequencies of one circuit were solved, in words.
fn how(tally: &Tally) -> String {
    let shape = match tally.symmetric {
        true => "symmetric plan of fronts",
        false => "plan of rows",
    };
    format!(
        "{shape}, {} multiply-adds a frequency; {} frequencies at once on {} threads; {} solved in \
         lanes and corrected in twice the precision, {} alone with fresh pivots",
        tally.work, tally.lanes, tally.threads, tally.in_lanes, tally.alone
    )
}
