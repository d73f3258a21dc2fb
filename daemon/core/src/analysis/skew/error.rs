//! What can be wrong with the records of a reference, and what is only worth telling.

use super::super::spectrum::SpectrumError;

/// Why skew, gain and offset could not be estimated.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum SkewError {
    /// Samples at the converter's ends.
    #[error(
        "the reference is clipped ({p} samples of the positive leg, {n} of the negative): use a larger vertical range"
    )]
    Clipped {
        /// Clipped samples of the positive leg.
        p: usize,
        /// Clipped samples of the negative leg.
        n: usize,
    },
    /// One leg does not move.
    #[error("the {leg} leg reads {level_v} V throughout: check its probe, its route and its channel")]
    Flat {
        /// `positive` or `negative`.
        leg: &'static str,
        /// What it reads.
        level_v: f64,
    },
    /// The gain is outside what two like legs can have.
    #[error(
        "the negative leg's gain comes out as {gain:.3e}: check that both channels are set to their probes' attenuation"
    )]
    Gain {
        /// The gain.
        gain: f64,
    },
    /// The records were not sampled alike.
    #[error("the legs have different sample intervals ({p_s} s and {n_s} s): read both from one acquisition")]
    Intervals {
        /// Of the positive leg, in seconds.
        p_s: f64,
        /// Of the negative leg, in seconds.
        n_s: f64,
    },
    /// One leg is upside down.
    #[error(
        "the legs mirror each other (correlation {correlation:.3}): a probe's tip and ground are swapped, a channel is \
         inverted, or the skew is near half a period of a reference that mirrors itself, such as a sine: then use a longer \
         period"
    )]
    Inverted {
        /// Correlation coefficient at the mirrored place.
        correlation: f64,
    },
    /// The records differ in length.
    #[error("the legs have different numbers of samples ({p} and {n}): read both from one acquisition")]
    Lengths {
        /// Of the positive leg.
        p: usize,
        /// Of the negative leg.
        n: usize,
    },
    /// The legs do not show the same signal.
    #[error(
        "the legs see no common signal (best correlation {correlation:.3}, {needed:.3} needed): check that both tips are on the reference"
    )]
    NoCommonSignal {
        /// The best correlation coefficient.
        correlation: f64,
        /// What it must reach.
        needed: f64,
    },
    /// Shifted against each other the records hardly overlap.
    #[error("after a skew of {skew_s} s only {samples} samples are left in common: use a longer record")]
    NothingLeft {
        /// The skew found so far, in seconds.
        skew_s: f64,
        /// Samples left.
        samples: usize,
    },
    /// The record holds no sine that could be fitted.
    #[error(
        "no sine could be fitted (about {periods:.1} periods in the record): use a record of two periods or more of a sine"
    )]
    NoSine {
        /// Periods in the record where the fit was given up.
        periods: f64,
    },
    /// A sample or the interval is not a usable number.
    #[error("{what} is not a usable number: read the records again")]
    NotFinite {
        /// What was not finite.
        what: &'static str,
    },
    /// The steps did not come to rest.
    #[error(
        "the skew did not settle in {steps} steps (last near {skew_s} s): use a stronger reference or faster edges"
    )]
    NotSettled {
        /// Steps taken.
        steps: usize,
        /// Where it was, in seconds.
        skew_s: f64,
    },
    /// One leg shows noise where the other shows a signal.
    #[error(
        "the {leg} leg shows only noise ({rms_v:.2e} V rms): check that its tip is on the reference and its channel and route are the right ones"
    )]
    OnlyNoise {
        /// `positive` or `negative`.
        leg: &'static str,
        /// Its noise, volts rms.
        rms_v: f64,
    },
    /// Too few samples.
    #[error("{samples} samples are too few for a skew, {needed} are needed: use a longer record")]
    TooShort {
        /// Samples given.
        samples: usize,
        /// Samples needed.
        needed: usize,
    },
    /// A mistake of the program.
    #[error(transparent)]
    Spectrum(#[from] SpectrumError),
}

/// What a user should know about an estimate that could be made.
#[derive(Debug, Clone, PartialEq)]
pub enum Warning {
    /// The reference repeats: another skew fits as well, and it is less than three times as far from zero.
    Ambiguous {
        /// The other skew in seconds.
        alternative_s: f64,
    },
    /// The gain is near a power of ten: a probe's attenuation is not the one its channel is set to.
    Attenuation {
        /// The gain.
        gain: f64,
    },
    /// The gain is far from 1; the legs are not alike.
    GainFarFromOne {
        /// The gain.
        gain: f64,
    },
    /// Less than half a converter step of noise: the quantisation error is not random and repeats do not average it.
    LittleDither {
        /// The noise in converter steps.
        steps: f64,
    },
    /// The legs' noise is alike at the same instant: it comes from what they share, and pulls a skew towards zero.
    NoiseCorrelated {
        /// The correlation coefficient.
        correlation: f64,
    },
    /// The noise of the legs could not be told apart, so it was taken as equal; the gain may be a little off.
    NoiseSplitAssumed,
    /// After alignment the legs differ by more than their noise: their frequency responses are not the same, so that
    /// skew and gain depend on the reference used.
    ResponsesDiffer {
        /// What is left beyond the noise, volts rms.
        excess_v: f64,
    },
}

impl std::fmt::Display for Warning {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Ambiguous { alternative_s } => {
                write!(f, "the reference repeats: a skew of {alternative_s:.3e} s fits as well; use a longer period")
            }
            Self::Attenuation { gain } => {
                let (leg, times) = if *gain > 1.0 { ("negative", *gain) } else { ("positive", 1.0 / gain) };
                let factor = 10f64.powf(times.log10().round());
                write!(
                    f,
                    "the {leg} leg reads {times:.3} times the other: set both channels to the attenuation of their \
                     probes, one of them is wrong by {factor:.0}"
                )
            }
            Self::GainFarFromOne { gain } => {
                write!(f, "the legs' gains differ by more than 20 % (gain {gain:.4}): check the probes' attenuation")
            }
            Self::LittleDither { steps } => write!(
                f,
                "only {steps:.2} converter steps of noise: quantisation is not averaged out; use a smaller vertical range"
            ),
            Self::NoiseCorrelated { correlation } => write!(
                f,
                "the legs' noise is correlated ({correlation:.2}): it comes from what they share, such as the scope's \
                 supply or its ground; average more acquisitions, or use a stronger reference"
            ),
            Self::NoiseSplitAssumed => f.write_str("the legs' noise could not be told apart and was taken as equal"),
            Self::ResponsesDiffer { excess_v } => write!(
                f,
                "beyond noise the aligned legs still differ by {excess_v:.2e} V rms: their responses are not the same, \
                 so that the skew is the one of this reference and another edge time or frequency has another; \
                 deskew on a signal like the one to be measured, or correct the response too"
            ),
        }
    }
}
