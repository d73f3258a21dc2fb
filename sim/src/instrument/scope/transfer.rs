//! Records on their way out: preamble and samples.

use super::acquire::Record;
use super::settings::Encoding;
use crate::message::nr3;
use crate::status::Fault;
use crate::world::ChannelData;

/// The scale of the codes as they are sent.
struct Scale {
    /// Codes of the record per code sent.
    codes: i32,
    volts_per_code: f64,
    low_code: i32,
    high_code: i32,
}

impl Scale {
    /// One-byte codes are whole converter steps: of an averaged record, whose grid is finer, they are the nearest step.
    fn new(data: &ChannelData, encoding: Encoding) -> Self {
        let ratio = (data.step_v / data.volts_per_code).round();
        if encoding != Encoding::Integer8 || !(2.0..=32768.0).contains(&ratio) {
            let ChannelData { volts_per_code, low_code, high_code, .. } = *data;
            return Self { codes: 1, volts_per_code, low_code, high_code };
        }
        #[expect(clippy::cast_possible_truncation, reason = "whole and bounded")]
        let codes = ratio as i32;
        Self {
            codes,
            volts_per_code: data.volts_per_code * ratio,
            low_code: data.low_code.div_euclid(codes),
            high_code: data.high_code.div_euclid(codes),
        }
    }

    fn code(&self, code: i16) -> i32 {
        if self.codes == 1 {
            return i32::from(code);
        }
        (i32::from(code) + self.codes / 2).div_euclid(self.codes).clamp(self.low_code, self.high_code)
    }
}

/// What a record's samples mean.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Facts {
    /// Samples.
    pub(crate) points: usize,
    /// Seconds from sample to sample.
    pub(crate) interval_s: f64,
    /// Time of the first sample relative to the trigger.
    pub(crate) start_s: f64,
    /// Volts from code to code as they are sent.
    pub(crate) volts_per_code: f64,
    /// Volts at code 0.
    pub(crate) zero_v: f64,
    /// The converter's lowest code.
    pub(crate) low_code: i32,
    /// The converter's highest code.
    pub(crate) high_code: i32,
    /// One converter step, averaged or not.
    pub(crate) step_v: f64,
    /// Sweeps that were averaged.
    pub(crate) averages: u32,
    /// Number of the acquisition.
    pub(crate) number: u64,
}

/// What the samples of one channel mean when they are sent in an encoding.
///
/// # Errors
/// -230 if there is no such channel.
pub(crate) fn facts(record: &Record, channel: usize, encoding: Encoding) -> Result<Facts, Fault> {
    let data = channel_data(record, channel)?;
    let scale = Scale::new(data, encoding);
    Ok(Facts {
        points: data.codes.len(),
        interval_s: record.settings.interval_s,
        start_s: record.acquisition.start_s,
        volts_per_code: scale.volts_per_code,
        zero_v: data.zero_v,
        low_code: scale.low_code,
        high_code: scale.high_code,
        step_v: data.step_v,
        averages: record.settings.averages,
        number: record.acquisition.number,
    })
}

/// The standard preamble: points, interval, time of the first sample, volts per code, volts at code 0, the converter's
/// end codes, one converter step in volts, averages, number of the acquisition.
///
/// # Errors
/// -230 if there is no such channel.
pub(crate) fn preamble(record: &Record, channel: usize, encoding: Encoding) -> Result<String, Fault> {
    let facts = facts(record, channel, encoding)?;
    let fields = [
        facts.points.to_string(),
        nr3(facts.interval_s),
        nr3(facts.start_s),
        nr3(facts.volts_per_code),
        nr3(facts.zero_v),
        facts.low_code.to_string(),
        facts.high_code.to_string(),
        nr3(facts.step_v),
        facts.averages.to_string(),
        facts.number.to_string(),
    ];
    Ok(fields.join(","))
}

/// The samples as a comma-separated list of volts, each with `unit` behind it.
pub(crate) fn text(record: &Record, channel: usize, unit: &str) -> Result<String, Fault> {
    let data = channel_data(record, channel)?;
    let mut text = String::with_capacity(data.codes.len() * 20);
    for code in &data.codes {
        if !text.is_empty() {
            text.push(',');
        }
        text.push_str(&nr3(volts(data, *code)));
        text.push_str(unit);
    }
    Ok(text)
}

/// The samples as bytes: codes, or volts for [`Encoding::Real32`]. `swapped` puts the least significant byte first.
pub(crate) fn binary(record: &Record, channel: usize, encoding: Encoding, swapped: bool) -> Result<Vec<u8>, Fault> {
    let data = channel_data(record, channel)?;
    let scale = Scale::new(data, encoding);
    let codes = data.codes.iter().copied();
    Ok(match (encoding, swapped) {
        // The two's complement of a code within -128..=127 is its lowest byte.
        (Encoding::Integer8, _) => codes.map(|code| scale.code(code).to_le_bytes()[0]).collect(),
        (Encoding::Integer16, false) => codes.flat_map(i16::to_be_bytes).collect(),
        (Encoding::Integer16, true) => codes.flat_map(i16::to_le_bytes).collect(),
        (Encoding::Real32 | Encoding::Text, false) => codes.flat_map(|code| single(data, code).to_be_bytes()).collect(),
        (Encoding::Real32 | Encoding::Text, true) => codes.flat_map(|code| single(data, code).to_le_bytes()).collect(),
    })
}

fn channel_data(record: &Record, channel: usize) -> Result<&ChannelData, Fault> {
    record.acquisition.channels.get(channel).ok_or(Fault::Stale)
}

fn volts(data: &ChannelData, code: i16) -> f64 {
    data.zero_v + f64::from(code) * data.volts_per_code
}

#[expect(clippy::cast_possible_truncation, reason = "the format has this precision")]
fn single(data: &ChannelData, code: i16) -> f32 {
    volts(data, code) as f32
}

#[cfg(test)]
mod tests;
