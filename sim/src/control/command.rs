//! What the control port understands.

use std::collections::BTreeMap;

use serde::Deserialize;

use super::Control;
use crate::scenario::{FaultSpec, What};

/// What can be said, for `help` and for whoever says something else.
const HELP: &str = "arm { instrument = \"…\", what = \"…\", … } | disarm NUMBER | disarm all | report | count | help";

/// A fault as the inline table that a line carries.
#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Line {
    fault: FaultSpec,
}

impl Control {
    /// The answer to one line.
    pub(super) fn answer(&self, line: &str) -> String {
        let (verb, rest) = line.split_once(' ').unwrap_or((line, ""));
        let done = match (verb, rest.trim()) {
            ("arm", fault) => self.arm(fault),
            ("disarm", which) => self.disarm(which),
            ("report", "") => Ok(self.report()),
            ("count", "") => Ok(self.count()),
            ("help", "") => Ok(format!("{HELP}\nok\n")),
            _ => Err(format!("`{line}` is not understood; {HELP}")),
        };
        // A mistake in TOML is told on several lines.
        done.unwrap_or_else(|why| format!("error {}\n", why.split_whitespace().collect::<Vec<_>>().join(" ")))
    }

    /// `ok NUMBER`
    fn arm(&self, fault: &str) -> Result<String, String> {
        let line: Line = toml::from_str(&format!("fault = {fault}")).map_err(|error| error.to_string())?;
        line.fault.check(&self.scenario).map_err(|error| error.to_string())?;
        let device = self.devices.get(&line.fault.instrument).ok_or("there is no such instrument")?;
        Ok(format!("ok {}\n", device.faults().arm(line.fault)))
    }

    /// `ok` and how many were disarmed.
    fn disarm(&self, which: &str) -> Result<String, String> {
        let number = match which {
            "all" => None,
            digits => Some(digits.parse().map_err(|_| format!("`{digits}` is no fault's number; or say `all`"))?),
        };
        let count: usize = self.devices.values().map(|device| device.faults().disarm(number)).sum();
        Ok(format!("ok {count}\n"))
    }

    /// A line `fault=… instrument=… what=… at=…` for each strike in order, then `ok` and how many there were.
    fn report(&self) -> String {
        let (entries, count) = self.bench.ledger.read();
        let mut text = String::new();
        for entry in entries {
            let place = if entry.what.of_acquisitions() { "acquisition" } else { "reply" };
            let (fault, instrument, what) = (entry.fault, &entry.instrument, entry.what.name());
            text.push_str(&format!("fault={fault} instrument={instrument} what={what} {place}={}\n", entry.at));
        }
        text.push_str(&format!("ok {count}\n"));
        text
    }

    /// A line `instrument=… what=… count=…` for each sort of strike, then `ok` and how many there were in all.
    fn count(&self) -> String {
        let (entries, all) = self.bench.ledger.read();
        let mut counts: BTreeMap<(&str, What), u64> = BTreeMap::new();
        for entry in &entries {
            *counts.entry((&entry.instrument, entry.what)).or_default() += 1;
        }
        let mut text = String::new();
        for ((instrument, what), count) in counts {
            text.push_str(&format!("instrument={instrument} what={} count={count}\n", what.name()));
        }
        text.push_str(&format!("ok {all}\n"));
        text
    }
}
