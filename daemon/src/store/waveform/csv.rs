//! A waveform as comma-separated text (RFC 4180): `time_s,positive_v,negative_v,difference_v`.
//!
//! Volts at the probe tips, seconds from the trigger. The negative leg is as acquired, not corrected, so that anybody
//! can form the plain difference. The difference is empty where it has no support.

use std::io::{self, Write};

use evenpair_core::analysis::{Record, Samples};

use super::Waveform;

/// Writes a waveform as text. Volts have ten significant digits, more than any converter; times have twelve, so that
/// neighbours stay apart in the longest records.
///
/// # Errors
/// What the output says.
pub(crate) fn write(waveform: &Waveform, out: &mut impl Write) -> io::Result<()> {
    write!(out, "time_s,positive_v,negative_v,difference_v\r\n")?;
    for sample in 0..waveform.points() {
        let time_s = waveform.time_s(sample);
        let (positive_v, negative_v) = (volts(&waveform.positive, sample), volts(&waveform.negative, sample));
        write!(out, "{time_s:.11e},{positive_v:.9e},{negative_v:.9e},")?;
        match waveform.difference_at(sample) {
            Some(difference_v) => write!(out, "{difference_v:.9e}\r\n")?,
            None => out.write_all(b"\r\n")?,
        }
    }
    Ok(())
}

/// One sample in volts at the tip.
fn volts(record: &Record, sample: usize) -> f64 {
    let raw = match &record.samples {
        Samples::Codes(codes) => codes.get(sample).map(|&code| f64::from(code)),
        Samples::Numbers(numbers) => numbers.get(sample).map(|&number| f64::from(number)),
    };
    raw.unwrap_or(f64::NAN).mul_add(record.volts_per_code, record.zero_v)
}
