//! Which bins of the spectrum the reference excites, and how much noise there is.

use realfft::num_complex::Complex;
use std::collections::BTreeMap;
use std::ops::Range;

/// The highest frequency that is fitted, relative to the sample rate: beyond it a fast edge's aliases are not far below
/// the edge itself, and an alias does not follow a delay as its frequency would.
const HIGHEST: f64 = 0.2;

/// The fewest bins that give a floor.
const ENOUGH: usize = 64;

/// A run of bins of one band of half a decade.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Band {
    pub(super) from_hz: f64,
    pub(super) to_hz: f64,
    /// Where its bins are among those kept.
    pub(super) range: Range<usize>,
}

/// The choice of bins.
#[derive(Debug, Clone)]
pub(super) struct Bins {
    /// Indices of excited bins, rising.
    pub(super) kept: Vec<usize>,
    pub(super) bands: Vec<Band>,
}

/// How a harmonic counts: a symmetric square excites only the odd ones.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Kind {
    Any,
    Between,
    Even,
    Odd,
}

#[derive(Debug, Default)]
struct Group {
    bins: Vec<usize>,
    cross: f64,
    power: f64,
}

impl Group {
    /// Power per bin that the legs share.
    fn common(&self) -> f64 {
        self.cross / self.bins.len() as f64
    }

    /// Power per bin that they do not share.
    fn own(&self) -> f64 {
        (self.power - self.cross) / self.bins.len() as f64
    }
}

/// Sorts the bins of `p` and `x` (bin 0 first, `length` samples) by the power that the legs share in their group: band
/// and kind of harmonic. Whole groups are judged, so that no bin is chosen for its noise.
pub(super) fn choose(
    p: &[Complex<f64>],
    x: &[Complex<f64>],
    length: usize,
    interval_s: f64,
    periods: Option<usize>,
) -> Bins {
    let bin_hz = 1.0 / (length as f64 * interval_s);
    let last = ((HIGHEST * length as f64) as usize).min(p.len() - 1);
    let mut groups: BTreeMap<(i32, Kind), Group> = BTreeMap::new();
    for k in 1..=last {
        let kind = match periods {
            None => Kind::Any,
            Some(periods) if !k.is_multiple_of(periods) => Kind::Between,
            Some(periods) if (k / periods).is_multiple_of(2) => Kind::Even,
            Some(_) => Kind::Odd,
        };
        let band = (2.0 * (k as f64 * bin_hz).log10()).floor() as i32;
        let group = groups.entry((band, kind)).or_default();
        group.bins.push(k);
        group.cross += (p[k] * x[k].conj()).re;
        group.power += 0.5 * (p[k].norm_sqr() + x[k].norm_sqr());
    }
    let floor = |least: usize| {
        let own = groups.values().filter(|group| group.bins.len() >= least).map(Group::own);
        own.filter(|own| *own > 0.0).fold(f64::INFINITY, f64::min)
    };
    let floor = if floor(ENOUGH).is_finite() { floor(ENOUGH) } else { floor(1) };
    let mut kept: Vec<usize> = Vec::new();
    for group in groups.values() {
        // A group of few bins may share as much by chance.
        let chance = 6.0 / (group.bins.len() as f64).sqrt();
        if group.common() > floor * (1.0 + chance) {
            kept.extend(&group.bins);
        }
    }
    kept.sort_unstable();
    Bins { bands: bands(&kept, bin_hz), kept }
}

fn bands(kept: &[usize], bin_hz: f64) -> Vec<Band> {
    let number = |k: usize| (2.0 * (k as f64 * bin_hz).log10()).floor() as i32;
    let mut bands = Vec::new();
    let mut start = 0;
    for run in kept.chunk_by(|a, b| number(*a) == number(*b)) {
        let lower = f64::from(number(run[0]));
        bands.push(Band {
            from_hz: 10f64.powf(lower / 2.0),
            to_hz: 10f64.powf((lower + 1.0) / 2.0),
            range: start..start + run.len(),
        });
        start += run.len();
    }
    bands
}

/// Noise power per bin of both legs from two independent spectra of each: the power of their differences, less what the
/// legs' differences share (the trigger's jitter moves both legs alike). Holds for the difference; of `1/a + 1/b` shares
/// the means of a and b acquisitions have `1/a` and `1/b`.
pub(super) fn noise(p: [&[Complex<f64>]; 2], x: [&[Complex<f64>]; 2]) -> (f64, f64) {
    let last = ((HIGHEST * 2.0 * p[0].len() as f64) as usize).min(p[0].len() - 1).max(1);
    let mean = |value: &dyn Fn(Complex<f64>, Complex<f64>) -> f64| {
        let one = |k: usize| value(p[0][k] - p[1][k], x[0][k] - x[1][k]);
        (1..=last).map(one).sum::<f64>() / last as f64
    };
    let shared = mean(&|p, x| (p * x.conj()).re);
    let rest = |power: f64| (power - shared).max(power / 10.0);
    (rest(mean(&|p, _| p.norm_sqr())), rest(mean(&|_, x| x.norm_sqr())))
}
