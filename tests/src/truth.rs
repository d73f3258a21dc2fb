//! What is true of the pair, worked out from a scenario's text alone by the formulas that its head states.

use std::f64::consts::TAU;

use toml::{Table, Value};

/// The correction that a perfect deskew of the pair would find on one vertical range.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Truth {
    /// Positive: the negative leg arrives late.
    pub skew_s: f64,
    /// Negative leg over positive leg for slow signals, some hundred hertz and below.
    pub slow_gain: f64,
    /// The same above some kilohertz, where the probes' compensation has done its part.
    pub gain: f64,
    /// Volts at the tips that the negative leg has too much over `slow_gain` times the positive one.
    pub offset_v: f64,
}

impl Truth {
    /// The truth of a scenario's text on the range of `span_v` at the scope's input.
    ///
    /// # Panics
    /// When the scenario does not list what is needed.
    #[must_use]
    pub fn of(scenario: &str, span_v: f64) -> Self {
        let table: Table = scenario.parse().expect("a scenario is TOML");
        let [p, n] = ["P", "N"].map(|tip| {
            let legs = table["leg"].as_array().expect("legs");
            let leg = legs.iter().find(|leg| leg["tip"].as_str() == Some(tip)).expect("a leg of either tip");
            Leg::of(leg, span_v)
        });
        let slow_gain = n.gain / p.gain;
        Self {
            skew_s: n.delay_s - p.delay_s,
            slow_gain,
            gain: slow_gain * (1.0 + n.compensation) / (1.0 + p.compensation),
            offset_v: n.offset_v - slow_gain * p.offset_v,
        }
    }

    /// The offset that belongs to `gain` (not to `slow_gain`) when the common mode's mean is `mean_v`: one straight line
    /// through a signal whose mean passes by one gain and whose edges pass by another.
    #[must_use]
    pub fn offset_at_mean(&self, mean_v: f64) -> f64 {
        self.offset_v + (self.slow_gain - self.gain) * mean_v
    }
}

struct Leg {
    gain: f64,
    compensation: f64,
    /// Volts at the tip.
    offset_v: f64,
    delay_s: f64,
}

impl Leg {
    fn of(leg: &Value, span_v: f64) -> Self {
        let number = |table: &Value, key: &str| {
            let value = table.get(key).unwrap_or_else(|| panic!("no `{key}` in {table}"));
            value.as_float().or_else(|| value.as_integer().map(|whole| whole as f64)).expect("a number")
        };
        let ranges = leg["range"].as_array().expect("listed ranges");
        let listed = ranges.iter().find(|range| (number(range, "span_v") - span_v).abs() < 1e-9);
        let range = listed.unwrap_or_else(|| panic!("no range of {span_v} V is listed"));
        Self {
            gain: number(leg, "gain") * number(range, "gain"),
            compensation: number(leg, "compensation_error"),
            offset_v: number(leg, "attenuation") * number(range, "offset_v"),
            delay_s: number(leg, "delay_s") + number(range, "delay_s") + 1.0 / (TAU * number(leg, "bandwidth_hz")),
        }
    }
}
