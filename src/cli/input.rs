//! Reads circuit texts, with errors that name the file and the place.

use crate::diag::Diagnostic;
use std::fs::File;
use std::io::{self, Read};
use std::path::{Path, PathBuf};

/// A circuit text longer than this (64 MiB) is taken for a mistake.
const MOST_BYTES: u64 = 64 << 20;

/// A circuit's text and where it came from.
#[derive(Debug)]
pub struct Text {
    /// What messages call it.
    pub name: String,
    /// The text.
    pub text: String,
    /// Where the paths in it start.
    pub folder: PathBuf,
}

fn is_standard_input(file: &Path) -> bool {
    file == Path::new("-")
}

/// The file's name without its folders.
pub fn short_name(file: &Path) -> String {
    match file.file_name() {
        _ if is_standard_input(file) => "<stdin>".to_owned(),
        Some(name) => name.to_string_lossy().into_owned(),
        None => file.display().to_string(),
    }
}

fn limited(source: impl Read) -> io::Result<Vec<u8>> {
    let mut bytes = Vec::new();
    source.take(MOST_BYTES + 1).read_to_end(&mut bytes)?;
    if bytes.len() as u64 > MOST_BYTES {
        let words = format!("it is longer than {} MiB", MOST_BYTES >> 20);
        return Err(io::Error::new(io::ErrorKind::FileTooLarge, words));
    }
    Ok(bytes)
}

/// Loads a file that a circuit includes or names.
pub fn load(path: &Path) -> io::Result<Vec<u8>> {
    limited(File::open(path)?)
}

/// Reads the circuit the command line names.
pub fn read(file: &Path) -> Result<Text, Diagnostic> {
    let (name, bytes, folder) = if is_standard_input(file) {
        ("<stdin>".to_owned(), limited(io::stdin().lock()), PathBuf::from("."))
    } else {
        let folder = file.parent().unwrap_or(Path::new("")).to_owned();
        (file.display().to_string(), load(file), folder)
    };
    let bytes = bytes.map_err(|error| unreadable(&name, &error))?;
    let text = decoded(&name, bytes)?;
    if text.trim().is_empty() {
        let wrong = Diagnostic::error(format!("`{name}` is empty: there is no circuit in it"));
        return Err(
            wrong.help("a circuit begins like this: `gnd -( u: 12 V +)- a -( r: 3 Ω )- gnd`")
        );
    }
    Ok(Text { name, text, folder })
}

fn unreadable(name: &str, error: &io::Error) -> Diagnostic {
    let cause = match error.kind() {
        io::ErrorKind::NotFound => "there is no such file".to_owned(),
        io::ErrorKind::PermissionDenied => "reading it is not permitted".to_owned(),
        io::ErrorKind::IsADirectory => "it is a folder".to_owned(),
        _ => error.to_string(),
    };
    Diagnostic::error(format!("cannot read `{name}`: {cause}"))
}

/// The text of the bytes, without a byte order mark.
fn decoded(name: &str, bytes: Vec<u8>) -> Result<String, Diagnostic> {
    let text = String::from_utf8(bytes).map_err(|error| {
        let offset = error.utf8_error().valid_up_to();
        let line = error.as_bytes()[..offset].iter().filter(|&&b| b == b'\n').count() + 1;
        let words = format!("`{name}` is not UTF-8: byte {offset} (from 0), in line {line}");
        Diagnostic::error(words)
            .help("save it as UTF-8; `u`, `ohm` and `deg` need no special letters")
    })?;
    Ok(match text.strip_prefix('\u{feff}') {
        Some(rest) => rest.to_owned(),
        None => text,
    })
}

#[cfg(test)]
mod tests {
    use crate::cli::input::{decoded, read, short_name};
    use std::path::Path;

    #[test]
    fn a_file_that_is_not_there_is_named() {
        let error = read(Path::new("no/such/link.bfl")).unwrap_err();
        assert_eq!(error.message, "cannot read `no/such/link.bfl`: there is no such file");
    }

    #[test]
    fn a_folder_is_not_a_circuit() {
        let error = read(Path::new("src")).unwrap_err();
        assert_eq!(error.message, "cannot read `src`: it is a folder");
    }

    #[test]
    fn the_first_byte_that_is_not_utf8_is_named_with_its_line() {
        let error = decoded("a.bfl", b"a\nb\n\xff".to_vec()).unwrap_err();
        assert_eq!(error.message, "`a.bfl` is not UTF-8: byte 4 (from 0), in line 3");
    }

    #[test]
    fn a_byte_order_mark_is_left_out() {
        assert_eq!(decoded("a.bfl", "\u{feff}a".into()).unwrap(), "a");
    }

    #[test]
    fn a_circuit_is_called_by_its_file_name() {
        assert_eq!(short_name(Path::new("some/where/link.bfl")), "link.bfl");
        assert_eq!(short_name(Path::new("-")), "<stdin>");
    }
}
