//! What `GET /bench` and `GET /pairs` tell about the bench.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use crate::{CorrectionState, Quantity};

/// The bench that this daemon owns.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Bench {
    /// The bench's name from its file.
    pub name: String,
    /// Whether the safe state is known to have worked.
    pub rest: Rest,
    /// Every instrument, in the order of the bench file.
    pub instruments: Vec<Instrument>,
    /// Every pair.
    pub pairs: Vec<Pair>,
    /// Every named setting.
    pub settings: Vec<Setting>,
    /// Every named route.
    pub routes: Vec<Route>,
    /// Every named reference.
    pub references: Vec<Reference>,
    /// The run that uses the bench now, if one does.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub run: Option<uuid::Uuid>,
    /// The cautions that stand for every measurement on this bench.
    pub cautions: Vec<String>,
}

/// Whether the bench is known to be at rest.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum Rest {
    /// The safe state was applied and every command of it succeeded.
    Settled,
    /// The safe state was not applied, or a part of it failed: nothing starts until a person has looked.
    Unsettled,
}

/// An instrument and its link.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Instrument {
    /// Its name in the bench file.
    pub name: String,
    /// Its address, a VISA resource string (VPP-4.3).
    pub resource: String,
    /// The dialect it is spoken to in.
    pub dialect: String,
    /// What it answered to `*IDN?`, once it has.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub identity: Option<String>,
    /// What it answered when it was asked for its model's options (`*OPT?`), once it has.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub options: Option<String>,
    /// The state of the link.
    pub link: LinkState,
    /// Why the link is down, in words.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub trouble: Option<String>,
}

/// The state of the link to an instrument.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum LinkState {
    /// Not connected yet, or being reconnected.
    Down,
    /// Connected and identified.
    Up,
}

/// Two legs on one scope.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Pair {
    /// Its name in the bench file.
    pub name: String,
    /// The scope that both legs are on.
    pub scope: String,
    /// The positive leg.
    pub positive: Leg,
    /// The negative leg.
    pub negative: Leg,
    /// The state of its correction, absent while it has none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub correction: Option<CorrectionState>,
}

/// One single-ended path, probe tip to converter.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Leg {
    /// The scope's channel, from 1.
    pub channel: u32,
    /// The probe on it.
    pub probe: Probe,
}

/// What the bench file says about a probe.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Probe {
    /// Volts at the tip per volt at the scope's input.
    pub attenuation: f64,
    /// The highest voltage to earth that the probe is rated for, at low frequency.
    pub rating: Quantity,
    /// Its input resistance.
    pub resistance: Quantity,
    /// Its input capacitance.
    pub capacitance: Quantity,
}

/// A named knob of an instrument.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Setting {
    /// Its name in the bench file.
    pub name: String,
    /// The instrument it belongs to.
    pub instrument: String,
    /// Its unit.
    pub unit: String,
    /// The lowest value that the bench allows.
    pub min: f64,
    /// The highest value that the bench allows.
    pub max: f64,
}

/// A named route of the switch unit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Route {
    /// Its name in the bench file.
    pub name: String,
    /// What it connects, in words.
    pub purpose: String,
}

/// A named reference.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Reference {
    /// Its name in the bench file.
    pub name: String,
    /// `square`, `sine`, `multitone`, `pulse` or `in-situ`.
    pub kind: String,
    /// The route that brings it to both tips.
    pub route: String,
    /// Its repetition frequency.
    pub frequency: Quantity,
}
