//! The analysis of records that were saved elsewhere: no instrument, no store, only mathematics.

use evenpair_api::{Analysis, AnalysisRequest};
use tokio::sync::Semaphore;

use super::Refusal;

/// One at a time: an analysis of the largest request takes a processor for seconds and hundreds of megabytes, and the
/// bench's own captures must not wait for several of them.
static ONE: Semaphore = Semaphore::const_new(1);

/// Analyses saved records. A client that goes away changes nothing; what was begun is finished and thrown away.
pub(crate) async fn analyse(request: AnalysisRequest) -> Result<Analysis, Refusal> {
    let refused = |what: String, help: &str| Refusal::BadRequest { what, help: help.to_owned() };
    let Ok(turn) = ONE.acquire().await else { return Err(Refusal::ShuttingDown) };
    let work = tokio::task::spawn_blocking(move || {
        let answer = request.answer();
        drop(turn);
        answer
    });
    match work.await {
        Ok(answer) => answer.map_err(|error| refused(error.to_string(), "nothing was changed")),
        // A fault of the mathematics is answered like any other fault of a handler.
        Err(error) if error.is_panic() => std::panic::resume_unwind(error.into_panic()),
        Err(_) => Err(Refusal::ShuttingDown),
    }
}
