//! The spectrum of a capture.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;
use uuid::Uuid;

use crate::Quantity;

/// The spectra of a capture's corrected difference and of its common mode, averaged over half-overlapping segments, each
/// about its own mean. Element k of a list is at k times `bin`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Spectrum {
    /// The run that the capture belongs to.
    pub run: Uuid,
    /// The capture's number.
    pub number: u32,
    /// The window's name.
    pub window: String,
    /// What a window does to the amplitude of a sine; it is taken out already.
    pub coherent_gain: f64,
    /// The window's equivalent noise bandwidth in bins: the ratio of the two scales, squared.
    pub noise_bandwidth_bins: f64,
    /// Distance of two bins.
    pub bin: Quantity,
    /// Samples in a segment.
    pub segment: u32,
    /// Segments that were averaged.
    pub segments: u32,
    /// The corrected difference.
    pub difference: SpectrumLine,
    /// The common mode.
    pub common: SpectrumLine,
}

/// One waveform's spectrum in both scales.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct SpectrumLine {
    /// Rms per bin in volts: a sine in the middle of a bin shows its rms value.
    pub rms_v: Vec<f64>,
    /// Density in V/√Hz: white noise shows its rms over the root of half the sample rate.
    pub density: Vec<f64>,
}
