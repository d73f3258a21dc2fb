//! The histogram behind the state levels: splitting it in two and finding the mode of each half.

/// Bins over the record's range.
const BINS: usize = 4096;

/// How often a signal takes which values.
pub(super) struct Histogram {
    low: f64,
    bin: f64,
    counts: Vec<f64>,
}

impl Histogram {
    /// Of a signal; `None` when all its samples are equal or one is not finite.
    pub(super) fn of(signal: &[f64]) -> Option<Self> {
        let (low, high) = signal.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), &x| (l.min(x), h.max(x)));
        let bin = (high - low) / BINS as f64;
        if !(bin > 0.0 && bin.is_finite()) {
            return None;
        }
        let mut counts = vec![0.0; BINS];
        for &x in signal {
            counts[(((x - low) / bin) as usize).min(BINS - 1)] += 1.0;
        }
        Some(Self { low, bin, counts })
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
        let cut = (((threshold - self.low) / self.bin) as usize).clamp(1, BINS - 1);
        let side = if above { cut..BINS } else { 0..cut };
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
