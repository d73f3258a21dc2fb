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

/// The reply to `TRACe:PREamble?`: points, interval, time of the first sample, volts per code, volts at code 0, the
/// converter's end codes, one converter step in volts, averages, number of the acquisition.
pub(crate) fn preamble(record: &Record, channel: usize, encoding: Encoding) -> Result<String, Fault> {
    let data = channel_data(record, channel)?;
    let scale = Scale::new(data, encoding);
    let fields = [
        data.codes.len().to_string(),
        nr3(record.settings.interval_s),
        nr3(record.acquisition.start_s),
        nr3(scale.volts_per_code),
        nr3(data.zero_v),
        scale.low_code.to_string(),
        scale.high_code.to_string(),
        nr3(data.step_v),
        record.settings.averages.to_string(),
        record.acquisition.number.to_string(),
    ];
    Ok(fields.join(","))
}

/// The samples as a comma-separated list of volts.
pub(crate) fn text(record: &Record, channel: usize) -> Result<String, Fault> {
    let data = channel_data(record, channel)?;
    let mut text = String::with_capacity(data.codes.len() * 20);
    for code in &data.codes {
        if !text.is_empty() {
            text.push(',');
        }
        text.push_str(&nr3(volts(data, *code)));
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
