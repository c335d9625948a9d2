//! Standard output for commands whose exit status is a judgement: a reader who
//! has seen enough (`| head`) does not end them early, since the status has to
//! be that of the whole.

use std::io::{self, ErrorKind, Write};

/// Writes until nobody reads any more, then says nothing and goes on.
pub(super) struct PatientOut<'a> {
    out: &'a mut dyn Write,
    closed: bool,
}

impl<'a> PatientOut<'a> {
    pub(super) fn new(out: &'a mut dyn Write) -> Self {
        Self { out, closed: false }
    }

    fn unless_closed(
        &mut self,
        act: impl FnOnce(&mut dyn Write) -> io::Result<()>,
    ) -> io::Result<()> {
        if self.closed {
            return Ok(());
        }
        match act(self.out) {
            Err(error) if error.kind() == ErrorKind::BrokenPipe => {
                self.closed = true;
                Ok(())
            }
            other => other,
        }
    }
}

impl Write for PatientOut<'_> {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.unless_closed(|out| out.write_all(bytes))
            .map(|()| bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        self.unless_closed(|out| out.flush())
    }
}
