//! The sessions of every instrument on the bench, by name.

use std::collections::BTreeMap;

use evenpair_api::LinkState;
use evenpair_core::bench::{Bench, BenchCall};
use evenpair_core::dialect::Fields;

use crate::session::{Handle, SessionError};

/// Every instrument's session.
#[derive(Debug, Clone)]
pub(crate) struct Instruments(BTreeMap<String, Handle>);

impl Instruments {
    /// The sessions by the instruments' names.
    pub(crate) fn new(handles: BTreeMap<String, Handle>) -> Self {
        Self(handles)
    }

    /// The session of an instrument.
    ///
    /// # Errors
    /// When the bench has none of this name; a checked bench and a checked sequence name only what there is.
    pub(crate) fn handle(&self, name: &str) -> Result<&Handle, SessionError> {
        self.0.get(name).ok_or_else(|| SessionError::Closed { instrument: name.to_owned(), what: "a call".to_owned() })
    }

    /// Carries out one call.
    ///
    /// # Errors
    /// When the instrument does not do it.
    pub(crate) async fn perform(&self, call: &BenchCall) -> Result<Fields, SessionError> {
        self.handle(&call.instrument)?.call(call.call.clone()).await
    }

    /// Carries out calls one after the other, up to the first that fails.
    ///
    /// # Errors
    /// When an instrument does not do it.
    pub(crate) async fn perform_all(&self, calls: &[BenchCall]) -> Result<(), SessionError> {
        for call in calls {
            self.perform(call).await?;
        }
        Ok(())
    }

    /// What the API tells of the instruments and their links, in the bench file's order.
    pub(crate) fn describe(&self, bench: &Bench) -> Vec<evenpair_api::Instrument> {
        let describe = |spec: &evenpair_core::bench::InstrumentSpec| {
            let link = self.0.get(&spec.name).map(|handle| handle.watch().borrow().clone()).unwrap_or_default();
            evenpair_api::Instrument {
                name: spec.name.clone(),
                resource: spec.resource.to_string(),
                dialect: spec.dialect.clone(),
                identity: link.identity,
                link: if link.up { LinkState::Up } else { LinkState::Down },
                trouble: link.trouble,
            }
        };
        bench.instruments.iter().map(describe).collect()
    }
}
