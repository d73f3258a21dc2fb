//! What is taken where a plan does not say it; each is told with the budget.

/// Skew of two probes of a kind on one scope, in seconds (common practice, no source).
pub const SKEW_BEFORE_S: f64 = 1e-9;
/// Gain mismatch of two probes of a kind (common practice, no source).
pub const GAIN_BEFORE: f64 = 0.02;
/// Offset between two channels as a ratio of the span (common practice, no source).
pub const OFFSET_BEFORE: f64 = 0.005;
/// Skew after a deskew, in seconds: twice the standard uncertainty that a bench file asks for by default.
pub const SKEW_AFTER_S: f64 = 40e-12;
/// Gain mismatch after a deskew (assumed; a verification of the pair gives the true one).
pub const GAIN_AFTER: f64 = 0.0005;
/// Offset after a deskew as a ratio of the span (assumed; a verification of the pair gives the true one).
pub const OFFSET_AFTER: f64 = 0.0001;
/// Half-width of a scope's scale specification (common practice, no source).
pub const SCALE_SPEC: f64 = 0.02;
/// Noise of a scope as a ratio of the span, rms (common practice, no source).
pub const NOISE_RATIO: f64 = 0.003;
/// Integral non-linearity in steps of the converter (common practice, no source).
pub const LINEARITY_STEPS: f64 = 0.3;
/// Full spans at the scope's input in volts: eight divisions of 1, 2, 5 … from 2 mV to 10 V (common practice, no source).
pub const SPANS_V: [f64; 12] = [0.016, 0.04, 0.08, 0.16, 0.4, 0.8, 1.6, 4.0, 8.0, 16.0, 40.0, 80.0];
/// How the rating falls above its corner: 20 dB per decade (common practice, no source).
pub const RATING_SLOPE: f64 = 1.0;
