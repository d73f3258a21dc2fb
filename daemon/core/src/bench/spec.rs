//! What a bench file says, in plain types with units in their names.

use super::{Acquisition, BenchCall, Overrides};
use crate::analysis::Drift;
use crate::dialect::Value;
use crate::scpi::address::Resource;
use crate::units::Unit;

/// A checked bench file.
#[derive(Debug, Clone, PartialEq)]
pub struct Bench {
    /// The bench's name.
    pub name: String,
    /// The folder of its sequences, relative to the bench file; none if it has none.
    pub sequences: Option<String>,
    /// Cautions of this very bench, beside those that stand for every one.
    pub cautions: Vec<String>,
    /// The instruments, in the file's order.
    pub instruments: Vec<InstrumentSpec>,
    /// The pairs, in the file's order.
    pub pairs: Vec<PairSpec>,
    /// The references, in the file's order.
    pub references: Vec<ReferenceSpec>,
    /// The settings, in the file's order.
    pub settings: Vec<SettingSpec>,
    /// The routes, in the file's order.
    pub routes: Vec<RouteSpec>,
    /// What is sent, in this order, before the first stage of a run.
    pub prepare: Vec<BenchCall>,
    /// What brings the bench to rest, in this order for each instrument.
    pub safe: Vec<BenchCall>,
}

impl Bench {
    /// The instrument of this name.
    #[must_use]
    pub fn instrument(&self, name: &str) -> Option<&InstrumentSpec> {
        self.instruments.iter().find(|spec| spec.name == name)
    }

    /// The pair of this name.
    #[must_use]
    pub fn pair(&self, name: &str) -> Option<&PairSpec> {
        self.pairs.iter().find(|spec| spec.name == name)
    }

    /// The reference of this name.
    #[must_use]
    pub fn reference(&self, name: &str) -> Option<&ReferenceSpec> {
        self.references.iter().find(|spec| spec.name == name)
    }

    /// The setting of this name.
    #[must_use]
    pub fn setting(&self, name: &str) -> Option<&SettingSpec> {
        self.settings.iter().find(|spec| spec.name == name)
    }

    /// The route of this name.
    #[must_use]
    pub fn route(&self, name: &str) -> Option<&RouteSpec> {
        self.routes.iter().find(|spec| spec.name == name)
    }
}

/// An instrument and how it is spoken to.
#[derive(Debug, Clone, PartialEq)]
pub struct InstrumentSpec {
    /// Its name on this bench.
    pub name: String,
    /// Its address.
    pub resource: Resource,
    /// The name of its dialect.
    pub dialect: String,
    /// The half-width of its vertical scale's specification, relative: 0.015 for ±1.5 %. None if not stated.
    pub scale_spec: Option<f64>,
    /// Whether a sequence may send it text that the dialect does not know.
    pub free_commands: bool,
    /// The longest that one reply may take, in seconds.
    pub timeout_s: f64,
}

/// A kind of probe.
#[derive(Debug, Clone, PartialEq)]
pub struct ProbeSpec {
    /// Its name on this bench.
    pub name: String,
    /// Volts at the tip per volt at the scope's input, 1 or more.
    pub attenuation: f64,
    /// The highest voltage to earth that it is rated for, at low frequency, in volts.
    pub rating_v: f64,
    /// Input resistance at the tip, in ohms.
    pub resistance_ohm: f64,
    /// Input capacitance at the tip, in farads.
    pub capacitance_f: f64,
}

impl ProbeSpec {
    /// The time constant of a compensated divider in seconds: with `R₁C₁ = R₂C₂ = T` the input resistance is `R₁ + R₂` and
    /// the input capacitance `C₁C₂/(C₁ + C₂)`, whose product is T (Kirchhoff).
    #[must_use]
    pub fn time_constant_s(&self) -> f64 {
        self.resistance_ohm * self.capacitance_f
    }
}

/// One leg of a pair.
#[derive(Debug, Clone, PartialEq)]
pub struct LegSpec {
    /// The scope's channel, from 1.
    pub channel: u32,
    /// The probe on it.
    pub probe: ProbeSpec,
}

/// Two legs on one scope.
#[derive(Debug, Clone, PartialEq)]
pub struct PairSpec {
    /// Its name on this bench.
    pub name: String,
    /// The instrument that both legs are on.
    pub scope: String,
    /// The positive leg.
    pub positive: LegSpec,
    /// The negative leg.
    pub negative: LegSpec,
    /// The input coupling of both legs.
    pub coupling: Coupling,
    /// The reference that skew is taken from.
    pub skew_reference: String,
    /// The reference that gain and offset are taken from.
    pub gain_reference: String,
    /// How a measurement is acquired.
    pub acquisition: Acquisition,
    /// The standard uncertainty of skew at which a deskew is content, in seconds.
    pub target_u_skew_s: f64,
    /// The most acquisitions that a deskew spends on each reference.
    pub most_acquisitions: u32,
    /// The age at which a correction is `stale`, in seconds.
    pub max_age_s: f64,
    /// How far a correction may move within that age, as half-widths.
    pub drift: Drift,
    /// Whether a deskew writes the rounded skew into the scope's own skew setting.
    pub use_scope_skew: bool,
    /// Whether a deskew fits the response that is left between the legs.
    pub response: bool,
}

impl PairSpec {
    /// The time constant of the legs' low-frequency compensation in seconds: the mean of both probes'.
    #[must_use]
    pub fn time_constant_s(&self) -> f64 {
        0.5 * (self.positive.probe.time_constant_s() + self.negative.probe.time_constant_s())
    }

    /// The leg on this channel of the scope.
    #[must_use]
    pub fn leg_on(&self, channel: u32) -> Option<&LegSpec> {
        [&self.positive, &self.negative].into_iter().find(|leg| leg.channel == channel)
    }

    /// The voltage to earth that both probes bear, in volts.
    #[must_use]
    pub fn rating_v(&self) -> f64 {
        self.positive.probe.rating_v.min(self.negative.probe.rating_v)
    }
}

/// Input coupling.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Coupling {
    /// Without the mean.
    Ac,
    /// With the mean.
    Dc,
}

impl Coupling {
    /// The word for it in files and in the API.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Ac => "AC",
            Self::Dc => "DC",
        }
    }

    /// The keyword of the intent `coupling.set`.
    #[must_use]
    pub fn keyword(self) -> &'static str {
        match self {
            Self::Ac => "ac",
            Self::Dc => "dc",
        }
    }
}

/// A signal that both legs see while they are deskewed.
#[derive(Debug, Clone, PartialEq)]
pub struct ReferenceSpec {
    /// Its name on this bench.
    pub name: String,
    /// Its kind.
    pub kind: ReferenceKind,
    /// The route that brings it to both tips; none where it is there already.
    pub route: Option<String>,
    /// Its repetition frequency, in hertz.
    pub frequency_hz: f64,
    /// Its lowest level at the tips, in volts.
    pub low_v: f64,
    /// Its highest level at the tips, in volts.
    pub high_v: f64,
    /// Its 10–90 % transition duration, in seconds, where it has edges and it is known.
    pub edge_s: Option<f64>,
    /// Whether `low_v` and `high_v` are known well enough to take the absolute gain from, and how well:
    /// the standard uncertainty of each level, in volts.
    pub u_level_v: Option<f64>,
    /// The settings that it needs, in the order of the file: name and value in the setting's unit.
    pub settings: Vec<(String, f64)>,
    /// What starts it, in this order, once its route is closed.
    pub start: Vec<BenchCall>,
    /// What ends it, in this order.
    pub stop: Vec<BenchCall>,
    /// How it is acquired, where that differs from the pair's measurement.
    pub overrides: Overrides,
    /// The standard uncertainty that carrying skew from this range to the measuring range adds, in seconds.
    pub carry_u_s: Option<f64>,
}

/// A kind of reference.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ReferenceKind {
    /// Both tips on the same moving node of the device.
    InSitu,
    /// Several sines at once.
    Multitone,
    /// Short pulses.
    Pulse,
    /// A sine wave.
    Sine,
    /// A square wave.
    Square,
}

impl ReferenceKind {
    /// The kinds with their names in files and in the API.
    pub const NAMES: [(&'static str, Self); 5] = [
        ("in-situ", Self::InSitu),
        ("multitone", Self::Multitone),
        ("pulse", Self::Pulse),
        ("sine", Self::Sine),
        ("square", Self::Square),
    ];

    /// Its name in files and in the API.
    #[must_use]
    pub fn name(self) -> &'static str {
        Self::NAMES.iter().find(|(_, kind)| *kind == self).map_or("", |(name, _)| name)
    }
}

/// A named, unit-bearing, range-checked knob of an instrument.
#[derive(Debug, Clone, PartialEq)]
pub struct SettingSpec {
    /// Its name on this bench.
    pub name: String,
    /// The call that sets it, without the value.
    pub call: BenchCall,
    /// The call's argument that takes the value.
    pub argument: String,
    /// The value's unit.
    pub unit: Unit,
    /// The lowest value that the bench allows.
    pub min: f64,
    /// The highest value that the bench allows.
    pub max: f64,
    /// How long the device takes to follow, in seconds.
    pub settle_s: f64,
    /// Whether the value is a voltage that reaches the tips, so that it must respect the probes' rating.
    pub at_tip: bool,
    /// What the tips may see beyond the value (a drive on top of it, ringing), in volts.
    pub headroom_v: f64,
}

impl SettingSpec {
    /// The call that sets `value`.
    #[must_use]
    pub fn call(&self, value: f64) -> BenchCall {
        BenchCall {
            instrument: self.call.instrument.clone(),
            call: self.call.call.clone().with(&*self.argument, Value::Number(value)),
        }
    }

    /// The highest voltage to earth that `value` may bring to a tip, in volts; 0 where it brings none.
    #[must_use]
    pub fn tip_v(&self, value: f64) -> f64 {
        if self.at_tip { value.abs() + self.headroom_v } else { 0.0 }
    }
}

/// A named way through the switch unit.
#[derive(Debug, Clone, PartialEq)]
pub struct RouteSpec {
    /// Its name on this bench.
    pub name: String,
    /// What it connects, in words.
    pub purpose: String,
    /// The calls that make it, in this order; they open what was closed before.
    pub calls: Vec<BenchCall>,
}
