//! A value with its unit and its standard uncertainty.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

/// A physical quantity: value, standard uncertainty and unit.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Quantity {
    /// The estimate, in `unit`.
    pub value: f64,
    /// The standard uncertainty of `value`, in `unit` (JCGM 100, 2.3.1); absent where none is stated.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub u: Option<f64>,
    /// An SI unit without prefix (`V`, `s`, `Hz`, `V/s`, `V·s`, `dB`), or `1` for a number.
    pub unit: String,
}

impl Quantity {
    /// A quantity with its standard uncertainty.
    #[must_use]
    pub fn new(value: f64, u: f64, unit: &str) -> Self {
        Self { value, u: Some(u), unit: unit.to_owned() }
    }

    /// A quantity that is exact or of which no uncertainty is stated, such as a setting.
    #[must_use]
    pub fn exact(value: f64, unit: &str) -> Self {
        Self { value, u: None, unit: unit.to_owned() }
    }
}
