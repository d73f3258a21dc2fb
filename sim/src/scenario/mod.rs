//! The scenario: one TOML file that says which instruments there are and what is true behind them.
//!
//! Unknown keys and values out of range are refused. Every key is explained in `configs/scenarios/greenhouse-fan.toml`
//! and in the README.md beside it.

#![cfg_attr(test, allow(clippy::unwrap_used, clippy::float_cmp))]

mod check;
mod device;
mod fault;
mod leg;
#[cfg(test)]
mod tests;

pub(crate) use device::{BalancedSpec, DeviceSpec, DividerSpec, HalfBridgeSpec, RectifierSpec};
pub(crate) use fault::{FaultSpec, Setting, What, When};
pub(crate) use leg::{LegSpec, RangeSpec, Tip};

use serde::Deserialize;

/// A whole scenario.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct Scenario {
    /// Seeds the noise, the jitter and whatever the file leaves to chance.
    pub(crate) seed: u64,
    /// The instruments that answer on the network.
    #[serde(rename = "instrument")]
    pub(crate) instruments: Vec<InstrumentSpec>,
    /// The scope's converter, trigger and pace.
    #[serde(default)]
    pub(crate) scope: ScopeSpec,
    /// The generator's output 1 as a reference.
    #[serde(default)]
    pub(crate) reference: ReferenceSpec,
    /// The legs: a channel without one sees nothing.
    #[serde(rename = "leg", default)]
    pub(crate) legs: Vec<LegSpec>,
    /// What is measured.
    pub(crate) device: DeviceSpec,
    /// What goes wrong.
    #[serde(rename = "fault", default)]
    pub(crate) faults: Vec<FaultSpec>,
    /// The port that faults are ordered at; none without it.
    #[serde(default)]
    pub(crate) control: Option<ControlSpec>,
}

/// The control port.
#[derive(Debug, Clone, PartialEq, Eq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct ControlSpec {
    /// TCP port; 0 takes any free one.
    #[serde(default)]
    pub(crate) port: u16,
}

/// The name under which the control port is announced.
pub(crate) const CONTROL: &str = "control";

/// One instrument on the network.
#[derive(Debug, Clone, PartialEq, Eq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct InstrumentSpec {
    /// The name under which it is announced.
    pub(crate) name: String,
    /// What it is.
    pub(crate) kind: Kind,
    /// What carries its messages.
    #[serde(default)]
    pub(crate) protocol: Protocol,
    /// How it is spoken to.
    #[serde(default)]
    pub(crate) personality: PersonalitySpec,
    /// TCP port on the loopback interface; 0 takes any free one.
    #[serde(default)]
    pub(crate) port: u16,
    /// Serial number in the answer to `*IDN?`.
    #[serde(default)]
    pub(crate) serial: Option<String>,
    /// The whole answer to `*IDN?` instead of the usual one.
    #[serde(default)]
    pub(crate) identity: Option<String>,
}

/// What carries the messages of an instrument.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub(crate) enum Protocol {
    /// HiSLIP (IVI-6.1).
    Hislip,
    /// Plain text over TCP.
    #[default]
    Socket,
}

/// How an instrument is spoken to; `configs/scenarios/README.md` tells the commands of each.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub(crate) enum PersonalitySpec {
    /// Must be polled, is deaf after each line, runs free unless held.
    Slow,
    /// IEEE 488.2 and SCPI-99.
    #[default]
    Standard,
    /// Two letters and a number; replies repeat them.
    Terse,
    /// Whole words, units, samples as text, one client.
    Wordy,
}

/// What an instrument is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub(crate) enum Kind {
    /// A waveform generator of two outputs.
    Generator,
    /// A digital oscilloscope of four channels.
    Scope,
    /// A power supply of two outputs.
    Supply,
    /// A switch unit.
    Switch,
}

/// What holds for all channels of the scope.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub(crate) struct ScopeSpec {
    /// Bits of the converter, 4 to 8: averages are 256 times finer and must fit 16 bits.
    pub(crate) converter_bits: u32,
    /// Standard deviation of the trigger instant from sweep to sweep, the same for all channels, in seconds.
    pub(crate) trigger_jitter_s: f64,
    /// How far the signal must have gone back behind the level before it triggers again, as a fraction of the span.
    pub(crate) trigger_hysteresis: f64,
    /// Virtual time that every acquisition takes, in seconds; drift goes by it and by no clock.
    pub(crate) acquisition_time_s: f64,
}

impl Default for ScopeSpec {
    fn default() -> Self {
        Self { converter_bits: 8, trigger_jitter_s: 0.0, trigger_hysteresis: 0.02, acquisition_time_s: 0.1 }
    }
}

/// The reference: generator output 1 behind its source resistance, on both tips.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub(crate) struct ReferenceSpec {
    /// Source resistance in ohms.
    pub(crate) source_ohm: f64,
    /// Tones of the multitone waveform.
    pub(crate) multitone_tones: u32,
}

impl Default for ReferenceSpec {
    fn default() -> Self {
        Self { source_ohm: 50.0, multitone_tones: 16 }
    }
}

/// Why a scenario cannot be used.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub(crate) enum ScenarioError {
    /// A value lies outside what the world can compute.
    #[error("scenario: `{key}` is {value}, but must be {wanted}; correct that line of the scenario file")]
    Range {
        /// The key, with the table it is in.
        key: String,
        /// What the file says.
        value: String,
        /// What would be right.
        wanted: &'static str,
    },
    /// Not TOML, an unknown key, or a value of the wrong kind; the text shows the line.
    #[error("scenario: {0}")]
    Syntax(#[from] toml::de::Error),
}

impl Scenario {
    /// Reads and checks the text of a scenario file.
    ///
    /// # Errors
    /// [`ScenarioError`]: what is wrong, and where.
    pub(crate) fn read(text: &str) -> Result<Self, ScenarioError> {
        let scenario: Self = toml::from_str(text)?;
        check::check(&scenario)?;
        Ok(scenario)
    }
}
