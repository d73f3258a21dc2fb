//! Transfers of a correction to another vertical range: the request, and what a transferred correction tells of it.

use evenpair_core::analysis::transfer::{Choice, Way};
use jiff::Timestamp;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;
use uuid::Uuid;

use crate::{Correction, Quantity};

/// Body of `POST /pairs/{pair}/transfer`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub struct TransferRequest {
    /// A signal that the pair's own range and the new one both show.
    pub reference: String,
    /// Full vertical span of the new range at the tip, in volts.
    pub span_v: f64,
    /// Voltage at the tip in the middle of the new span, in volts; default: as the reference is acquired.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub offset_v: Option<f64>,
    /// Which way may be taken; default: the one of smaller uncertainty.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub by: Option<TransferChoice>,
    /// Wanted standard uncertainty of skew in seconds; default: the pair's.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub target_u_skew_s: Option<f64>,
    /// The most acquisitions to spend on each range; default: the pair's.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub most_acquisitions: Option<u32>,
}

/// Which way to the new range may be taken.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum TransferChoice {
    /// Whichever has the smaller uncertainty.
    Best,
    /// A deskew on the new range: both tips on one node.
    Common,
    /// Each leg compared with itself on the two ranges.
    Legs,
}

impl From<TransferChoice> for Choice {
    fn from(choice: TransferChoice) -> Self {
        match choice {
            TransferChoice::Best => Self::Best,
            TransferChoice::Common => Self::Common,
            TransferChoice::Legs => Self::Legs,
        }
    }
}

/// The way that was taken.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum TransferWay {
    /// Taken over with a stated uncertainty more; skew only.
    Carried,
    /// Deskewed on the new range, once the same signal had confirmed the correction on the old one.
    Common,
    /// By comparing each leg with itself on the two ranges.
    Legs,
}

impl From<Way> for TransferWay {
    fn from(way: Way) -> Self {
        match way {
            Way::Carried => Self::Carried,
            Way::Common => Self::Common,
            Way::Legs => Self::Legs,
        }
    }
}

/// What a transferred correction came from.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct TransferredFrom {
    /// The correction on the old range.
    pub correction: Uuid,
    /// When that one was made. A transferred correction ages from then on, unless all of it was measured anew.
    #[schema(value_type = String, format = DateTime)]
    pub made_at: Timestamp,
    /// Vertical span of the old range at the tip.
    pub span: Quantity,
    /// Vertical offset of the old range at the tip.
    pub offset: Quantity,
    /// The signal that both ranges showed.
    pub reference: String,
    /// How skew was found.
    pub skew_by: TransferWay,
    /// How gain and offset were found.
    pub levels_by: TransferWay,
}

/// A pair's corrections.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Corrections {
    /// The newest for each set of conditions, the newest first; each judged on its own range.
    pub items: Vec<Correction>,
}
