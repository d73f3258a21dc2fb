//! What is asked of the figures beside the waveform itself.

/// What is asked of the figures. The default asks for no time above or below anything and settles within 2 %.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Asked {
    /// The levels above and below which time is counted.
    pub thresholds: Thresholds,
    /// Half-width of the band within which a waveform counts as settled, relative to its amplitude.
    pub settling_band: f64,
}

/// Levels in volts; without one its figure is not reported.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Thresholds {
    /// The level of `time_above`.
    pub high_v: Option<f64>,
    /// The level of `time_below`.
    pub low_v: Option<f64>,
}

/// The usual band of settling: 2 % of the amplitude (common practice, no source).
pub const SETTLING_BAND: f64 = 0.02;

impl Default for Asked {
    fn default() -> Self {
        Self { thresholds: Thresholds::default(), settling_band: SETTLING_BAND }
    }
}
