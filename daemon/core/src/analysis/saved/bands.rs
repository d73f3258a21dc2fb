//! At which frequencies the rejection of an unknown reference is told.

use super::super::{Record, band};

/// The highest frequency that is told, relative to the sample rate.
const HIGHEST: f64 = super::super::interpolate::BAND;

/// Two lists in hertz: the reference's strongest frequency times 1, 3, 10, 30, …, where a periodic signal has its lines;
/// and 1–2–5 steps over all that the record can show, for everything else.
pub(super) fn of(record: &Record) -> [Vec<f64>; 2] {
    let volts = record.volts();
    let highest = HIGHEST / record.interval_s;
    let points = band::fast_up_to(volts.len());
    let spectrum = band::windowed(&volts[..points], &band::window(points));
    let strongest = (band::LOBE..spectrum.len()).fold(band::LOBE, |best, k| {
        let power = |k: usize| spectrum.get(k).map_or(0.0, |bin| bin.norm_sqr());
        if power(k) > power(best) { k } else { best }
    });
    let bin_hz = 1.0 / (points as f64 * record.interval_s);
    let fundamental = strongest as f64 * bin_hz;
    let up_to = |frequencies: Vec<f64>| frequencies.into_iter().filter(|f| *f < highest && f.is_finite()).collect();
    let decades = |first: f64, steps: &[f64]| -> Vec<f64> {
        (0..12).flat_map(|decade| steps.iter().map(move |step| first * step * 10f64.powi(decade))).collect()
    };
    let lowest = 10f64.powf((bin_hz * band::LOBE as f64).log10().floor());
    [up_to(decades(fundamental, &[1.0, 3.0])), up_to(decades(lowest, &[1.0, 2.0, 5.0]))]
}
