//! One response from two references: the filter from the fast one, gain, delay and the low-frequency term in situ.
//!
//! Each reference shows what it excites. A generator's fast edges reach to the top of the legs' bandwidth, but on a range
//! that suits them, and with a period too short for a probe's compensation. The node that is measured in situ has slower
//! edges, but the range, the levels and the period of the measurement. So the filter is fitted on the fast reference and
//! scaled to pass slow signals unchanged; with it carried out, gain, delay and the low-frequency term are fitted in situ. The
//! filter is a matter of bandwidth, which is carried from range to range as skew is. Where it does not hold in situ (the
//! whole fit on the in-situ reference alone reaches more there), that fit is taken.

use super::super::skew::Reference;
use super::super::{Correction, Record};
use super::{BandGain, Prior, Response, ResponseError, fit_after, words};

/// How much less rejection than the in-situ fit alone the combination may reach in situ, summed over its bands of half a
/// decade: it makes up for that above them.
const YIELDS_DB: f64 = 3.0;

/// Acquisitions of one reference.
#[derive(Debug, Clone, Copy)]
pub struct Acquired<'a> {
    /// Records of the positive leg.
    pub p: &'a [Record],
    /// Records of the negative leg, of the same acquisitions.
    pub n: &'a [Record],
    /// The correction that holds for them.
    pub correction: &'a Correction,
    /// What is known of the reference.
    pub reference: &'a Reference,
}

impl Acquired<'_> {
    fn fit(&self, prior: &Prior<'_>) -> Result<Response, ResponseError> {
        fit_after(self.p, self.n, self.correction, self.reference, prior)
    }
}

/// The response from the reference that gain is taken from and, where skew is taken from another whose filter holds for
/// the same sample interval, from that one too. `time_constant_s` is the probes' own, see [`Prior`].
///
/// # Errors
/// As [`fit_after`].
pub fn combined(
    gain: &Acquired<'_>,
    skew: Option<&Acquired<'_>>,
    time_constant_s: Option<f64>,
) -> Result<Response, ResponseError> {
    let prior = Prior { time_constant_s, filter: None };
    let alone = gain.fit(&prior)?;
    let Some(skew) = skew else { return Ok(alone) };
    let fast = skew.fit(&prior)?;
    if fast.taps.len() == 1 || (fast.interval_s / alone.interval_s - 1.0).abs() > 1e-6 {
        return Ok(alone);
    }
    let filter = filter_of(&fast);
    let slow = gain.fit(&Prior { time_constant_s, filter: Some(&filter) })?;
    let lost = |band: &BandGain| same(&slow, band).map_or(0.0, |other| band.after_db - other.after_db);
    if alone.improved.iter().map(lost).sum::<f64>() > YIELDS_DB {
        return Ok(alone);
    }
    Ok(join(&filter, &slow, &alone, &fast))
}

/// The filter alone, passing slow signals unchanged.
fn filter_of(fast: &Response) -> Response {
    let sum: f64 = fast.taps.iter().sum();
    let taps = fast.taps.iter().map(|tap| tap / sum).collect();
    Response { taps, pole_zero: None, level_v: 0.0, gain_u: 0.0, ..fast.clone() }
}

/// What was fitted after the filter, and the filter, as one.
fn join(filter: &Response, slow: &Response, alone: &Response, fast: &Response) -> Response {
    let factor: f64 = slow.taps.iter().sum();
    let before = |band: &BandGain| {
        // Without the filter.
        let before_db = same(alone, band).map_or(band.before_db, |other| other.before_db);
        // What noise hides in situ the fast edges may show, before and after: the filter was judged on them too.
        let hidden = band.after_db >= band.floor_db;
        let shown = same(fast, band).filter(|other| hidden && other.after_db > band.after_db);
        shown.unwrap_or(BandGain { before_db, ..*band })
    };
    let mut improved: Vec<BandGain> = slow.improved.iter().map(before).collect();
    let highest = improved.last().map_or(0.0, |band| band.to_hz);
    improved.extend(fast.improved.iter().filter(|band| band.from_hz >= highest * 0.999));
    let mut both = Response {
        skew_s: filter.skew_s + slow.skew_s,
        taps: filter.taps.iter().map(|tap| tap * factor).collect(),
        improved,
        ..slow.clone()
    };
    both.words = words::tell(&both, &[], true);
    both
}

/// What a response did in the same band.
fn same(response: &Response, band: &BandGain) -> Option<BandGain> {
    response.improved.iter().find(|other| (other.from_hz / band.from_hz - 1.0).abs() < 1e-6).copied()
}
