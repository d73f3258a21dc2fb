//! Settling: the time from the 50 % point of a transition until the waveform stays within a band round the level of its
//! new state (IEEE Std 181: transition settling duration).
//!
//! Like transitions are laid over each other and averaged first, then smoothed over a third of their duration if the noise
//! asks for it: a single noisy sample outside the band must not count. What noise is left must lie well inside the band.
//! How unsure the moment is, is read off by widening and narrowing the band: with ringing it jumps from peak to peak.

use super::super::signal::Signal;
use super::super::transition::Transition;
use super::compute::{Bench, Found};
use super::shape::{Read, Reading};
use super::sources::Parts;

/// So many samples are averaged in each direction: enough, and a tenth of a pass over a long record.
const MOST_SAMPLES: usize = 131_072;

/// Noise must be this many times below the band: of ten thousand samples the largest is at four.
const CLEAR: f64 = 4.5;

/// The part of the stay's end at which it must have settled.
const TAIL: f64 = 0.05;

/// The average of like transitions, from 0 to 1, a value per sample.
struct Profile {
    values: Vec<f64>,
    /// Rms noise of a value.
    noise: f64,
}

/// The stays that are laid over each other: where each 50 % point is, in samples, and how many samples before and after it.
struct Stays {
    rising: bool,
    middles: Vec<f64>,
    lead: usize,
    length: usize,
    duration: f64,
}

impl Bench<'_> {
    pub(super) fn settling(&self) -> Result<Found, String> {
        let levels = self.layout.levels.as_ref().map_err(ToString::to_string)?;
        let noise = self.sources.mean_noise_v;
        let band = self.input.asked.settling_band;
        let amplitude = self.shape.amplitude;
        // What the level itself may be off counts as much as the noise of the waveform.
        let of_level =
            [levels.low, levels.high].map(|l| noise.max(l.spread) / (l.count.max(1) as f64).sqrt() / amplitude);
        let stays: Vec<Stays> = [true, false].into_iter().filter_map(|rising| self.stays(rising)).collect();
        if stays.is_empty() {
            return Err("the record holds no transition with room after it".to_owned());
        }
        let difference = &self.input.corrected.difference_v;
        let profiles: Vec<Profile> = stays
            .iter()
            .map(|s| Profile::of(difference, s, self.layout.between(), noise, 0.5 * band / CLEAR))
            .collect();
        let both: Vec<Read> = profiles
            .iter()
            .zip(&stays)
            .map(|(profile, s)| profile.read(band, of_level[usize::from(s.rising)]))
            .collect::<Result<_, _>>()?;
        let count = both.len() as f64;
        let value = both.iter().map(|r| r.value).sum::<f64>() / count;
        let u = both.iter().map(|r| r.u * r.u).sum::<f64>().sqrt() / count;
        let [gain, skew] = self.by_moving(|signal, between| {
            let one = |s: &Stays| Profile::of(signal, s, between, noise, 0.5 * band / CLEAR).settled(band);
            stays.iter().map(one).sum::<Option<f64>>().map(|sum| sum / count)
        });
        let within = |part: f64| {
            let moved = |by: f64| profiles.iter().map(|p| p.settled(band + by).unwrap_or_else(|| p.end())).sum::<f64>();
            // A disturbance as wide as the band could hold the waveform out of it for as long as it likes.
            if part < band { 0.5 * (moved(-part) - moved(part)).abs() / count } else { value }
        };
        let parts = Parts {
            noise: u,
            gain,
            skew,
            quantisation: within(self.sources.quantisation_v / amplitude),
            ..Parts::default()
        };
        let leak = within(self.input.leak.peak_v / amplitude);
        Ok(Found { value, parts, leak, size: value }.times(self.input.corrected.interval_s))
    }

    /// The stays after transitions of one direction that are about as long as the longest; `None` without any.
    fn stays(&self, rising: bool) -> Option<Stays> {
        let points = self.input.corrected.difference_v.len();
        let of = |(i, t): &(usize, Transition)| {
            // Until the next transition begins: as long before its middle as this one takes from its beginning to its end.
            let edges = &self.layout.edges;
            let next = edges.get(i + 1).map_or(points as f64 - 1.0, |e| e.from as f64 - 2.0 * t.duration);
            // From a little before the 50 % point, so that it can be found again.
            let lead = (t.middle - edges[*i].from as f64).ceil() + 2.0;
            (t.middle, lead, next - t.middle, t.duration)
        };
        let all: Vec<_> = self.shape.measured.iter().filter(|(_, t)| t.rising == rising).map(of).collect();
        let longest = all.iter().map(|s| s.2).fold(0.0, f64::max);
        let lead = all.iter().map(|s| s.1).fold(0.0, f64::max);
        let duration = all.iter().map(|s| s.3).sum::<f64>() / all.len().max(1) as f64;
        let like: Vec<_> = all.iter().filter(|s| s.2 >= 0.9 * longest && s.0 > lead).collect();
        let length = like.iter().map(|s| s.2).fold(f64::INFINITY, f64::min);
        if like.is_empty() || length.is_nan() || length < 2.0 * duration + 8.0 {
            return None;
        }
        let (lead, length) = (lead as usize, length as usize - 1);
        let most = (MOST_SAMPLES / (lead + length)).max(1);
        let step = like.len().div_ceil(most);
        Some(Stays { rising, middles: like.iter().step_by(step).map(|s| s.0).collect(), lead, length, duration })
    }
}

impl Profile {
    /// Smoothed where the noise, as a part of the amplitude, would be above `most`.
    fn of<S: Signal + ?Sized>(signal: &S, stays: &Stays, (low, high): (f64, f64), noise: f64, most: f64) -> Self {
        let length = stays.lead + stays.length;
        let mut sum = vec![0.0f32; length];
        let mut part = vec![0.0f32; length + 1];
        for middle in &stays.middles {
            let whole = middle.floor();
            let share = (middle - whole) as f32;
            signal.load(whole as usize - stays.lead, &mut part);
            for (sum, w) in sum.iter_mut().zip(part.windows(2)) {
                *sum += w[0] + share * (w[1] - w[0]);
            }
        }
        let count = stays.middles.len() as f64;
        let (zero, scale) = if stays.rising { (low, 1.0) } else { (high, -1.0) };
        let scale = scale / (high - low);
        let mut values: Vec<f64> = sum.iter().map(|x| (f64::from(*x) / count - zero) * scale).collect();
        let mut noise = noise / (high - low) / count.sqrt();
        let half = (stays.duration / 6.0) as usize;
        if noise > most && half > 0 {
            values = smooth(&values, half);
            noise /= ((2 * half + 1) as f64).sqrt();
        }
        Self { values, noise }
    }

    /// From the 50 % point to the last time that the band is entered, in samples; `None` when that is at the very end.
    fn settled(&self, band: f64) -> Option<f64> {
        let v = &self.values;
        let up = v.windows(2).position(|w| w[0] < 0.5 && w[1] >= 0.5)?;
        let middle = up as f64 + (0.5 - v[up]) / (v[up + 1] - v[up]);
        let outside = |x: f64| (x - 1.0).abs() - band;
        let last = v.iter().rposition(|x| outside(*x) > 0.0)?;
        if last + 1 + ((TAIL * v.len() as f64) as usize).max(1) >= v.len() {
            return None;
        }
        let (a, b) = (outside(v[last]), outside(v[last + 1]));
        Some(last as f64 + a / (a - b) - middle)
    }

    /// The longest settling that could be seen.
    fn end(&self) -> f64 {
        self.values.len() as f64
    }

    fn read(&self, band: f64, of_level: f64) -> Reading {
        let percent = (1e8 * band).round() / 1e6;
        if CLEAR * self.noise > band {
            return Err(format!(
                "the noise is too large to see the waveform settle within {percent} %: averaged over like transitions it \
                 is {:.2} % of the amplitude; average more sweeps, or take a longer record or a wider band",
                100.0 * self.noise
            ));
        }
        let value = self.settled(band).ok_or_else(|| {
            format!("the waveform does not stay within {percent} % of its level in the time that it has")
        })?;
        let off = self.noise.hypot(of_level);
        let moved = |by: f64| self.settled(band + by).unwrap_or_else(|| self.end());
        Ok(Read { value, u: 0.25 * (moved(-2.0 * off) - moved(2.0 * off)).abs() })
    }
}

/// Means over `2·half + 1` values; fewer at the ends.
fn smooth(values: &[f64], half: usize) -> Vec<f64> {
    let mut sums = Vec::with_capacity(values.len() + 1);
    sums.push(0.0);
    let mut sum = 0.0;
    sums.extend(values.iter().map(|x| {
        sum += x;
        sum
    }));
    let mean = |i: usize| {
        let (from, to) = (i.saturating_sub(half), (i + half + 1).min(values.len()));
        (sums[to] - sums[from]) / (to - from) as f64
    };
    (0..values.len()).map(mean).collect()
}
