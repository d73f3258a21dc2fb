//! Why a response cannot be fitted or carried out.

/// Why a response cannot be fitted or carried out.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum ResponseError {
    /// Too few acquisitions to judge on others than those that were fitted.
    #[error(
        "{acquisitions} acquisitions of the reference are too few to fit a response and to judge it; acquire at least 2"
    )]
    Acquisitions {
        /// How many there are.
        acquisitions: usize,
    },
    /// The records cannot be corrected.
    #[error("acquisition {index} of the reference cannot be corrected before its response is fitted: {reason}")]
    Correct {
        /// Which acquisition, from 0.
        index: usize,
        /// Why.
        reason: String,
    },
    /// The taps hold for another sample interval.
    #[error(
        "the response was fitted to samples every {fitted_s} s and does not hold for samples every {interval_s} s; fit \
         it at the capture's sample interval"
    )]
    Interval {
        /// Interval of the fit in seconds.
        fitted_s: f64,
        /// Interval of the records in seconds.
        interval_s: f64,
    },
    /// Nothing to fit.
    #[error("the legs share no signal above the noise in {points} samples; check that both tips are on the reference")]
    NoSignal {
        /// Samples that were looked at.
        points: usize,
    },
    /// A transform failed: a mistake of the program.
    #[error(transparent)]
    Spectrum(#[from] crate::analysis::spectrum::SpectrumError),
    /// The records are too short.
    #[error("{points} samples are too few to fit a response; use a longer record")]
    TooShort {
        /// Samples that are left.
        points: usize,
    },
}
