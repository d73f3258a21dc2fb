//! Parameters taken one by one, each as the kind of value that its header wants.

use super::{Data, Mnemonic, is_form_of};
use crate::status::Fault;

/// The unit that a number may carry.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Quantity {
    /// A
    Ampere,
    /// A whole number without unit.
    Count,
    /// Hz
    Hertz,
    /// A number without unit.
    None,
    /// Percent
    Percent,
    /// s
    Second,
    /// V
    Volt,
}

impl Quantity {
    /// The unit as it is written; empty without one.
    pub(crate) fn name(self) -> &'static str {
        match self {
            Self::Ampere => "A",
            Self::Count | Self::None => "",
            Self::Hertz => "HZ",
            Self::Percent => "PCT",
            Self::Second => "S",
            Self::Volt => "V",
        }
    }

    /// The factor that a suffix stands for (IEEE 488.2 7.7.3.4, table 7-2, from memory): `M` is milli and `MA` mega, but
    /// `MHZ` is megahertz.
    fn factor(self, suffix: &str) -> Result<f64, Fault> {
        if self.name().is_empty() {
            return Err(Fault::SuffixNotAllowed);
        }
        match suffix.strip_suffix(self.name()) {
            Some("") => Ok(1.0),
            Some(_) if self == Self::Percent => Err(Fault::InvalidSuffix),
            Some("EX") => Ok(1e18),
            Some("PE") => Ok(1e15),
            Some("T") => Ok(1e12),
            Some("G") => Ok(1e9),
            Some("MA") => Ok(1e6),
            Some("M") if self == Self::Hertz => Ok(1e6),
            Some("K") => Ok(1e3),
            Some("M") => Ok(1e-3),
            Some("U") => Ok(1e-6),
            Some("N") => Ok(1e-9),
            Some("P") => Ok(1e-12),
            Some("F") => Ok(1e-15),
            Some("A") => Ok(1e-18),
            _ => Err(Fault::InvalidSuffix),
        }
    }
}

/// What `MINimum`, `MAXimum` and `DEFault` stand for.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Limits {
    /// Least value.
    pub(crate) min: f64,
    /// Largest value.
    pub(crate) max: f64,
    /// Value after `*RST`.
    pub(crate) default: f64,
}

impl Limits {
    /// The value that a word stands for.
    fn named(&self, word: &str) -> Result<f64, Fault> {
        let names = [("MINimum", self.min), ("MAXimum", self.max), ("DEFault", self.default)];
        let found = names.iter().find(|(form, _)| is_form_of(word, form));
        found.map(|(_, value)| *value).ok_or(Fault::InvalidCharacterData)
    }
}

/// The parameters of one unit.
#[derive(Debug)]
pub(crate) struct Args {
    data: std::vec::IntoIter<Data>,
}

impl Args {
    /// Parameters in the order they were sent.
    pub(crate) fn new(data: Vec<Data>) -> Self {
        Self { data: data.into_iter() }
    }

    fn next(&mut self) -> Result<Data, Fault> {
        self.data.next().ok_or(Fault::MissingParameter)
    }

    /// Refuses parameters that are left over.
    pub(crate) fn finish(&mut self) -> Result<(), Fault> {
        if self.data.next().is_some() { Err(Fault::ParameterNotAllowed) } else { Ok(()) }
    }

    /// A number or the name of a limit; not yet held against the limits.
    pub(crate) fn number(&mut self, limits: &Limits, unit: Quantity) -> Result<f64, Fault> {
        match self.next()? {
            Data::Number { value, suffix: None } => Ok(value),
            Data::Number { value, suffix: Some(suffix) } => Ok(value * unit.factor(&suffix)?),
            #[expect(clippy::cast_precision_loss, reason = "more digits than a double holds mean nothing here")]
            Data::Radix(value) => Ok(value as f64),
            Data::Character(word) => limits.named(&word),
            _ => Err(Fault::DataType),
        }
    }

    /// A number, or one of some keywords by its place in the list.
    pub(crate) fn number_or_word(&mut self, limits: &Limits, forms: &[&str]) -> Result<Result<f64, usize>, Fault> {
        match self.data.as_slice().first() {
            Some(Data::Character(_)) => self.plain_word(forms).map(Err),
            _ => self.number(limits, Quantity::Count).map(Ok),
        }
    }

    /// The limit that a query asks for, if it does: `RANGe? MAX`.
    pub(crate) fn asked_limit(&mut self, limits: &Limits) -> Result<Option<f64>, Fault> {
        match self.data.next() {
            None => Ok(None),
            Some(Data::Character(word)) => limits.named(&word).map(Some),
            Some(_) => Err(Fault::DataType),
        }
    }

    /// `ON`, `OFF` or a number; every number that does not round to zero is on (SCPI-99 vol. 1, 7.3).
    pub(crate) fn boolean(&mut self) -> Result<bool, Fault> {
        match self.next()? {
            Data::Number { suffix: Some(_), .. } => Err(Fault::SuffixNotAllowed),
            Data::Number { value, .. } => Ok(value.round().abs() >= 1.0),
            Data::Radix(value) => Ok(value != 0),
            Data::Character(word) if word == "ON" => Ok(true),
            Data::Character(word) if word == "OFF" => Ok(false),
            Data::Character(_) => Err(Fault::InvalidCharacterData),
            _ => Err(Fault::DataType),
        }
    }

    /// A mask of status bits, 0 to `max`; IEEE 488.2 rounds a fraction (10.10.2).
    pub(crate) fn mask(&mut self, max: u16) -> Result<u16, Fault> {
        let limits = Limits { min: 0.0, max: f64::from(max), default: 0.0 };
        let value = match self.next()? {
            Data::Number { suffix: Some(_), .. } => return Err(Fault::SuffixNotAllowed),
            Data::Number { value, .. } => value.round(),
            #[expect(clippy::cast_precision_loss, reason = "a value that large is out of range anyway")]
            Data::Radix(value) => value as f64,
            _ => return Err(Fault::DataType),
        };
        if !(limits.min..=limits.max).contains(&value) {
            return Err(Fault::OutOfRange);
        }
        #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "just checked and rounded")]
        let mask = value as u16;
        Ok(mask)
    }

    /// One of some keywords, by its place in the list. A keyword may be followed by a number, which is returned too.
    pub(crate) fn word(&mut self, forms: &[&str]) -> Result<(usize, Option<u32>), Fault> {
        let Data::Character(word) = self.next()? else {
            return Err(Fault::DataType);
        };
        let mnemonic = Mnemonic::new(&word);
        let place =
            forms.iter().position(|form| is_form_of(&mnemonic.name, form)).ok_or(Fault::InvalidCharacterData)?;
        Ok((place, mnemonic.suffix))
    }

    /// A keyword that takes no number.
    pub(crate) fn plain_word(&mut self, forms: &[&str]) -> Result<usize, Fault> {
        match self.word(forms)? {
            (place, None) => Ok(place),
            (_, Some(_)) => Err(Fault::InvalidCharacterData),
        }
    }

    /// A number of bits behind a keyword, if one follows.
    pub(crate) fn optional_number(&mut self) -> Result<Option<f64>, Fault> {
        match self.data.next() {
            None => Ok(None),
            Some(Data::Number { value, suffix: None }) => Ok(Some(value)),
            Some(Data::Number { .. }) => Err(Fault::SuffixNotAllowed),
            Some(_) => Err(Fault::DataType),
        }
    }

    /// A channel list such as `(@101,102,105:107)` (SCPI-99 vol. 1, 8.3.2), at most 1,000 channels long so that a range
    /// cannot be used to fill the memory.
    pub(crate) fn channels(&mut self) -> Result<Vec<u32>, Fault> {
        let Data::Expression(text) = self.next()? else {
            return Err(Fault::DataType);
        };
        let list = text.trim().strip_prefix('@').ok_or(Fault::InvalidExpression)?;
        let mut channels = Vec::new();
        for part in list.split(',') {
            let mut ends =
                part.splitn(2, ':').map(|end| end.trim().parse::<u32>().map_err(|_| Fault::InvalidExpression));
            let first = ends.next().unwrap_or(Err(Fault::InvalidExpression))?;
            let last = ends.next().unwrap_or(Ok(first))?;
            let length = usize::try_from(first.abs_diff(last)).map_or(usize::MAX, |steps| steps.saturating_add(1));
            if channels.len().saturating_add(length) > 1000 {
                return Err(Fault::OutOfRange);
            }
            // A range may run downwards; its order is kept.
            if first <= last { channels.extend(first..=last) } else { channels.extend((last..=first).rev()) }
        }
        Ok(channels)
    }
}

#[cfg(test)]
mod tests;
