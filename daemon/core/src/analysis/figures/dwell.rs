//! Time above and below thresholds in each period.
//!
//! Between two samples the waveform is a straight line; the time that this spends above the threshold is added up from
//! the first like 50 % point to the last, whole periods only. Noise on an edge makes it cross back and forth, as often too
//! early as too late, so that no hysteresis is needed; a threshold within the noise of a state has no meaning and is
//! refused. How steep the crossings are follows from the same sum at thresholds a little higher and lower.

use super::super::signal::{BLOCK, Signal, range_of};
use super::super::transition::middle_per_part;
use super::compute::{Bench, Found};
use super::sources::Parts;

/// A threshold nearer to a state than this many times the noise counts its noise, not the waveform.
const CLEAR: f64 = 4.0;

/// By which part of the amplitude the threshold is moved to see how steep the crossings are.
const STEP: f64 = 0.01;

/// How a count of noisy samples scatters where an edge stays within the noise for several samples: ∫Φ(1 − Φ) = 1/√π.
const COUNT_SCATTER: f64 = 0.564;

impl Bench<'_> {
    /// Time above (or below) `threshold_v` in a period.
    pub(super) fn dwell(&self, threshold_v: f64, above: bool) -> Result<Found, String> {
        self.shape.period.clone()?;
        let levels = self.layout.levels.as_ref().map_err(ToString::to_string)?;
        let noise = self.sources.noise_v;
        for (name, level) in [("high", levels.high.value), ("low", levels.low.value)] {
            if (level - threshold_v).abs() < CLEAR * noise {
                return Err(format!("the threshold of {threshold_v} V lies within the noise of the {name} state"));
            }
        }
        // Outside the states only an aberration can cross it, or nothing does.
        let like = |rising: bool| self.shape.measured.iter().filter(move |(_, t)| t.rising == rising);
        let rising = like(true).count() >= like(false).count();
        let (first, last) = (like(rising).next(), like(rising).next_back());
        let (Some((i, first)), Some((j, last))) = (first, last) else {
            return Err("the record holds no transition".to_owned());
        };
        let periods = (j - i) as f64 / 2.0;
        if periods < 1.0 {
            return Err("the record holds less than one period".to_owned());
        }
        let span = (first.middle, last.middle);
        let per_period = |signal: &dyn Signal, threshold: f64| {
            let over = time_above(signal, span, threshold);
            (if above { over } else { span.1 - span.0 - over }) / periods
        };
        let difference: &dyn Signal = &self.input.corrected.difference_v;
        let value = per_period(difference, threshold_v);
        let period = (span.1 - span.0) / periods;
        if value <= 0.0 || value >= period {
            let side = if (value <= 0.0) == above { "below" } else { "above" };
            return Err(format!("the waveform stays {side} the threshold of {threshold_v} V"));
        }
        let step = (STEP * self.shape.amplitude).max(2.0 * noise);
        // Samples per volt: a higher threshold leaves less time above it.
        let per_volt =
            0.5 * (per_period(difference, threshold_v - step) - per_period(difference, threshold_v + step)) / step;
        // Two crossings a period.
        let crossing = 0.5 * per_volt.abs() * noise;
        let scatter = crossing.min((COUNT_SCATTER * crossing).sqrt());
        let [gain, skew] = self.by_moving(|signal, _| Some(per_period(signal, threshold_v)));
        let ends = self.ends_u(rising);
        let parts = Parts {
            noise: (scatter * std::f64::consts::SQRT_2 / periods.sqrt()).hypot(ends * value / period / periods),
            gain,
            skew,
            offset: per_volt,
            scale: per_volt * threshold_v,
            quantisation: per_volt * self.sources.quantisation_v,
            common_mode: 0.0,
            compensation: per_volt * self.sources.compensation.level_v,
            response: per_volt * self.sources.response.peak / 3.0f64.sqrt(),
        };
        let part = self.input.leak.peak_v;
        let leak = per_volt.abs() * part + self.shape.slowest * middle_per_part(part / self.shape.amplitude) / periods;
        Ok(Found { value, parts, leak, size: value }.times(self.input.corrected.interval_s))
    }

    /// Standard uncertainty of the span of whole periods, in samples.
    fn ends_u(&self, rising: bool) -> f64 {
        let mut like = self.shape.measured.iter().filter(|(_, t)| t.rising == rising).map(|(_, t)| t.middle_u);
        let first = like.next().unwrap_or(0.0);
        first.hypot(like.next_back().unwrap_or(0.0))
    }
}

/// How many samples long a signal is above a threshold between two places, both in samples.
fn time_above<S: Signal + ?Sized>(signal: &S, (from, to): (f64, f64), threshold: f64) -> f64 {
    let points = signal.points();
    let mut buffer = [0.0f32; BLOCK + 1];
    let mut total = 0.0;
    let mut start = from.max(0.0) as usize;
    let end = (to.ceil() as usize).min(points.saturating_sub(1));
    while start < end {
        // Segments from one sample to the next; neighbouring blocks share a sample.
        let count = BLOCK.min(end - start);
        let part = &mut buffer[..=count];
        signal.load(start, part);
        let (least, most) = range_of(part);
        let inside = start as f64 >= from && (start + count) as f64 <= to;
        if inside && f64::from(least) > threshold {
            total += count as f64;
        } else if f64::from(most) > threshold {
            for (k, w) in part.windows(2).enumerate() {
                let left = (start + k) as f64;
                let (a, b) = (f64::from(w[0]) - threshold, f64::from(w[1]) - threshold);
                let clip = ((from - left).clamp(0.0, 1.0), (to - left).clamp(0.0, 1.0));
                total += part_above(a, b, clip);
            }
        }
        start += count;
    }
    total
}

/// The part of a straight segment from `a` to `b` that is above zero, between two places from 0 to 1.
fn part_above(a: f64, b: f64, (from, to): (f64, f64)) -> f64 {
    if to <= from {
        return 0.0;
    }
    match (a > 0.0, b > 0.0) {
        (true, true) => to - from,
        (false, false) => 0.0,
        (up, _) => {
            let zero = (a / (a - b)).clamp(from, to);
            if up { zero - from } else { to - zero }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::{part_above, time_above};

    #[test]
    fn a_triangle_is_above_for_what_geometry_says() {
        // 0 to 10 and back over 20 samples: above 5 for half of the time, above 7.5 for a quarter.
        let wave: Vec<f64> = (0..=60).map(|i| f64::from(10 - (i % 20 - 10i32).abs())).collect();
        assert!((time_above(&wave, (0.0, 60.0), 5.0) - 30.0).abs() < 1e-9);
        assert!((time_above(&wave, (0.0, 60.0), 7.5) - 15.0).abs() < 1e-9);
        // From 2.5 to 7.5 up the first flank: above 5 from 5 on.
        assert!((time_above(&wave, (2.5, 7.5), 5.0) - 2.5).abs() < 1e-9);
        assert!(time_above(&wave, (0.0, 60.0), 10.0).abs() < 1e-9);
    }

    #[test]
    fn long_records_are_the_same_block_by_block() {
        let wave: Vec<f64> = (0..5001).map(|i| (f64::from(i) * 0.01).sin()).collect();
        let whole = time_above(&wave, (13.25, 4800.5), 0.2);
        let parts = time_above(&wave, (13.25, 777.7), 0.2) + time_above(&wave, (777.7, 4800.5), 0.2);
        assert!((whole - parts).abs() < 1e-6, "{whole} {parts}");
    }

    #[test]
    fn a_segment_is_cut_at_its_crossing() {
        assert!((part_above(-1.0, 3.0, (0.0, 1.0)) - 0.75).abs() < 1e-12);
        assert!((part_above(3.0, -1.0, (0.5, 1.0)) - 0.25).abs() < 1e-12);
        assert!(part_above(-1.0, 3.0, (0.0, 0.2)).abs() < 1e-12);
    }
}
