//! Which bins of the spectrum the reference excites, and which show the noise alone.

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
    /// Indices of bins without signal.
    pub(super) quiet: Vec<usize>,
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
    let mut quiet: Vec<usize> = Vec::new();
    for group in groups.values() {
        // A group of few bins may share as much by chance.
        let chance = 6.0 / (group.bins.len() as f64).sqrt();
        if group.common() > floor * (1.0 + chance) {
            kept.extend(&group.bins);
        } else if group.common() < floor * (0.3 + chance) && group.own() < floor * (1.15 + chance) {
            quiet.extend(&group.bins);
        }
    }
    kept.sort_unstable();
    quiet.sort_unstable();
    Bins { bands: bands(&kept, bin_hz), kept, quiet }
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

/// Noise power per bin of both legs from the quiet bins, less what the legs share there. `None` when they are too few.
pub(super) fn noise(p: &[Complex<f64>], x: &[Complex<f64>], quiet: &[usize]) -> Option<(f64, f64)> {
    if quiet.len() < ENOUGH {
        return None;
    }
    let count = quiet.len() as f64;
    let mean = |value: &dyn Fn(usize) -> f64| quiet.iter().map(|&k| value(k)).sum::<f64>() / count;
    let shared = mean(&|k| (p[k] * x[k].conj()).re);
    let rest = |power: f64| (power - shared).max(power / 10.0);
    Some((rest(mean(&|k| p[k].norm_sqr())), rest(mean(&|k| x[k].norm_sqr()))))
}
