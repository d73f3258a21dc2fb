//! From a correction on one vertical range to a correction on another, by a signal that both ranges can show.
//!
//! The signal is acquired on the old range and on the new one, in turn, and each leg is compared with itself: P on the
//! old range with P on the new, N likewise. What a leg does to the signal on either range (probe, bandwidth,
//! compensation) drops out, so that the correction keeps the meaning it has on the old range: made in situ, it is still
//! that of the real common mode. The tips need not even see the same node. Skew follows likewise:
//! `τ_B = τ_A + (delay of N from old to new) − (delay of P)`; when each range was triggered drops out of the difference.
//!
//! Where both tips do see one node there is another way: deskew on the new range outright. Its noise is less: what is
//! transferred is that very estimate times correction over what the same signal gives on the old range, so it carries
//! the noise of four records and of the correction instead of two. But it is the correction of *this* signal. It is
//! therefore used only if the same signal, deskewed on the old range, confirms the correction; otherwise the pair has
//! drifted or its response makes the two signals differ, and both numbers are told.

mod levels;

pub use levels::{Levels, RangeLine, levels};

use super::deskew::{Combined, LEAST_DITHER, combine, weighted};
use super::record::Record;
use super::skew::{Reference, SkewError, SkewEstimate, Warning, estimate_records};
use super::{Correction, Estimate};

/// The way to a quantity on the new range.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Way {
    /// As on the old range, with a stated uncertainty more. Skew only.
    Carried,
    /// From both legs on the new range, both tips on one node.
    Common,
    /// Each leg compared with itself on the two ranges.
    Legs,
}

impl Way {
    /// Its name in the API and in files.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Carried => "carried",
            Self::Common => "common",
            Self::Legs => "legs",
        }
    }
}

/// Which ways may be taken.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub enum Choice {
    /// For skew, and for gain and offset, whichever has the smaller uncertainty.
    #[default]
    Best,
    /// [`Way::Common`] only.
    Common,
    /// [`Way::Legs`], and for skew also [`Way::Carried`].
    Legs,
}

impl Choice {
    /// The choices with their names in files and in the API.
    pub const NAMES: [(&'static str, Self); 3] = [("best", Self::Best), ("common", Self::Common), ("legs", Self::Legs)];

    /// Its name in files and in the API.
    #[must_use]
    pub fn name(self) -> &'static str {
        Self::NAMES.iter().find(|(_, choice)| *choice == self).map_or("", |(name, _)| name)
    }
}

/// Why nothing could be transferred.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum TransferError {
    /// A leg's records on the two ranges cannot be compared.
    #[error("comparing the {leg} leg on the old range with itself on the new one: {source}")]
    Leg {
        /// `positive` or `negative`.
        leg: &'static str,
        /// What the comparison says; its two "legs" are the two ranges, old and new.
        source: SkewError,
    },
    /// No repeat was given.
    #[error("no acquisition was given; acquire the signal on both ranges")]
    NoRepeats,
    /// The way asked for needs a common node, and the legs show none.
    #[error("the legs see no common signal on both ranges: put both tips on one node, or compare leg by leg (`legs`)")]
    NotCommon,
}

/// Both ways' estimates from one acquisition on each range.
#[derive(Debug, Clone, PartialEq)]
pub struct Repeat {
    /// The positive leg: new range against old.
    pub positive: SkewEstimate,
    /// The negative leg: new range against old.
    pub negative: SkewEstimate,
    /// Both legs against each other, on the old range and on the new one; none where they show no common signal.
    pub common: Option<[SkewEstimate; 2]>,
    /// Over how many converter steps the signal moves, twice its rms, on the range and the leg where it is least.
    pub steps: f64,
}

/// Estimates from one acquisition on each range, positive leg first. The scope's own skew settings are the same in both.
///
/// # Errors
/// When a leg's two records cannot be compared: other intervals, clipped, no movement.
pub fn compare(old: &[Record; 2], new: &[Record; 2], reference: &Reference) -> Result<Repeat, TransferError> {
    let leg = |leg, index: usize| {
        estimate_records(&old[index], &new[index], reference).map_err(|source| TransferError::Leg { leg, source })
    };
    let both = |[p, n]: &[Record; 2]| estimate_records(p, n, reference).ok();
    let (positive, negative) = (leg("positive", 0)?, leg("negative", 1)?);
    let steps = |found: &SkewEstimate, index: usize| {
        2.0 * found.signal_rms_v / old[index].step_v.max(new[index].step_v).max(f64::MIN_POSITIVE)
    };
    Ok(Repeat {
        common: both(old).zip(both(new)).map(|(old, new)| [old, new]),
        steps: steps(&positive, 0).min(steps(&negative, 1)),
        positive,
        negative,
    })
}

/// A correction on the new range, and how it came about.
#[derive(Debug, Clone, PartialEq)]
pub struct Transferred {
    /// Skew, gain and offset on the new range.
    pub correction: Correction,
    /// Where the skew is from.
    pub skew_way: Way,
    /// Where gain and offset are from.
    pub level_way: Way,
    /// How far the same signal, deskewed on the old range, is from the correction, where that is more than chance.
    pub disagreements: Vec<Disagreement>,
    /// How many repeats there were.
    pub repeats: usize,
    /// Over how many converter steps the signal moves where it is least, if these are so few that the converters' own
    /// non-linearity, which is in no uncertainty here, may matter.
    pub few_steps: Option<f64>,
    /// What a person should know of the estimates.
    pub warnings: Vec<Warning>,
}

/// That a quantity on the old range is not what the correction says.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Disagreement {
    /// Which.
    pub quantity: Quantity,
    /// What the signal gives now, less what the correction says.
    pub apart: Estimate,
}

/// A quantity of a correction.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Quantity {
    /// g.
    Gain,
    /// o in volts.
    Offset,
    /// τ in seconds.
    Skew,
}

/// Converter steps that a signal should move over: an integral non-linearity of 0.3 steps, usual for a scope's 8 bits
/// (common practice, no source), is then 0.3 % of it, and on fewer more.
pub const FEW_STEPS: f64 = 100.0;

/// Standard uncertainties beyond which two estimates do not differ by chance: 0.3 % of those that agree exceed it.
const CHANCE: f64 = 3.0;

/// Transfers `correction` by `repeats`. `carry_u_s` is the standard uncertainty that carrying the skew to the new range
/// unmeasured would add, if it is known; nought is as good as unknown, for no two ranges are quite alike.
/// `alike_u_s` is the standard uncertainty of a skew from this signal that no scatter shows (see
/// [`super::deskew::sampled_alike`]).
///
/// # Errors
/// Without repeats, and where `choice` wants a common node and there is none.
pub fn transfer(
    correction: &Correction,
    repeats: &[Repeat],
    carry_u_s: Option<f64>,
    alike_u_s: f64,
    choice: Choice,
) -> Result<Transferred, TransferError> {
    let pick = |of: fn(&Repeat) -> &SkewEstimate| {
        let all: Vec<SkewEstimate> = repeats.iter().map(|repeat| of(repeat).clone()).collect();
        combine(&all).ok_or(TransferError::NoRepeats)
    };
    let (positive, negative) = (pick(|repeat| &repeat.positive)?, pick(|repeat| &repeat.negative)?);
    let common = common(repeats).map(|both| {
        both.map(|mut one| {
            one.skew_s.estimate.u = one.skew_s.estimate.u.hypot(alike_u_s);
            one
        })
    });
    let disagreements = common.as_ref().map_or_else(Vec::new, |[old, _]| disagreements(correction, old));
    let differs = |quantities: &[Quantity]| disagreements.iter().any(|found| quantities.contains(&found.quantity));
    let on_new = common.as_ref().map(|[_, new]| new.correction());
    if choice == Choice::Common && on_new.is_none() {
        return Err(TransferError::NotCommon);
    }
    // A way that was asked for by name is taken; of all ways only those that nothing speaks against.
    let with_common = |quantities: &[Quantity]| match choice {
        Choice::Best => on_new.filter(|_| !differs(quantities)),
        Choice::Common => on_new,
        Choice::Legs => None,
    };

    let mut skews = Vec::new();
    let mut level_ways = Vec::new();
    if choice != Choice::Common {
        let moved = moved(repeats);
        let legs = Estimate { value: correction.skew_s.value + moved.value, u: correction.skew_s.u.hypot(moved.u) };
        skews.push((Way::Legs, legs));
        skews.extend(carry_u_s.filter(|u_s| *u_s > 0.0).map(|carry_u_s| {
            let u = correction.skew_s.u.hypot(carry_u_s);
            (Way::Carried, Estimate { value: correction.skew_s.value, u })
        }));
        level_ways.push((Way::Legs, levels(correction, &RangeLine::of(&positive), &RangeLine::of(&negative))));
    }
    skews.extend(with_common(&[Quantity::Skew]).map(|new| (Way::Common, new.skew_s)));
    level_ways.extend(with_common(&[Quantity::Gain, Quantity::Offset]).map(|new| {
        let levels = Levels { gain: new.gain, offset_v: new.offset_v, gain_offset: new.gain_offset };
        (Way::Common, levels)
    }));
    let skew = skews.into_iter().min_by(|(_, a), (_, b)| a.u.total_cmp(&b.u)).ok_or(TransferError::NotCommon)?;
    let level = level_ways.into_iter().min_by(|(_, a), (_, b)| a.gain.u.total_cmp(&b.gain.u));
    let ((skew_way, skew_s), (level_way, level)) = (skew, level.ok_or(TransferError::NotCommon)?);
    Ok(Transferred {
        correction: Correction { skew_s, gain: level.gain, offset_v: level.offset_v, gain_offset: level.gain_offset },
        skew_way,
        level_way,
        disagreements,
        repeats: repeats.len(),
        few_steps: repeats.iter().map(|repeat| repeat.steps).reduce(f64::min).filter(|steps| *steps < FEW_STEPS),
        warnings: {
            let taken = [skew_way, level_way].contains(&Way::Common);
            let of_common = common.iter().filter(|_| taken).flat_map(|[_, new]| new.warnings.clone());
            warnings(&[&positive, &negative]).into_iter().chain(of_common).collect()
        },
    })
}

/// Whether more repeats would add little: the correction's own uncertainty is most of what there is, or the wanted one
/// (standard, skew in seconds) is reached.
#[must_use]
pub fn enough(found: &Transferred, from: &Correction, target_u_gain: f64, target_u_skew_s: f64) -> bool {
    // A fifth more than what was there before: the transfer's own part is then two thirds of it.
    let reached = |u: f64, before: f64, target: f64| u <= (1.2 * before).max(target);
    found.repeats > 1
        && reached(found.correction.gain.u, from.gain.u, target_u_gain)
        && reached(found.correction.skew_s.u, from.skew_s.u, target_u_skew_s)
}

/// Both legs against each other on the old range and on the new one, where every repeat shows a common signal.
fn common(repeats: &[Repeat]) -> Option<[Combined; 2]> {
    let all: Option<Vec<&[SkewEstimate; 2]>> = repeats.iter().map(|repeat| repeat.common.as_ref()).collect();
    let all = all?;
    let side = |index: usize| combine(&all.iter().map(|both| both[index].clone()).collect::<Vec<_>>());
    Some([side(0)?, side(1)?])
}

/// By how much more the negative leg is delayed on the new range than the positive one, in seconds.
fn moved(repeats: &[Repeat]) -> Estimate {
    let each = |repeat: &Repeat| {
        let (p, n) = (repeat.positive.skew_s, repeat.negative.skew_s);
        Estimate { value: n.value - p.value, u: n.u.hypot(p.u) }
    };
    let dithered = |estimate: &SkewEstimate| estimate.dither_steps.is_none_or(|steps| steps >= LEAST_DITHER);
    let independent = repeats.iter().all(|repeat| dithered(&repeat.positive) && dithered(&repeat.negative));
    weighted(&repeats.iter().map(each).collect::<Vec<_>>(), independent).estimate
}

/// Where the same signal on the old range does not confirm the correction.
fn disagreements(correction: &Correction, old: &Combined) -> Vec<Disagreement> {
    let found = old.correction();
    let pairs = [
        (Quantity::Gain, found.gain, correction.gain),
        (Quantity::Offset, found.offset_v, correction.offset_v),
        (Quantity::Skew, found.skew_s, correction.skew_s),
    ];
    let one = |(quantity, now, then): (Quantity, Estimate, Estimate)| {
        let apart = Estimate { value: now.value - then.value, u: now.u.hypot(then.u) };
        (apart.value.abs() > CHANCE * apart.u).then_some(Disagreement { quantity, apart })
    };
    pairs.into_iter().filter_map(one).collect()
}

/// What of the legs' comparisons holds for two ranges as it does for two legs, each kind once.
fn warnings(combined: &[&Combined]) -> Vec<Warning> {
    let mut found: Vec<Warning> = Vec::new();
    for warning in combined.iter().flat_map(|combined| &combined.warnings) {
        let kept = matches!(warning, Warning::LittleDither { .. });
        let kind = std::mem::discriminant(warning);
        if kept && found.iter().all(|known| std::mem::discriminant(known) != kind) {
            found.push(warning.clone());
        }
    }
    found
}

#[cfg(test)]
mod tests;
