//! Response messages (IEEE 488.2 chapter 8, from memory).

/// The output queue of one connection while a message is carried out.
#[derive(Debug, Default)]
pub(crate) struct Reply {
    bytes: Vec<u8>,
    indefinite: bool,
}

impl Reply {
    /// Adds the answer to one query; answers are joined by semicolons (8.4.1).
    pub(crate) fn add(&mut self, answer: &[u8]) {
        if !self.bytes.is_empty() {
            self.bytes.push(b';');
        }
        self.bytes.extend_from_slice(answer);
    }

    /// Adds an answer that has no recognisable end but NL (8.7.11, arbitrary ASCII): no further query can be answered in
    /// the same message.
    pub(crate) fn add_indefinite(&mut self, answer: &[u8]) {
        self.add(answer);
        self.indefinite = true;
    }

    /// Adds a definite-length block (8.7.9): `#`, the number of digits, the length, the bytes.
    pub(crate) fn add_block(&mut self, contents: &[u8]) {
        let length = contents.len().to_string();
        self.add(format!("#{}{length}", length.len()).as_bytes());
        self.bytes.extend_from_slice(contents);
    }

    /// Whether an answer already waits: the MAV bit.
    pub(crate) fn waits(&self) -> bool {
        !self.bytes.is_empty()
    }

    /// Whether the last answer forbids another one.
    pub(crate) fn is_indefinite(&self) -> bool {
        self.indefinite
    }

    /// The answers by themselves.
    pub(crate) fn into_bytes(self) -> Vec<u8> {
        self.bytes
    }

    /// The response message with its NL; nothing if nothing was asked.
    pub(crate) fn finish(mut self) -> Vec<u8> {
        if !self.bytes.is_empty() {
            self.bytes.push(b'\n');
        }
        self.bytes
    }
}

/// A number in the form NR3 (8.7.4), e.g. `-1.25E-9`: 15 significant digits, trailing zeros left out.
/// Infinities and NaN have the values that SCPI-99 gives them (vol. 1, 7.2.1.4 and 7.2.1.5).
pub(crate) fn nr3(value: f64) -> String {
    if value.is_nan() {
        return "9.91E+37".to_owned();
    }
    if value.is_infinite() {
        return if value > 0.0 { "9.9E+37" } else { "-9.9E+37" }.to_owned();
    }
    let text = format!("{value:.14E}");
    let (mantissa, exponent) = text.split_once('E').unwrap_or((&text, "0"));
    let (whole, fraction) = mantissa.split_once('.').unwrap_or((mantissa, "0"));
    let fraction = fraction.trim_end_matches('0');
    let fraction = if fraction.is_empty() { "0" } else { fraction };
    let sign = if exponent.starts_with('-') { "" } else { "+" };
    format!("{whole}.{fraction}E{sign}{exponent}")
}

#[cfg(test)]
mod tests;
