//! The safe state: every instrument brought to rest, each on its own, within a stated time.

use std::collections::BTreeMap;
use std::time::Duration;

use evenpair_core::bench::{Bench, BenchCall};
use futures_util::future::join_all;

use super::instruments::Instruments;
use crate::session::SessionError;

/// The most that bringing one instrument to rest may take: a reconnection and a handful of commands.
pub(crate) const WITHIN: Duration = Duration::from_secs(10);

/// Applies the safe state. Instruments go to rest at the same time, so that a dead one holds nobody up; the calls of one
/// instrument keep their order, and one that fails does not keep the others from being sent.
///
/// # Errors
/// What did not work, in words, one after the other.
pub(crate) async fn apply(bench: &Bench, instruments: &Instruments) -> Result<(), String> {
    let mut of_instrument: BTreeMap<&str, Vec<&BenchCall>> = BTreeMap::new();
    for call in &bench.safe {
        of_instrument.entry(&call.instrument).or_default().push(call);
    }
    let rest = of_instrument.into_iter().map(|(name, calls)| async move {
        let mut failures = Vec::new();
        let all = async {
            for call in calls {
                match instruments.perform(call).await {
                    Ok(_) => {}
                    // Nothing that follows can reach it either, and each would be waited for.
                    Err(error @ SessionError::Unreachable { .. }) => return failures.push(error.to_string()),
                    Err(error) => failures.push(error.to_string()),
                }
            }
        };
        if tokio::time::timeout(WITHIN, all).await.is_err() {
            failures.push(format!("`{name}` was not brought to rest within {} s", WITHIN.as_secs()));
        }
        failures
    });
    let failures: Vec<String> = join_all(rest).await.into_iter().flatten().collect();
    if failures.is_empty() { Ok(()) } else { Err(failures.join("; ")) }
}
