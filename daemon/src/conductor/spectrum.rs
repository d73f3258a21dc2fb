//! The spectrum of a stored capture, computed from its waveform when it is asked for.

use evenpair_api::{Quantity, Spectrum, SpectrumLine};
use evenpair_core::analysis::density::{self, Density};
use evenpair_core::analysis::spectrum::SpectrumError;
use evenpair_core::analysis::{Record, Samples};

use super::{Conductor, Refusal};
use crate::store::Waveform;

impl Conductor {
    /// The spectra of a capture's corrected difference and common mode, in segments of at most `longest` samples.
    pub(crate) async fn spectrum(&self, id: &str, number: u32, longest: usize) -> Result<Spectrum, Refusal> {
        let run = self.run(id).await?.id;
        if self.0.workshop.store.waveform_path(run, number).await?.is_none() {
            return Err(Refusal::UnknownCapture { run, number });
        }
        let waveform = self.0.workshop.store.read_waveform(run, number).await?;
        let work = tokio::task::spawn_blocking(move || both(&waveform, longest));
        let [difference, common] = match work.await {
            Ok(found) => found?,
            // A fault of the mathematics is answered like any other fault of a handler.
            Err(error) if error.is_panic() => std::panic::resume_unwind(error.into_panic()),
            Err(_) => return Err(Refusal::ShuttingDown),
        };
        let whole = |count: usize| u32::try_from(count).unwrap_or(u32::MAX);
        Ok(Spectrum {
            run,
            number,
            window: density::WINDOW.to_owned(),
            coherent_gain: density::COHERENT_GAIN,
            noise_bandwidth_bins: density::NOISE_BANDWIDTH,
            bin: Quantity::exact(difference.bin_hz, "Hz"),
            segment: whole(difference.segment),
            segments: whole(difference.segments),
            difference: SpectrumLine { rms_v: difference.rms, density: difference.density },
            common: SpectrumLine { rms_v: common.rms, density: common.density },
        })
    }
}

/// Of the difference and of the common mode, which is the positive leg less half of the difference.
fn both(waveform: &Waveform, longest: usize) -> Result<[Density; 2], Refusal> {
    let difference = &waveform.difference_v;
    let common: Vec<f32> = difference
        .iter()
        .enumerate()
        .map(|(i, d)| (volts(&waveform.positive, waveform.first_valid + i) - 0.5 * f64::from(*d)) as f32)
        .collect();
    let interval_s = waveform.positive.interval_s;
    let of = |signal: &[f32]| {
        let found = density::density(signal, interval_s, longest).map_err(|error: SpectrumError| {
            Refusal::BadRequest { what: error.to_string(), help: "ask for shorter segments".to_owned() }
        })?;
        found.ok_or_else(|| Refusal::BadRequest {
            what: format!("the capture's {} samples are too few for a spectrum", signal.len()),
            help: "take a longer record".to_owned(),
        })
    };
    Ok([of(difference)?, of(&common)?])
}

/// One sample in volts at the tip; the store has seen that the difference does not reach beyond the records.
fn volts(record: &Record, sample: usize) -> f64 {
    let raw = match &record.samples {
        Samples::Codes(codes) => codes.get(sample).map(|&code| f64::from(code)),
        Samples::Numbers(numbers) => numbers.get(sample).map(|&number| f64::from(number)),
    };
    raw.unwrap_or(f64::NAN).mul_add(record.volts_per_code, record.zero_v)
}
