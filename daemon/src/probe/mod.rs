//! A dialect tried on one instrument, outside any bench: every intent that it has words for, and what came of it.
//!
//! Without leave it only asks. With leave it also changes a setting, asks for it, compares, and gives the old one back.
//! What drives something that may be connected (a source's shape, an output, a route) is never tried.

mod adjust;
mod findings;
mod trial;

use std::path::Path;
use std::sync::Arc;
use std::time::Duration;

use evenpair_core::dialect::Intent;
use evenpair_core::scpi::address::{AddressError, Resource};
use tokio_util::sync::CancellationToken;
use tokio_util::task::TaskTracker;

use crate::arguments::DialectArguments;
use crate::dialects::{self, DialectTrouble};
use crate::session::{self, Caps, SessionSpec, Timing, place_of};

pub(crate) use findings::Findings;

/// Why a dialect could not be tried at all.
#[derive(Debug, thiserror::Error)]
pub(crate) enum ProbeError {
    #[error("{source}")]
    Address { source: AddressError },
    #[error(transparent)]
    Dialect(#[from] DialectTrouble),
    #[error(
        "{resource}: nobody answered as the dialect expects within {after:?}: {reason}; check the address, the line \
         ending, and the words for `identify` and for the error queue, which come first on every connection"
    )]
    Unreachable { resource: String, after: Duration, reason: String },
    #[error(
        "{resource} cannot be spoken to; this daemon speaks to `TCPIP::host::port::SOCKET` and `TCPIP::host::hislip0::INSTR`"
    )]
    Unspoken { resource: String },
}

/// What a dialect has words for, when there is no instrument to try it on.
///
/// # Errors
/// When it cannot be read.
pub(crate) fn look(file: &str) -> Result<String, ProbeError> {
    let dialect = dialects::load(file, Path::new(""))?;
    let named = |speaks: bool| {
        let intents = Intent::all().filter(|intent| dialect.supports(*intent) == speaks);
        let names: Vec<&str> = intents.map(Intent::name).collect();
        if names.is_empty() { "nothing".to_owned() } else { names.join(", ") }
    };
    Ok(format!(
        "the dialect {} has no mistakes\nwords for: {}\nno words for: {}",
        dialect.name(),
        named(true),
        named(false)
    ))
}

/// Tries the dialect on the instrument at `at`.
///
/// # Cancel safety
/// Dropping it leaves a setting that was being tried as it is.
pub(crate) async fn run(at: &str, arguments: &DialectArguments) -> Result<Findings, ProbeError> {
    let dialect = Arc::new(dialects::load(&arguments.file, Path::new(""))?);
    let resource: Resource = at.parse().map_err(|source| ProbeError::Address { source })?;
    let Some((host, port, protocol)) = place_of(&resource) else {
        return Err(ProbeError::Unspoken { resource: resource.to_string() });
    };
    let reply = Duration::from_secs_f64(arguments.timeout_s);
    let spec = SessionSpec {
        instrument: "the instrument".to_owned(),
        host,
        port,
        protocol,
        dialect: Arc::clone(&dialect),
        timing: Timing { reply, ..Timing::default() },
        caps: Caps::default(),
    };
    let (hang_up, sessions) = (CancellationToken::new(), TaskTracker::new());
    let handle = session::spawn(spec, hang_up.clone(), &sessions);
    sessions.close();
    // Who it is and its error queue are asked for before anything else.
    let after = Timing::default().connect + 3 * reply;
    let mut watch = handle.watch();
    let up = tokio::time::timeout(after, watch.wait_for(|link| link.up)).await.is_ok_and(|link| link.is_ok());
    if !up {
        let reason = watch.borrow().trouble.clone().unwrap_or_else(|| "it said nothing".to_owned());
        hang_up.cancel();
        return Err(ProbeError::Unreachable { resource: resource.to_string(), after, reason });
    }
    let identity = watch.borrow().identity.clone();
    let mut findings = Findings::new(dialect.name(), &resource.to_string(), identity.as_deref());
    trial::all(&handle, arguments, &mut findings).await;
    hang_up.cancel();
    sessions.wait().await;
    Ok(findings)
}
