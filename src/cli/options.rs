//! Options every command takes: what was typed, and what it means.

use crate::circuit::program::{Call, Program};
use crate::cli::input::{self, Text};
use crate::cli::report::Stop;
use crate::diag::{Diagnostic, Severity};
use crate::quantity::Dimension;
use crate::render::{Form, Format, Style};
use clap::{Args, ValueEnum};
use std::path::PathBuf;

/// What was typed.
#[derive(Args, Debug)]
pub struct CommonArgs {
    /// The circuit; `-` is standard input
    #[arg(value_name = "FILE")]
    pub file: PathBuf,
    /// Give a `let` of the circuit another value, as in `--set k=0.2`
    #[arg(long, value_name = "NAME=VALUE", value_parser = assignment, allow_hyphen_values = true)]
    set: Vec<(String, String)>,
    /// One more reading, as in `--read "volts(bus)"` or `--read "loss=re(power(r))"`
    #[arg(long, value_name = "EXPR", value_parser = typed_value, allow_hyphen_values = true)]
    read: Vec<String>,
    /// What the output is for: people, spreadsheets or programs
    #[arg(long = "as", value_name = "FORMAT")]
    format: Option<TypedFormat>,
    /// How complex values are shown
    #[arg(long, default_value = "polar")]
    form: TypedForm,
    /// Show volts and amperes as amplitudes instead of rms values
    #[arg(long)]
    peak: bool,
    /// Most significant digits in tables; fewer where fewer are right
    #[arg(long, value_name = "N", default_value_t = 6,
          value_parser = clap::value_parser!(u8).range(1..=17))]
    digits: u8,
    /// Show in the table of `solve` how far each voltage and reading may be off (±)
    #[arg(long)]
    bounds: bool,
}

#[derive(Clone, Copy, Debug, ValueEnum)]
enum TypedFormat {
    /// Columns for a terminal
    Table,
    /// Comma-separated values, full precision
    Csv,
    /// JSON, full precision
    Json,
}

#[derive(Clone, Copy, Debug, ValueEnum)]
enum TypedForm {
    /// Magnitude and angle in degrees
    Polar,
    /// Real and imaginary part
    Rect,
    /// Decibels against one unit (10·log10 of powers, 20·log10 of the rest) and angle
    #[value(name = "dB", alias = "db")]
    Decibel,
}

/// Takes any text but another option.
pub fn typed_value(text: &str) -> Result<String, String> {
    match text.starts_with("--") {
        true => Err(format!("a value is missing before `{text}`")),
        false => Ok(text.to_owned()),
    }
}

/// Takes `name=value`.
pub fn assignment(text: &str) -> Result<(String, String), String> {
    let parts = text.split_once('=').map(|(name, value)| (name.trim(), value.trim()));
    match parts {
        Some((name, value)) if !name.is_empty() && !value.is_empty() => {
            Ok((name.to_owned(), value.to_owned()))
        }
        _ => Err("write name=value, as in k=0.2".to_owned()),
    }
}

/// What the common options mean.
pub struct Common {
    /// The circuit's text, parsed.
    pub program: Program,
    /// The file name, without folders.
    pub circuit_name: String,
    /// Number style.
    pub style: Style,
    /// The format asked for, if any.
    pub format: Option<Format>,
    /// Names given with `--set`.
    pub set_names: Vec<String>,
}

impl CommonArgs {
    /// The format asked for.
    pub fn format(&self) -> Option<Format> {
        self.format.map(|format| match format {
            TypedFormat::Table => Format::Table,
            TypedFormat::Csv => Format::Csv,
            TypedFormat::Json => Format::Json,
        })
    }

    /// The number style asked for.
    pub fn style(&self) -> Style {
        let form = match self.form {
            TypedForm::Polar => Form::Polar,
            TypedForm::Rect => Form::Rect,
            TypedForm::Decibel => Form::Decibel,
        };
        Style { form, peak: self.peak, digits: usize::from(self.digits), bounds: self.bounds }
    }

    /// Reads and parses the file with what it includes; the diagnostics are returned beside it.
    pub fn parse(&self) -> Result<(Program, String, Vec<Diagnostic>), Stop> {
        let Text { name, text, folder } = input::read(&self.file).map_err(Stop::wrong)?;
        let call = Call { set: self.set.clone(), reads: self.read.clone() };
        let (program, found) = Program::load(&name, text, &folder, &call, &input::load);
        Ok((program, input::short_name(&self.file), found))
    }

    /// Reads and parses the file; any error ends the command.
    pub fn open(&self) -> Result<Common, Stop> {
        let (program, circuit_name, found) = self.parse()?;
        if found.iter().any(|d| d.severity == Severity::Error) {
            return Err(Stop::Wrong(found, program.sources));
        }
        Ok(Common {
            program,
            circuit_name,
            style: self.style(),
            format: self.format(),
            set_names: self.set.iter().map(|(name, _)| name.clone()).collect(),
        })
    }
}

impl Common {
    /// A diagnostic of the call as the end of the command.
    pub fn stop(&self, diagnostic: Diagnostic) -> Stop {
        Stop::Wrong(vec![diagnostic], self.program.sources.clone())
    }

    /// A frequency in hertz, as typed after an option.
    pub fn frequency(&mut self, option: &str, text: &str) -> Result<f64, Stop> {
        let (value, dimension) =
            self.program.constant(option, text).map_err(|wrong| self.stop(wrong))?;
        if dimension == Dimension::FREQUENCY {
            return Ok(value);
        }
        let found = match dimension.to_string() {
            unit if unit.is_empty() => "a plain number".to_owned(),
            unit => format!("in {unit}"),
        };
        let wrong = Diagnostic::error(format!("`{option}` takes a frequency; `{text}` is {found}"));
        Err(self.stop(wrong.help(format!("give it in hertz, as in `{option} 85kHz`"))))
    }
}
