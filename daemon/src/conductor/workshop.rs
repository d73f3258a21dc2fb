//! What every stage works with: the bench, its instruments, the store and the clock.

use std::sync::Arc;

use evenpair_core::bench::{Bench, BenchCall, PairSpec, ReferenceSpec};
use tokio_util::sync::CancellationToken;

use super::instruments::Instruments;
use super::scope::Scope;
use super::trouble::Trouble;
use crate::clock::Clock;
use crate::session::SessionError;
use crate::store::Store;

/// What every stage works with.
#[derive(Clone)]
pub(crate) struct Workshop {
    pub(crate) bench: Arc<Bench>,
    pub(crate) instruments: Instruments,
    pub(crate) store: Store,
    pub(crate) clock: Arc<dyn Clock>,
}

impl Workshop {
    /// The scope that a pair is on.
    pub(crate) fn scope<'b>(&self, pair: &'b PairSpec) -> Result<Scope<'b>, SessionError> {
        let handle = self.instruments.handle(&pair.scope)?.clone();
        let timeout_s = self.bench.instrument(&pair.scope).map_or(3.0, |spec| spec.timeout_s);
        Ok(Scope { handle, pair, timeout_s })
    }

    /// Closes a route of the bench.
    pub(crate) async fn route(&self, name: &str) -> Result<(), SessionError> {
        let calls: &[BenchCall] = self.bench.route(name).map_or(&[], |route| &route.calls);
        self.instruments.perform_all(calls).await
    }

    /// Sets a setting of the bench. Whoever asks waits until the device has followed.
    pub(crate) async fn set(&self, name: &str, value: f64) -> Result<(), SessionError> {
        match self.bench.setting(name) {
            Some(setting) => self.instruments.perform(&setting.call(value)).await.map(|_| ()),
            None => Ok(()),
        }
    }

    /// Brings a reference to both tips and starts it. The scope has to be prepared before: the reference's levels may be
    /// more than the range that it is on now can bear.
    pub(crate) async fn start_reference(
        &self,
        reference: &ReferenceSpec,
        stop: &CancellationToken,
    ) -> Result<(), Trouble> {
        if let Some(route) = &reference.route {
            self.route(route).await?;
        }
        self.set_and_wait(&reference.settings, stop).await?;
        Ok(self.instruments.perform_all(&reference.start).await?)
    }

    /// Ends a reference and gives back what it had set, as far as the run itself had `set` it before.
    pub(crate) async fn stop_reference(
        &self,
        reference: &ReferenceSpec,
        set: &[(String, f64)],
        stop: &CancellationToken,
    ) -> Result<(), Trouble> {
        self.instruments.perform_all(&reference.stop).await?;
        let touched = |name: &String| reference.settings.iter().any(|(touched, _)| touched == name);
        let back: Vec<(String, f64)> = set.iter().filter(|(name, _)| touched(name)).cloned().collect();
        self.set_and_wait(&back, stop).await
    }

    /// Sets settings one after the other and waits until the device has followed all of them.
    async fn set_and_wait(&self, settings: &[(String, f64)], stop: &CancellationToken) -> Result<(), Trouble> {
        let mut longest_s = 0.0f64;
        for (name, value) in settings {
            self.set(name, *value).await?;
            longest_s = longest_s.max(self.bench.setting(name).map_or(0.0, |setting| setting.settle_s));
        }
        wait(longest_s, stop).await
    }

    /// Who the scope of a pair says it is.
    pub(crate) fn scope_identity(&self, pair: &PairSpec) -> String {
        let identity =
            self.instruments.handle(&pair.scope).ok().and_then(|handle| handle.watch().borrow().identity.clone());
        identity.unwrap_or_default()
    }
}

/// Waits, unless `stop` comes first.
async fn wait(seconds: f64, stop: &CancellationToken) -> Result<(), Trouble> {
    if seconds <= 0.0 {
        return Ok(());
    }
    tokio::select! {
        () = tokio::time::sleep(std::time::Duration::from_secs_f64(seconds)) => Ok(()),
        () = stop.cancelled() => Err(Trouble::Stopped),
    }
}

/// Runs a long computation where it does not keep the runtime from its sockets.
pub(crate) async fn compute<T: Send + 'static>(
    what: &'static str,
    work: impl FnOnce() -> T + Send + 'static,
) -> Result<T, Trouble> {
    tokio::task::spawn_blocking(work).await.map_err(|_| Trouble::Computation { what })
}
