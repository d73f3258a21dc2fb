//! The key-value metadata of a waveform file.
//!
//! Numbers are written with as many digits as bring the same number back. `positive.` and `negative.` keys belong to
//! a leg: volts at the tip = `volts_per_code` × code + `zero_v`.

use std::collections::BTreeMap;

use evenpair_api::{Capture, Correction};
use evenpair_core::analysis::{Record, Samples};

use super::super::Waveform;

/// How to read the file, for whoever opens it years later.
const ABOUT: &str = "One acquisition of two legs. Volts at the probe tip = volts_per_code * code + zero_v of that leg; \
                     seconds from the trigger = start_s + row * interval_s; difference is in volts, corrected for skew, \
                     gain and offset of the negative leg, and null where the correction has no support. With both tips \
                     on the node s(t): positive = s(t), negative = gain * s(t - skew) + offset.";

/// The version of these keys.
const FORMAT: &str = "1";

/// Every key of a file. The store's own go over what the caller put under the same name.
pub(super) fn of(waveform: &Waveform, capture: &Capture, correction: Option<&Correction>) -> BTreeMap<String, String> {
    let mut keys = waveform.metadata.clone();
    let mut put = |key: &str, value: String| {
        keys.insert(key.to_owned(), value);
    };
    put("evenpair.format", FORMAT.to_owned());
    put("about", ABOUT.to_owned());
    put("run", capture.run.to_string());
    put("number", capture.number.to_string());
    put("pair", capture.pair.clone());
    put("made_at", capture.made_at.to_string());
    put("interval_s", text(waveform.positive.interval_s));
    put("start_s", text(waveform.positive.start_s));
    put("unit.difference", "V".to_owned());
    for condition in &capture.conditions {
        let value = &condition.value;
        put(&format!("condition.{}", condition.setting), format!("{} {}", text(value.value), value.unit));
    }
    for (leg, record) in [("positive", &waveform.positive), ("negative", &waveform.negative)] {
        put(&format!("{leg}.volts_per_code"), text(record.volts_per_code));
        put(&format!("{leg}.zero_v"), text(record.zero_v));
        put(&format!("{leg}.lowest_code"), text(record.end_codes.0));
        put(&format!("{leg}.highest_code"), text(record.end_codes.1));
        put(&format!("{leg}.step_v"), text(record.step_v));
        put(&format!("{leg}.averages"), record.averages.to_string());
    }
    if let Some(correction) = correction {
        put("correction.id", correction.id.to_string());
        put("correction.made_at", correction.made_at.to_string());
        put("correction.scope_skew_s", text(correction.scope_skew.value));
        let parts = [("skew_s", &correction.skew), ("gain", &correction.gain), ("offset_v", &correction.offset)];
        for (name, quantity) in parts {
            put(&format!("correction.{name}"), text(quantity.value));
            if let Some(u) = quantity.u {
                put(&format!("correction.{name}.u"), text(u));
            }
        }
    }
    keys
}

/// The keys of a file being read; those that a record needs are taken out.
pub(super) struct Keys(BTreeMap<String, String>);

impl Keys {
    /// The keys as they stand in the file.
    pub(super) fn new(keys: BTreeMap<String, String>) -> Self {
        Self(keys)
    }

    /// A leg's record.
    ///
    /// # Errors
    /// The key that is missing or cannot be read.
    pub(super) fn record(&mut self, leg: &str, samples: Samples) -> Result<Record, String> {
        Ok(Record {
            samples,
            volts_per_code: self.take(&format!("{leg}.volts_per_code"))?,
            zero_v: self.take(&format!("{leg}.zero_v"))?,
            interval_s: self.read("interval_s")?,
            start_s: self.read("start_s")?,
            end_codes: (self.take(&format!("{leg}.lowest_code"))?, self.take(&format!("{leg}.highest_code"))?),
            step_v: self.take(&format!("{leg}.step_v"))?,
            averages: self.take(&format!("{leg}.averages"))?,
        })
    }

    /// What is left: whose it is, the correction, and what the caller added.
    pub(super) fn rest(self) -> BTreeMap<String, String> {
        self.0
    }

    fn take<T: std::str::FromStr>(&mut self, key: &str) -> Result<T, String> {
        let value = self.read(key)?;
        self.0.remove(key);
        Ok(value)
    }

    fn read<T: std::str::FromStr>(&self, key: &str) -> Result<T, String> {
        let text = self.0.get(key).ok_or_else(|| format!("it has no key `{key}`"))?;
        text.parse().map_err(|_| format!("key `{key}` is `{text}`, which is no number"))
    }
}

/// A number with the fewest digits that bring it back.
fn text(number: f64) -> String {
    format!("{number:e}")
}
