//! What the instruments have been told: the devices write it, the world reads it.

use std::collections::BTreeSet;

/// The state of everything that feeds the bench.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Controls {
    /// The generator's outputs, the first of them at index 0.
    pub(crate) generator: Vec<SourceOutput>,
    /// The supply's outputs.
    pub(crate) supply: Vec<SupplyOutput>,
    /// The switch unit's closed channels. Of several routes the one with the lowest number counts.
    pub(crate) closed: BTreeSet<u32>,
}

impl Default for Controls {
    fn default() -> Self {
        Self {
            generator: vec![SourceOutput::default(); 2],
            supply: vec![SupplyOutput::default(); 2],
            closed: BTreeSet::new(),
        }
    }
}

/// One output of the generator.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct SourceOutput {
    /// Whether the output is connected.
    pub(crate) on: bool,
    /// The waveform.
    pub(crate) shape: Shape,
    /// In hertz, above 0; of a multitone the distance of the tones.
    pub(crate) frequency_hz: f64,
    /// Peak to peak, without a load, in volts.
    pub(crate) amplitude_vpp: f64,
    /// The middle between the peaks, without a load, in volts.
    pub(crate) offset_v: f64,
    /// High part of a pulse's period, 0 to 1; a square always has a half.
    pub(crate) duty: f64,
    /// 10–90 % time of both edges of a square or a pulse, in seconds.
    pub(crate) edge_s: f64,
}

impl Default for SourceOutput {
    fn default() -> Self {
        Self {
            on: false,
            shape: Shape::Sine,
            frequency_hz: 1e3,
            amplitude_vpp: 1.0,
            offset_v: 0.0,
            duty: 0.5,
            edge_s: 3e-9,
        }
    }
}

/// A generator's waveform.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Shape {
    /// The offset alone.
    Dc,
    /// Tones of equal size at the first multiples of the frequency.
    Multitone,
    /// Low and high with the output's duty.
    Pulse,
    /// One tone, rising through its middle at the period's start.
    Sine,
    /// Low and high, half the period each.
    Square,
}

/// One output of the supply.
#[derive(Debug, Clone, PartialEq, Default)]
pub(crate) struct SupplyOutput {
    /// Whether the output is connected.
    pub(crate) on: bool,
    /// Wanted voltage.
    pub(crate) voltage_v: f64,
    /// Limit of the current, in amperes.
    pub(crate) current_a: f64,
}
