//! Cuts the bytes of a connection into program messages, however they arrive.

/// Longest message taken, in bytes: far more than any command of these instruments needs, and a bound on what a
/// connection can make us hold.
pub(crate) const LONGEST_MESSAGE: usize = 64 * 1024;

/// What came out of the input buffer.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) enum Arrival {
    /// A message without its NL.
    Message(Vec<u8>),
    /// A message of more than [`LONGEST_MESSAGE`] bytes; everything up to the next NL is thrown away.
    Overrun,
}

/// The input buffer: each byte is looked at once.
#[derive(Debug, Default)]
pub(crate) struct Input {
    message: Vec<u8>,
    state: State,
}

/// Where in a message the next byte stands.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
enum State {
    #[default]
    Plain,
    /// Inside a string that ends with this quote.
    Quoted(u8),
    /// Behind `#`.
    Hash,
    /// In the length of a block: digits and value so far.
    Length { digits_left: u8, length: usize },
    /// In the contents of a block.
    Block { left: usize },
    /// In a message that was too long.
    Discarding,
}

impl Input {
    /// Takes in bytes and gives the messages that they complete.
    pub(crate) fn push(&mut self, bytes: &[u8]) -> Vec<Arrival> {
        let mut arrivals = Vec::new();
        for byte in bytes {
            if let Some(arrival) = self.take(*byte) {
                arrivals.push(arrival);
            }
        }
        arrivals
    }

    /// The peer says that a message ends here (END, where the transport has it); gives what stands behind the last NL.
    pub(crate) fn end(&mut self) -> Option<Arrival> {
        let discarded = std::mem::take(&mut self.state) == State::Discarding;
        let message = std::mem::take(&mut self.message);
        (!discarded && !message.is_empty()).then_some(Arrival::Message(message))
    }

    fn take(&mut self, byte: u8) -> Option<Arrival> {
        if let State::Block { left } = self.state {
            self.message.push(byte);
            self.state = if left > 1 { State::Block { left: left - 1 } } else { State::Plain };
            return None;
        }
        if byte == b'\n' {
            let discarded = self.state == State::Discarding;
            self.state = State::Plain;
            let message = std::mem::take(&mut self.message);
            return if discarded { None } else { Some(Arrival::Message(message)) };
        }
        if self.state == State::Discarding {
            return None;
        }
        self.message.push(byte);
        self.state = self.state.after(byte);
        let awaited = if let State::Block { left } = self.state { left } else { 0 };
        if self.message.len().saturating_add(awaited) > LONGEST_MESSAGE {
            self.message = Vec::new();
            self.state = State::Discarding;
            return Some(Arrival::Overrun);
        }
        None
    }
}

impl State {
    /// The state behind a byte that neither ends the message nor lies in a block's contents.
    fn after(self, byte: u8) -> Self {
        match (self, byte) {
            (Self::Quoted(quote), _) if byte != quote => self,
            (Self::Quoted(_), _) => Self::Plain,
            (Self::Hash, b'1'..=b'9') => Self::Length { digits_left: byte - b'0', length: 0 },
            (Self::Length { digits_left, length }, b'0'..=b'9') => {
                // Nine digits at most, so the length fits in usize.
                let length = length * 10 + usize::from(byte - b'0');
                match (digits_left, length) {
                    (1, 0) => Self::Plain,
                    (1, _) => Self::Block { left: length },
                    _ => Self::Length { digits_left: digits_left - 1, length },
                }
            }
            (_, b'"' | b'\'') => Self::Quoted(byte),
            (_, b'#') => Self::Hash,
            _ => Self::Plain,
        }
    }
}

#[cfg(test)]
mod tests;
