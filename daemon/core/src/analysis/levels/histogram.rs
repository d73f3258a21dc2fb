//! The histogram behind the state levels: splitting it in two and finding the mode of each half.

use std::ops::Range;

use super::super::signal::{BLOCK, Outline, Signal, blocks};
use super::super::wide::widest;

/// Bins over the record's range.
pub(super) const BINS: usize = 4096;

/// The last bin, as a place.
const LAST: f32 = (BINS - 1) as f32;

/// So many samples are enough for where a level is cut: its centre is right to a hundredth of the spread, of which the
/// mean within three spreads keeps a fortieth.
const ENOUGH: usize = 65_536;

/// A block whose samples range over less than this part of the whole range belongs to one state.
const STILL: f64 = 0.125;

/// Of every so many blocks in a row and of every so many samples of a block one is counted.
#[derive(Debug, Clone, Copy)]
struct Step {
    blocks: usize,
    samples: usize,
}

impl Step {
    const ONE: Self = Self { blocks: 1, samples: 1 };

    /// For so many samples in all. A state that is short against the record must not be passed over: at least a fourth
    /// of the blocks and sixteen samples of each count.
    fn of(points: usize) -> Self {
        let every = (points / ENOUGH).max(1);
        let blocks = every.min(4);
        Self { blocks, samples: (every / blocks).clamp(1, BLOCK / 16) }
    }
}

/// What [`Histogram::settle`] finds.
pub(super) struct Settled {
    pub(super) centre: f64,
    pub(super) spread: f64,
    pub(super) mean: f64,
    pub(super) count: f64,
}

/// How often a signal takes which values.
pub(super) struct Histogram {
    low: f64,
    bin: f64,
    counts: Vec<f64>,
}

/// Counts samples in bins.
struct Counter {
    bin: f64,
    origin: f32,
    scale: f32,
    /// Neighbouring samples often fall into one bin; four tables spare them waiting for each other.
    tables: Vec<[u32; BINS]>,
}

impl Counter {
    fn new(low: f64, high: f64) -> Option<Self> {
        let bin = (high - low) / BINS as f64;
        (bin > 0.0 && bin.is_finite()).then(|| Self {
            bin,
            origin: low as f32,
            scale: (1.0 / bin) as f32,
            tables: vec![[0; BINS]; 4],
        })
    }

    /// Counts the samples of a block that a step chooses, each for all that it stands for.
    fn count(&mut self, part: &[f32], step: Step) {
        let mut chosen = [0.0f32; BLOCK];
        let part = if step.samples == 1 {
            part
        } else {
            let count = part.len().div_ceil(step.samples);
            chosen.iter_mut().zip(part.iter().step_by(step.samples)).for_each(|(out, x)| *out = *x);
            &chosen[..count]
        };
        let weight = (step.blocks * step.samples) as u32;
        let mut places = [0u16; BLOCK];
        let places = &mut places[..part.len()];
        places_of(part, self.origin, self.scale, places);
        for four in places.chunks(4) {
            for (table, place) in self.tables.iter_mut().zip(four) {
                table[usize::from(*place) % BINS] += weight;
            }
        }
    }

    fn finish(self, low: f64) -> Histogram {
        let counts = (0..BINS).map(|i| self.tables.iter().map(|table| f64::from(table[i])).sum()).collect();
        Histogram { low, bin: self.bin, counts }
    }
}

widest! {
    /// The bins of some samples.
    fn places_of(part: &[f32], origin: f32, scale: f32, places: &mut [u16]) {
        for (place, x) in places.iter_mut().zip(part) {
            // Clamped as a number: what is no number counts as the lowest.
            let at = (x - origin) * scale;
            let at = if at > 0.0 { at } else { 0.0 };
            let at = if at < LAST { at } else { LAST };
            *place = at as i32 as u16;
        }
    }
}

impl Histogram {
    /// Of a whole signal between its lowest and highest value; `None` when they are equal or one is not finite. In
    /// blocks of a long record that range over little, a part of the samples stands for all.
    pub(super) fn of<S: Signal + ?Sized>(signal: &S, outline: &Outline) -> Option<Self> {
        let (low, high) = outline.range();
        let mut counter = Counter::new(low, high)?;
        let points = signal.points();
        let step = Step::of(points);
        let little = ((high - low) * STILL) as f32;
        // Every so many-th of the blocks that follow each other without a transition, the first one always.
        let mut still = 0;
        for (block, (least, most)) in outline.blocks.iter().enumerate() {
            let range = block * BLOCK..((block + 1) * BLOCK).min(points);
            if most - least >= little {
                still = 0;
                blocks(signal, range, |_, part| counter.count(part, Step::ONE));
            } else {
                if still % step.blocks == 0 {
                    blocks(signal, range, |_, part| counter.count(part, step));
                }
                still += 1;
            }
        }
        Some(counter.finish(low))
    }

    /// Of some stretches of a signal; samples below `low` or above `high` count in the first or the last bin. In long
    /// stretches a part of the samples stands for all.
    pub(super) fn within<S: Signal + ?Sized>(
        signal: &S,
        stretches: &[Range<usize>],
        low: f64,
        high: f64,
    ) -> Option<Self> {
        let mut counter = Counter::new(low, high)?;
        let step = Step::of(stretches.iter().map(Range::len).sum());
        for stretch in stretches {
            for from in stretch.clone().step_by(step.blocks * BLOCK) {
                blocks(signal, from..(from + BLOCK).min(stretch.end), |_, part| counter.count(part, step));
            }
        }
        Some(counter.finish(low))
    }

    /// The value below which a share of the samples lies.
    pub(super) fn quantile(&self, share: f64) -> f64 {
        let wanted = share * self.counts.iter().sum::<f64>();
        let mut below = 0.0;
        for (i, n) in self.counts.iter().enumerate() {
            if below + n >= wanted && *n > 0.0 {
                return ((wanted - below) / n + i as f64).mul_add(self.bin, self.low);
            }
            below += n;
        }
        self.value(BINS as f64 - 1.0)
    }

    /// The samples within a distance of a centre: their number, and the sum of their distances with sign. `side`
    /// limits it to values above (or not above) a threshold.
    fn around(&self, side: &Range<usize>, centre: f64, reach: f64) -> (f64, f64) {
        let place = |x: f64| ((x - self.low) / self.bin).max(0.0) as usize;
        let first = place(centre - reach).clamp(side.start, side.end);
        let last = (place(centre + reach) + 1).clamp(first, side.end);
        self.counts[first..last]
            .iter()
            .enumerate()
            .map(|(k, n)| (n, self.value((first + k) as f64) - centre))
            .filter(|(_, distance)| distance.abs() <= reach)
            .fold((0.0, 0.0), |(count, sum), (n, distance)| (count + n, sum + n * distance))
    }

    /// The median distance of one side's samples from a centre.
    fn median_distance(&self, side: &Range<usize>, centre: f64) -> f64 {
        let half = 0.5 * self.counts[side.clone()].iter().sum::<f64>();
        let place = (centre - self.low) / self.bin;
        let (mut down, mut up) = ((place.max(0.0) as usize).clamp(side.start, side.end), 0);
        up += down;
        let (mut count, mut distance) = (0.0, 0.0);
        // Outwards bin by bin, always the nearer one next.
        while count < half && (down > side.start || up < side.end) {
            let below = if down > side.start { place - (down as f64 - 0.5) } else { f64::INFINITY };
            let above = if up < side.end { up as f64 + 0.5 - place } else { f64::INFINITY };
            let bin = if below < above {
                down -= 1;
                down
            } else {
                up += 1;
                up - 1
            };
            count += self.counts[bin];
            distance = below.abs().min(above.abs());
        }
        distance * self.bin
    }

    /// The mean within three robust standard deviations of a centre, three passes, of the samples on one side of a
    /// threshold (of all without one): centre of the last pass, robust standard deviation (at least `least`), mean.
    pub(super) fn settle(&self, side: Option<(f64, bool)>, centre: f64, least: f64) -> Settled {
        let side = side.map_or(0..BINS, |(threshold, above)| self.side(threshold, above));
        let mut found = Settled { centre, spread: least, mean: centre, count: 0.0 };
        for _ in 0..3 {
            found.centre = found.mean;
            found.spread = (1.4826 * self.median_distance(&side, found.centre)).max(least);
            let (count, sum) = self.around(&side, found.centre, 3.0 * found.spread);
            found.count = count;
            found.mean = found.centre + if count > 0.0 { sum / count } else { 0.0 };
        }
        found
    }

    /// The bins on one side of a threshold.
    fn side(&self, threshold: f64, above: bool) -> Range<usize> {
        let cut = (((threshold - self.low) / self.bin) as usize).clamp(1, BINS - 1);
        if above { cut..BINS } else { 0..cut }
    }

    /// Width of a bin in the signal's unit.
    pub(super) fn bin(&self) -> f64 {
        self.bin
    }

    fn value(&self, place: f64) -> f64 {
        (place + 0.5).mul_add(self.bin, self.low)
    }

    /// The value that parts the samples into the two groups of the largest variance between them, taken half-way
    /// between the groups' means. Unlike the middle of the range it stands a few samples far out, and a state that
    /// holds only a few percent of the record.
    pub(super) fn threshold(&self) -> f64 {
        let total: f64 = self.counts.iter().sum();
        let moment: f64 = self.counts.iter().enumerate().map(|(i, n)| i as f64 * n).sum();
        let (mut below, mut first) = (0.0, 0.0);
        let mut best = (0.0, 0.5 * BINS as f64);
        for (i, n) in self.counts.iter().enumerate() {
            below += n;
            first += i as f64 * n;
            let above = total - below;
            if below <= 0.0 || above <= 0.0 {
                continue;
            }
            let (a, b) = (first / below, (moment - first) / above);
            let between = below * above * (b - a) * (b - a);
            if between > best.0 {
                best = (between, 0.5 * (a + b));
            }
        }
        self.value(best.1)
    }

    /// The most frequent value on one side of a threshold: the histogram smoothed by a Gaussian whose width suits the
    /// spread and the number of samples (0.9·s·n^(−1/5), Silverman's rule, common practice), its top by a parabola.
    pub(super) fn mode(&self, threshold: f64, above: bool) -> f64 {
        let side = self.side(threshold, above);
        let count: f64 = self.counts[side.clone()].iter().sum();
        let quantile = |share: f64| {
            let mut sum = 0.0;
            side.clone().find(|&i| {
                sum += self.counts[i];
                sum >= share * count
            })
        };
        let (q1, q3) = (quantile(0.25).unwrap_or(side.start), quantile(0.75).unwrap_or(side.start));
        let spread = (((q3 - q1) as f64) / 1.349).max(1.0);
        let width = (0.9 * spread * count.max(1.0).powf(-0.2)).max(1.0);
        let reach = (4.0 * width).ceil() as usize;
        let kernel: Vec<f64> = (0..=reach).map(|k| (-0.5 * (k as f64 / width).powi(2)).exp()).collect();
        let density = |i: usize| {
            let near = self.counts.get(i.saturating_sub(reach)..(i + reach + 1).min(BINS)).unwrap_or_default();
            let from = i.saturating_sub(reach);
            near.iter().enumerate().map(|(k, n)| n * kernel[(from + k).abs_diff(i)]).sum::<f64>()
        };
        let smooth: Vec<f64> = side.clone().map(density).collect();
        let top = (0..smooth.len()).reduce(|a, b| if smooth[b] > smooth[a] { b } else { a }).unwrap_or(0);
        let mut place = (side.start + top) as f64;
        if top > 0 && top + 1 < smooth.len() {
            let (a, b, c) = (smooth[top - 1], smooth[top], smooth[top + 1]);
            let bend = a - 2.0 * b + c;
            if bend < 0.0 {
                place += (0.5 * (a - c) / bend).clamp(-0.5, 0.5);
            }
        }
        self.value(place)
    }
}
