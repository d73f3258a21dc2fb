//! The sessions of every instrument on the bench, by name.

use std::collections::BTreeMap;
use std::sync::{Arc, OnceLock};

use evenpair_api::LinkState;
use evenpair_core::bench::{Bench, BenchCall};
use evenpair_core::dialect::{Call, Fields, Intent};

use crate::session::{Handle, SessionError};

/// Every instrument's session.
#[derive(Debug, Clone)]
pub(crate) struct Instruments(BTreeMap<String, Instrument>);

#[derive(Debug, Clone)]
struct Instrument {
    handle: Handle,
    /// What it says of its model's options, once it has.
    options: Arc<OnceLock<String>>,
}

impl Instruments {
    /// The sessions by the instruments' names. Whoever has options is asked for them when it is first reached.
    pub(crate) fn new(handles: BTreeMap<String, Handle>) -> Self {
        let watched = |handle: Handle| {
            let instrument = Instrument { handle, options: Arc::default() };
            if instrument.handle.dialect().supports(Intent::Options) {
                tokio::spawn(ask_for_options(instrument.clone()));
            }
            instrument
        };
        Self(handles.into_iter().map(|(name, handle)| (name, watched(handle))).collect())
    }

    /// The session of an instrument.
    ///
    /// # Errors
    /// When the bench has none of this name; a checked bench and a checked sequence name only what there is.
    pub(crate) fn handle(&self, name: &str) -> Result<&Handle, SessionError> {
        let found = self.0.get(name).map(|instrument| &instrument.handle);
        found.ok_or_else(|| SessionError::Closed { instrument: name.to_owned(), what: "a call".to_owned() })
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
            let instrument = self.0.get(&spec.name);
            let link = instrument.map(|known| known.handle.watch().borrow().clone()).unwrap_or_default();
            evenpair_api::Instrument {
                name: spec.name.clone(),
                resource: spec.resource.to_string(),
                dialect: spec.dialect.clone(),
                identity: link.identity,
                options: instrument.and_then(|known| known.options.get().cloned()),
                link: if link.up { LinkState::Up } else { LinkState::Down },
                trouble: link.trouble,
            }
        };
        bench.instruments.iter().map(describe).collect()
    }
}

/// Asks once, as soon as there is a connection. That nobody answers is no reason not to use the instrument.
async fn ask_for_options(instrument: Instrument) {
    if instrument.handle.watch().wait_for(|link| link.up).await.is_err() {
        return;
    }
    match instrument.handle.call(Call::new(Intent::Options)).await {
        Ok(fields) => {
            if let Ok(options) = fields.text("options") {
                // Nobody else fills it.
                let _ = instrument.options.set(options.trim().to_owned());
            }
        }
        Err(error) => tracing::warn!(%error, "asking for options; leave `intent.options` out of its dialect"),
    }
}
