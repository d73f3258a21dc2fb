//! The HTTP API under `/api/v1`: a file per resource, one table of problems, one description of it all.
//!
//! Handlers only ask the conductor and answer; nothing that a vanished client could leave half done happens here.

mod analyse;
mod body;
mod budget;
mod captures;
mod describe;
mod events;
mod guard;
mod health;
mod overview;
mod pairs;
mod problem;
mod runs;
mod sequences;
mod spectrum;

use axum::Router;
use axum::extract::DefaultBodyLimit;
use evenpair_api::ProblemCode;
use tokio_util::sync::CancellationToken;
use tower_http::catch_panic::CatchPanicLayer;
use utoipa_axum::router::OpenApiRouter;

use crate::conductor::Conductor;
use problem::Fault;

/// The largest body that is read, but for [`analyse`], which has its own limit: a sequence's text of 1 MiB (the most that is parsed) with its JSON escapes.
const LARGEST_BODY: usize = 2 << 20;

/// What every handler has at hand.
#[derive(Clone)]
pub(crate) struct Desk {
    conductor: Conductor,
    /// Ends every stream: an open one would keep the server from draining.
    shutdown: CancellationToken,
}

/// The whole API, ready to serve.
pub(crate) fn router(conductor: Conductor, shutdown: CancellationToken) -> Router {
    let (router, description) =
        OpenApiRouter::with_openapi(describe::head()).nest(evenpair_api::PREFIX, resources()).split_for_parts();
    router
        .merge(describe::route(description))
        .fallback(async || Fault::new(ProblemCode::UnknownPath, "no resource has this path; see /api/v1/openapi.json"))
        .method_not_allowed_fallback(async || {
            Fault::new(ProblemCode::MethodNotAllowed, "this path has other methods; see /api/v1/openapi.json")
        })
        .layer(DefaultBodyLimit::max(LARGEST_BODY))
        .layer(axum::middleware::from_fn(guard::check_host_and_origin))
        .layer(CatchPanicLayer::custom(problem::of_panic))
        .with_state(Desk { conductor, shutdown })
}

fn resources() -> OpenApiRouter<Desk> {
    OpenApiRouter::new()
        .merge(analyse::routes())
        .merge(budget::routes())
        .merge(captures::routes())
        .merge(events::routes())
        .merge(health::routes())
        .merge(overview::routes())
        .merge(pairs::routes())
        .merge(runs::routes())
        .merge(sequences::routes())
        .merge(spectrum::routes())
}

#[cfg(test)]
mod tests;
