//! What keeps an estimate from being better: where effort would pay.

use super::{SkewEstimate, Warning};

/// What limits an estimate of the skew most.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Limit {
    /// The reference repeats, and which of its repetitions is meant is not sure.
    Ambiguity,
    /// The skew was taken on another vertical range than it is used on.
    Carry,
    /// The converter's steps: there is too little noise to average them out.
    Dither,
    /// The legs' noise: more acquisitions help.
    Noise,
    /// The legs' frequency responses differ, so that the skew depends on the reference.
    Response,
    /// The repeats scatter more than the noise explains: jitter of the legs against each other, or drift.
    Scatter,
}

impl std::fmt::Display for Limit {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(match self {
            Self::Ambiguity => "ambiguity: the reference repeats; use a longer period",
            Self::Carry => "carry: the skew is used on another range than it was taken on; deskew on that range",
            Self::Dither => "dither: too little noise to average the converter's steps; use a smaller vertical range",
            Self::Noise => "noise: more acquisitions or faster edges help",
            Self::Response => "response: the legs' bandwidths differ; deskew on a signal like the one to be measured",
            Self::Scatter => "scatter: the repeats differ by more than noise; look for jitter or drift",
        })
    }
}

impl SkewEstimate {
    /// What limits this estimate most: an error that averaging does not lessen comes before the noise.
    #[must_use]
    pub fn limited_by(&self) -> Limit {
        of_warnings(&self.warnings).unwrap_or(Limit::Noise)
    }
}

/// The limit that the warnings tell of, the gravest first.
pub(in crate::analysis) fn of_warnings(warnings: &[Warning]) -> Option<Limit> {
    let limit = |warning: &Warning| match warning {
        Warning::Ambiguous { .. } => Some(Limit::Ambiguity),
        Warning::LittleDither { .. } => Some(Limit::Dither),
        Warning::ResponsesDiffer { .. } => Some(Limit::Response),
        Warning::Attenuation { .. }
        | Warning::GainFarFromOne { .. }
        | Warning::NoiseCorrelated { .. }
        | Warning::NoiseSplitAssumed => None,
    };
    let found: Vec<Limit> = warnings.iter().filter_map(limit).collect();
    [Limit::Ambiguity, Limit::Dither, Limit::Response].into_iter().find(|limit| found.contains(limit))
}
