//! How a command ends: diagnostics and notes on standard error, and the exit code.

use crate::diag::Diagnostic;
use crate::render::columns::TERMINAL_COLUMNS;
use crate::source::Sources;
use crate::study::StudyError;
use std::io::{self, IsTerminal, Write};
use std::process::ExitCode;
use unicode_width::UnicodeWidthStr;

/// Diagnostics drawn in one run. Nobody reads more before mending something.
const MOST_SHOWN: usize = 40;

/// A command that ran to its end.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ending {
    /// Nothing to complain about: exit code 0.
    Done,
    /// A reading missed a limit: exit code 1.
    LimitMissed,
    /// Two circuits are not the same: exit code 1.
    Different,
    /// All was said in the output, and the circuit is wrong: exit code 2.
    Refused,
    /// All was said in the output, and the circuit has no solution: exit code 3.
    Unsolvable,
}

/// Why a command could not run to its end.
#[derive(Debug)]
pub enum Stop {
    /// The circuit or the call is wrong: exit code 2.
    Wrong(Vec<Diagnostic>, Sources),
    /// No solution could be trusted: exit code 3.
    NoSolution(Vec<Diagnostic>, Sources),
    /// The output could not be written. A closed pipe is no failure: exit code 0.
    Output(io::Error),
}

impl Stop {
    /// One thing wrong with the call.
    pub fn wrong(diagnostic: Diagnostic) -> Self {
        Stop::Wrong(vec![diagnostic], Sources::default())
    }

    /// What kept a study from its result.
    pub fn study(error: StudyError, sources: &Sources) -> Self {
        match error {
            StudyError::Refused(found) => Stop::Wrong(found, sources.clone()),
            StudyError::NoSolution(found) => Stop::NoSolution(found, sources.clone()),
        }
    }
}

impl From<io::Error> for Stop {
    fn from(error: io::Error) -> Self {
        Stop::Output(error)
    }
}

/// Turns the end of a command into words on standard error and an exit code.
pub fn finish(outcome: Result<Ending, Stop>) -> ExitCode {
    let code = match outcome {
        Ok(Ending::Done) => 0,
        Ok(Ending::LimitMissed | Ending::Different) => 1,
        Ok(Ending::Refused) => 2,
        Ok(Ending::Unsolvable) => 3,
        Err(Stop::Wrong(found, sources)) => {
            diagnostics(&found, &sources);
            2
        }
        Err(Stop::NoSolution(found, sources)) => {
            diagnostics(&found, &sources);
            3
        }
        Err(Stop::Output(error)) if error.kind() == io::ErrorKind::BrokenPipe => 0,
        Err(Stop::Output(error)) => {
            say(&format!("error: cannot write the output: {error}"));
            2
        }
    };
    ExitCode::from(code)
}

/// Prints what clap has to say: help on standard output, usage errors on standard error.
pub fn usage(error: &clap::Error) -> ExitCode {
    // A closed pipe is no failure here either.
    let _ = error.print();
    ExitCode::from(if error.use_stderr() { 2 } else { 0 })
}

/// Draws diagnostics on standard error, coloured where somebody looks at it.
pub fn diagnostics(found: &[Diagnostic], sources: &Sources) {
    let colour = io::stderr().is_terminal()
        && std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty());
    for diagnostic in found.iter().take(MOST_SHOWN) {
        say(diagnostic.render(sources, colour).trim_end());
    }
    if found.len() > MOST_SHOWN {
        say(&format!("… and {} more; mend these first", found.len() - MOST_SHOWN));
    }
}

/// One line for the reader beside the output; several at a terminal, which would break words.
pub fn note(text: &str) {
    let line = format!("note: {text}");
    match io::stderr().is_terminal() {
        true => say(&wrapped(&line)),
        false => say(&line),
    }
}

/// A text in lines of a plain terminal, all but the first indented.
fn wrapped(text: &str) -> String {
    let (mut out, mut used) = (String::new(), 0);
    for word in text.split(' ') {
        if used > 0 && used + 1 + word.width() > TERMINAL_COLUMNS {
            out.push_str("\n     ");
            used = 5;
        }
        if used > 0 {
            out.push(' ');
            used += 1;
        }
        out.push_str(word);
        used += word.width();
    }
    out
}

/// A limit that was missed.
pub fn missed(text: &str) {
    say(&format!("limit missed: {text}"));
}

fn say(text: &str) {
    // Nowhere is left to complain if standard error is closed.
    let _ = writeln!(io::stderr().lock(), "{text}");
}

#[cfg(test)]
mod tests {
    use crate::cli::report::wrapped;

    #[test]
    fn a_long_note_breaks_between_words_and_loses_none() {
        let text = format!("note: {}", "local electrical codes ".repeat(9)) + "decide";
        let lines = wrapped(&text);
        assert!(lines.lines().count() > 2 && lines.lines().all(|line| line.len() <= 80), "{lines}");
        let words = |text: &str| text.split_whitespace().map(str::to_owned).collect::<Vec<_>>();
        assert_eq!(words(&lines), words(&text));
        assert_eq!(wrapped("note: short"), "note: short");
    }
}
