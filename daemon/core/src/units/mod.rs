//! Physical units at the borders: text such as `12.5 ns` in, `(value, unit)` out, and back.
//!
//! Inside the program a number's unit is in its name's suffix (`skew_s`, `offset_v`); this module is the door.

use std::fmt;

/// A unit that a file or the API may use.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Unit {
    /// A
    Ampere,
    /// dB
    Decibel,
    /// F
    Farad,
    /// Hz
    Hertz,
    /// Ω, also written `Ohm`
    Ohm,
    /// A number
    One,
    /// Sa/s, samples per second
    SamplePerSecond,
    /// s
    Second,
    /// V
    Volt,
    /// V/s
    VoltPerSecond,
    /// V·s
    VoltSecond,
}

/// Every unit with the spellings that are understood; the first is the one that is written.
const SPELLINGS: [(Unit, &[&str]); 11] = [
    (Unit::Ampere, &["A"]),
    (Unit::Decibel, &["dB"]),
    (Unit::Farad, &["F"]),
    (Unit::Hertz, &["Hz"]),
    (Unit::Ohm, &["Ω", "Ohm", "ohm"]),
    (Unit::One, &["1"]),
    (Unit::SamplePerSecond, &["Sa/s"]),
    (Unit::Second, &["s"]),
    (Unit::Volt, &["V"]),
    (Unit::VoltPerSecond, &["V/s"]),
    (Unit::VoltSecond, &["V·s", "Vs"]),
];

/// SI prefixes as powers of ten (SI Brochure, table 7); `u` stands for `µ` on keyboards without it.
const PREFIXES: [(&str, i32); 12] = [
    ("f", -15),
    ("p", -12),
    ("n", -9),
    ("µ", -6),
    ("μ", -6),
    ("u", -6),
    ("m", -3),
    ("", 0),
    ("k", 3),
    ("M", 6),
    ("G", 9),
    ("T", 12),
];

impl Unit {
    /// The symbol, as the API writes it.
    #[must_use]
    pub fn symbol(self) -> &'static str {
        SPELLINGS.iter().find(|(unit, _)| *unit == self).map_or("1", |(_, names)| names[0])
    }

    /// The unit with this symbol, without a prefix.
    #[must_use]
    pub fn from_symbol(symbol: &str) -> Option<Self> {
        SPELLINGS.iter().find(|(_, names)| names.contains(&symbol)).map(|(unit, _)| *unit)
    }
}

impl fmt::Display for Unit {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.symbol())
    }
}

/// A number with its unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Amount {
    /// The number, in `unit` without a prefix.
    pub value: f64,
    /// The unit.
    pub unit: Unit,
}

/// Why a text is not an amount.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum AmountError {
    /// The text does not begin with a finite number.
    #[error("`{0}` does not begin with a number; write a number and a unit, such as `10 ns`")]
    NoNumber(String),
    /// What follows the number is no unit.
    #[error(
        "`{0}` is not a unit that is understood; known are A, dB, F, Hz, Ω, s, Sa/s, V, V/s, V·s, with an SI prefix if need be"
    )]
    UnknownUnit(String),
    /// The unit is not the one that belongs here.
    #[error("this is in {found}, but it must be in {wanted}")]
    WrongUnit {
        /// The unit found.
        found: Unit,
        /// The unit that belongs here.
        wanted: Unit,
    },
}

impl Amount {
    /// Reads `12.5 ns`, `-3V`, `1e6 Hz`, `47 pF`, `0.98` (a number).
    ///
    /// # Errors
    /// When the number is missing or not finite, or the unit is not understood.
    pub fn parse(text: &str) -> Result<Self, AmountError> {
        let text = text.trim();
        // The longest beginning that is a number: "1e" is not one, "1e6" is, and "1 F" must not lose its unit.
        let (value, rest) = (1..=text.len())
            .rev()
            .filter(|&end| text.is_char_boundary(end))
            .find_map(|end| {
                let head = &text[..end];
                let number = head.bytes().all(|b| b.is_ascii_digit() || b"+-.eE".contains(&b));
                number.then(|| head.parse::<f64>().ok()).flatten().map(|value| (value, &text[end..]))
            })
            .filter(|(value, _)| value.is_finite())
            .ok_or_else(|| AmountError::NoNumber(text.to_owned()))?;
        let symbol = rest.trim();
        if symbol.is_empty() {
            return Ok(Self { value, unit: Unit::One });
        }
        PREFIXES
            .iter()
            .find_map(|(prefix, power)| {
                let unit = Unit::from_symbol(symbol.strip_prefix(prefix)?)?;
                let scalable = !matches!(unit, Unit::One | Unit::Decibel) || *power == 0;
                scalable.then(|| Self { value: scale(value, *power), unit })
            })
            .ok_or_else(|| AmountError::UnknownUnit(symbol.to_owned()))
    }

    /// Reads an amount that must be in `unit`.
    ///
    /// # Errors
    /// As [`Amount::parse`], and when the unit is another one.
    pub fn parse_in(text: &str, unit: Unit) -> Result<f64, AmountError> {
        let amount = Self::parse(text)?;
        if amount.unit == unit {
            Ok(amount.value)
        } else {
            Err(AmountError::WrongUnit { found: amount.unit, wanted: unit })
        }
    }
}

/// `value · 10^power`, dividing by the exact positive power so that `10 ns` is the double nearest to 1e-8.
fn scale(value: f64, power: i32) -> f64 {
    if power < 0 { value / 10f64.powi(-power) } else { value * 10f64.powi(power) }
}

impl fmt::Display for Amount {
    /// Four significant digits with a prefix, such as `12.50 ns`; people read it, programs do not.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&show(self.value, self.unit, 4))
    }
}

/// `value` in `unit` with `digits` significant digits and an SI prefix where the unit takes one.
#[must_use]
pub fn show(value: f64, unit: Unit, digits: usize) -> String {
    if !value.is_finite() {
        return format!("{value} {unit}");
    }
    let exponent = rounded_exponent(value, digits);
    let prefixed = !matches!(unit, Unit::One | Unit::Decibel);
    let power = if prefixed { exponent.div_euclid(3).clamp(-5, 4) * 3 } else { 0 };
    let decimals = usize::try_from(digits as i32 - 1 - (exponent - power)).unwrap_or(0).min(15);
    let text = format!("{:.decimals$}", value / 10f64.powi(power));
    let prefix = PREFIXES.iter().find(|(_, p)| *p == power).map_or("", |(name, _)| name);
    match unit {
        Unit::One => text,
        _ => format!("{text} {prefix}{unit}"),
    }
}

/// The power of ten of `value` once it is rounded to `digits` significant digits: 9.996 to three digits has 1.
fn rounded_exponent(value: f64, digits: usize) -> i32 {
    let text = format!("{:.*e}", digits.saturating_sub(1), value);
    text.rsplit('e').next().and_then(|power| power.parse().ok()).unwrap_or(0)
}

#[cfg(test)]
mod tests;
