//! The mean square of the difference as the correction's errors move it, and the interval of the rms.

use super::super::apply::Moments;
use super::super::budget::{self, Basis, Coverage, Term};
use super::super::montecarlo::{self, Others, Power};
use super::FigureInput;
use super::sources::Sources;

/// The second order counts from this ratio of `b₂/(2·R)` to the first-order uncertainty on (b₂: what the correction's
/// errors add to the mean square on average). Below it ordinary intervals hold what they promise.
const LEAST_RATIO: f64 = 0.1;

/// From this relative uncertainty on, the root is too bent for a first-order budget.
const LEAST_BEND: f64 = 0.15;

/// The mean square as a function of gain, skew and offset errors. The noise that D, N_c and its slope share is taken
/// out of each moment; N_c and its slope, by the odd symmetry of the slope's coefficients, share none.
pub(super) fn model(input: &FigureInput<'_>, sources: &Sources, m: &Moments) -> Power {
    let corrected = input.corrected;
    let noise = sources.noise_v * sources.noise_v;
    let single = input.noise_n_v / sources.gain;
    let negative = single * single * corrected.noise_gain;
    // The five-point slope of white noise: (2·8² + 2·1²)/12² per sample interval squared.
    let slope_noise = single / corrected.interval_s;
    let steep = (m.ss - 130.0 / 144.0 * slope_noise * slope_noise).max(0.0);
    let (mb, ms, bs) = (m.n, -m.s, -m.ns);
    Power {
        measured: m.dd - noise,
        noise,
        points: corrected.difference_v.len(),
        u_noise: if input.allowance.noise_bins > 0 { (2.0 / input.allowance.noise_bins as f64).sqrt() } else { 0.0 },
        linear: [m.dn + negative, -m.ds, m.d],
        quadratic: [[(m.nn - negative).max(0.0), bs, mb], [bs, steep, ms], [mb, ms, 1.0]],
    }
}

/// The interval of the root of a power that had noise's part taken off, so that it may be hardly above nothing: that of the
/// power itself, whose uncertainty is `2·value·u`, and never below what it is where the root could be nothing, `4·u²`.
pub(super) fn of_root(value: f64, u: f64, terms: &[Term]) -> Coverage {
    let (half, basis) = budget::expanded(terms);
    if u <= LEAST_BEND * value {
        return Coverage { low: value - half, high: value + half, basis };
    }
    let (square, reach) = (value * value, 2.0 * half * value.max(2.0 * u));
    Coverage { low: (square - reach).max(0.0).sqrt(), high: (square + reach).sqrt(), basis: Basis::Propagated }
}

/// The interval of an rms of `value` with this budget.
pub(super) fn coverage(
    input: &FigureInput<'_>,
    sources: &Sources,
    moments: &Moments,
    value: f64,
    terms: &[Term],
) -> Coverage {
    let model = model(input, sources, moments);
    let first: Vec<Term> = terms.iter().filter(|t| t.name != "common mode").copied().collect();
    let u = budget::combined(&first);
    let errors = sources.power_errors();
    let second = model.second_order(&errors);
    let limited = second > LEAST_RATIO * 2.0 * value * u;
    if !limited && u <= LEAST_BEND * value {
        return Coverage::of(value, terms);
    }
    let added_v = sources.quantisation_v.hypot(sources.compensation.swing_v).hypot(sources.response.rms);
    let others = Others { scale_u: sources.scale_u, scale_half: sources.scale * 3.0f64.sqrt(), added_v };
    // Few repeats: drawn as wide as Student's distribution is at 95 % (JCGM 101, 6.4.9, to that point).
    let mut errors = sources.errors;
    errors.u.iter_mut().zip(sources.freedom).for_each(|(u, freedom)| *u *= budget::widening(freedom));
    let (low, high) = montecarlo::interval(&model, &errors, &others);
    // The measured value lies within its own interval, also where noise has made its square negative.
    let basis = if limited { Basis::CommonMode } else { Basis::Propagated };
    Coverage { low: low.min(value), high: high.max(value), basis }
}
