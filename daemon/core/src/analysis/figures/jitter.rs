//! Jitter: the rms scatter of like 50 % points about a straight line in time.
//!
//! The points are those of the transitions that were measured: found with a hysteresis from 30 % to 70 % of an amplitude
//! that is at least six times the measured noise, placed on an edge smoothed by as much as that noise demands. What noise
//! alone makes of a point's place, sigma over slope, is taken off in power. The direction with more points counts.

use super::super::transition::{Transition, middle_per_part};
use super::compute::{Bench, Found};
use super::shape::{Read, Reading, Shape};

/// The fewest periods between the first and the last point.
const LEAST_PERIODS: f64 = 4.0;

impl Bench<'_> {
    pub(super) fn jitter(&self) -> Result<Found, String> {
        // A waveform without a period has a reason for it.
        self.shape.period.clone()?;
        let bins = self.input.allowance.noise_bins;
        let u_noise = if bins > 0 { (2.0 / bins as f64).sqrt() } else { 0.0 };
        let read = move |shape: &Shape| scatter(&shape.measured, u_noise);
        let slowest = self.shape.slowest;
        let found = self.ratio(read, move |part, _| slowest * middle_per_part(part))?;
        Ok(found.times(self.input.corrected.interval_s))
    }
}

/// In samples. `u_noise` is how well the noise's power is known, relative.
fn scatter(measured: &[(usize, Transition)], u_noise: f64) -> Reading {
    let of = |rising: bool| measured.iter().filter(move |(_, t)| t.rising == rising);
    let rising = of(true).count() >= of(false).count();
    // Every second transition is alike.
    let points: Vec<(f64, &Transition)> = of(rising).map(|(i, t)| ((i / 2) as f64, t)).collect();
    let spanned = points.first().zip(points.last()).map_or(0.0, |(first, last)| last.0 - first.0);
    if spanned < LEAST_PERIODS {
        return Err(format!("the record holds {spanned:.0} whole periods; jitter needs at least {LEAST_PERIODS:.0}"));
    }
    let n = points.len() as f64;
    let (cx, cy) = (points.iter().map(|p| p.0).sum::<f64>() / n, points.iter().map(|p| p.1.middle).sum::<f64>() / n);
    let sxx: f64 = points.iter().map(|p| (p.0 - cx).powi(2)).sum();
    let slope = points.iter().map(|p| (p.0 - cx) * (p.1.middle - cy)).sum::<f64>() / sxx;
    let residual: f64 = points.iter().map(|p| (p.1.middle - cy - slope * (p.0 - cx)).powi(2)).sum();
    let freedom = n - 2.0;
    let all = residual / freedom;
    let noise = points.iter().map(|p| p.1.middle_u * p.1.middle_u).sum::<f64>() / n;
    let value = (all - noise).max(0.0).sqrt();
    // A variance from so many points is known to √(2/ν) of itself; chance makes it too small as well as too large.
    let u_square = (all.max(noise) * (2.0 / freedom).sqrt()).hypot(noise * u_noise);
    let size = value.max(u_square.sqrt()).max(f64::MIN_POSITIVE.sqrt());
    Ok(Read { value, u: 0.5 * u_square / size })
}
