//! What a session has set, so that it can set it again after the instrument lost it.
//!
//! Of each setting the last one that succeeded is kept, in the order in which they succeeded: an output that was
//! switched on after its voltage was set is switched on after it again. Actions are not kept, with one exception:
//! which channels of a switch unit are closed is a state too, and a forgotten route would give wrong records.

use evenpair_core::dialect::{Call, Intent};

/// Everything that was set and still holds.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct Memory {
    settings: Vec<(String, Call)>,
    /// Closed channels, in the order in which they were closed.
    closed: Vec<i64>,
}

impl Memory {
    /// Takes note of a call that succeeded.
    pub(super) fn note(&mut self, call: &Call) {
        if let Some(key) = call.setting_key() {
            self.settings.retain(|(known, _)| *known != key);
            self.settings.push((key, call.clone()));
            return;
        }
        let channels = call.args.list("channels").unwrap_or_default();
        match call.intent {
            // The default settings are what holds now; whoever resets makes the settings anew.
            Intent::Reset => *self = Self::default(),
            Intent::RouteClose => {
                self.closed.retain(|closed| !channels.contains(closed));
                self.closed.extend_from_slice(channels);
            }
            Intent::RouteOpen => self.closed.retain(|closed| !channels.contains(closed)),
            Intent::RouteOpenAll => self.closed.clear(),
            _ => {}
        }
    }

    /// What to send to bring the instrument back to where it was. Closing a closed channel changes nothing, so an
    /// instrument that kept its routes does not open them for a moment.
    pub(super) fn calls(&self) -> Vec<Call> {
        let routes =
            (!self.closed.is_empty()).then(|| Call::new(Intent::RouteClose).with("channels", self.closed.clone()));
        self.settings.iter().map(|(_, call)| call.clone()).chain(routes).collect()
    }
}

#[cfg(test)]
mod tests;
