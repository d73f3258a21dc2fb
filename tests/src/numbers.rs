//! Quantities of the API's JSON as numbers.

use serde_json::Value;

/// A value with its standard uncertainty.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Estimate {
    /// The value.
    pub value: f64,
    /// Its standard uncertainty, in the same unit.
    pub u: f64,
}

impl Estimate {
    /// Whether `truth` lies within the expanded uncertainty, k = 2 (JCGM 100, 6.2.1).
    #[must_use]
    pub fn covers(&self, truth: f64) -> bool {
        (self.value - truth).abs() <= 2.0 * self.u
    }

    /// How many standard uncertainties the value lies from `truth`.
    #[must_use]
    pub fn score(&self, truth: f64) -> f64 {
        (self.value - truth) / self.u
    }
}

/// A quantity `{"value": …, "u": …, "unit": …}` that must have this unit and an uncertainty above nought.
///
/// # Panics
/// When it is none.
#[must_use]
pub fn quantity(json: &Value, unit: &str) -> Estimate {
    assert_eq!(json["unit"], unit, "{json}");
    let number = |key: &str| json[key].as_f64().unwrap_or_else(|| panic!("`{key}` of {json}"));
    let found = Estimate { value: number("value"), u: number("u") };
    assert!(found.u > 0.0 && found.u.is_finite() && found.value.is_finite(), "{json}");
    found
}

/// The figure of this name of a capture.
///
/// # Panics
/// When the capture has none.
#[must_use]
pub fn figure<'c>(capture: &'c Value, name: &str) -> &'c Value {
    let figures = capture["figures"].as_array().expect("a capture has figures");
    figures.iter().find(|figure| figure["name"] == name).unwrap_or_else(|| panic!("no figure `{name}`: {capture}"))
}
