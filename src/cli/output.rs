//! Standard output for rows that come over time: gathered while they come fast, and passed on as
//! soon as the next reader would have to wait.

use std::io::{self, StdoutLock, Write};
use std::time::{Duration, Instant};

/// This much is written in one piece.
const PIECE_BYTES: usize = 1 << 16;
/// No row waits longer than this while others come.
const LONGEST_WAIT: Duration = Duration::from_millis(100);
/// A row that took longer than this to compute is passed on at once.
const SLOW_ROW: Duration = Duration::from_millis(1);

/// Gathers rows and passes them on.
pub struct RowWriter<W: Write> {
    sink: W,
    /// The rows not passed on yet; renderers append to it.
    pub pending: Vec<u8>,
    last_row: Instant,
    last_flush: Instant,
}

impl RowWriter<StdoutLock<'static>> {
    /// Rows to standard output.
    pub fn stdout() -> Self {
        Self::new(io::stdout().lock())
    }
}

impl<W: Write> RowWriter<W> {
    /// Rows to `sink`.
    pub fn new(sink: W) -> Self {
        let now = Instant::now();
        RowWriter { sink, pending: Vec::new(), last_row: now, last_flush: now }
    }

    /// Says that a row was appended. True if rows were passed on.
    pub fn row_done(&mut self) -> io::Result<bool> {
        let now = Instant::now();
        let due = self.pending.len() >= PIECE_BYTES
            || now - self.last_row >= SLOW_ROW
            || now - self.last_flush >= LONGEST_WAIT;
        self.last_row = now;
        if due {
            self.flush()?;
            self.last_flush = now;
        }
        Ok(due)
    }

    /// Passes everything on.
    pub fn flush(&mut self) -> io::Result<()> {
        self.sink.write_all(&self.pending)?;
        self.pending.clear();
        self.sink.flush()
    }
}

/// Writes a finished text to standard output.
pub fn write_all(bytes: &[u8]) -> io::Result<()> {
    let mut stdout = io::stdout().lock();
    stdout.write_all(bytes)?;
    stdout.flush()
}

#[cfg(test)]
mod tests {
    use crate::cli::output::{PIECE_BYTES, RowWriter, SLOW_ROW};

    #[test]
    fn a_slow_row_is_passed_on_at_once() {
        let mut writer = RowWriter::new(Vec::new());
        writer.pending.extend_from_slice(b"1\n");
        std::thread::sleep(SLOW_ROW);
        assert!(writer.row_done().unwrap());
        assert_eq!(writer.sink, b"1\n");
    }

    #[test]
    fn a_full_piece_is_passed_on() {
        let mut writer = RowWriter::new(Vec::new());
        writer.pending.resize(PIECE_BYTES, b'x');
        assert!(writer.row_done().unwrap());
        assert_eq!((writer.sink.len(), writer.pending.len()), (PIECE_BYTES, 0));
    }
}
