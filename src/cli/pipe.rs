//! Standard output whose reader may leave early: what is written after that is
//! dropped, so that a closed pipe is quiet and changes no exit status.

use std::io::{self, ErrorKind, Write};

/// A writer that goes on in silence when nobody reads any more.
pub(super) struct Pipe<W> {
    inner: W,
    closed: bool,
}

impl<W: Write> Pipe<W> {
    pub(super) const fn new(inner: W) -> Self {
        Self {
            inner,
            closed: false,
        }
    }

    /// The result, or `when_closed` if the reader has left.
    fn unless_closed<T>(&mut self, result: io::Result<T>, when_closed: T) -> io::Result<T> {
        match result {
            Err(error) if error.kind() == ErrorKind::BrokenPipe => {
                self.closed = true;
                Ok(when_closed)
            }
            other => other,
        }
    }
}

impl<W: Write> Write for Pipe<W> {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        if self.closed {
            return Ok(bytes.len());
        }
        let result = self.inner.write(bytes);
        self.unless_closed(result, bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        if self.closed {
            return Ok(());
        }
        let result = self.inner.flush();
        self.unless_closed(result, ())
    }
}
