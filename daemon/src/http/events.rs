//! `GET /runs/{id}/events`: what happens to a run, as server-sent events, resumable by `Last-Event-ID`.

use std::convert::Infallible;

use axum::extract::{Path, State};
use axum::http::HeaderMap;
use axum::response::sse::{Event, KeepAlive, Sse};
use evenpair_api::{Event as RunEvent, Problem, ProblemCode};
use futures_util::{Stream, StreamExt};
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;
use super::problem::Fault;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new().routes(routes!(events))
}

/// The run's events from the first, or after the one whose id `Last-Event-ID` names; the stream closes when the run has
/// ended or the daemon shuts down.
#[utoipa::path(get, path = "/runs/{id}/events", tag = "runs",
    params(("id" = String, Path, description = "the run's identity"),
           ("Last-Event-ID" = Option<u64>, Header, description = "the last generation that was seen")),
    responses((status = 200, content((RunEvent = "text/event-stream"))), (status = 404, body = Problem), (status = 422, body = Problem)))]
async fn events(
    State(desk): State<Desk>,
    Path(id): Path<String>,
    headers: HeaderMap,
) -> Result<Sse<impl Stream<Item = Result<Event, Infallible>>>, Fault> {
    let after = match headers.get("last-event-id") {
        None => 0,
        Some(text) => text.to_str().ok().and_then(|text| text.trim().parse().ok()).ok_or_else(|| {
            Fault::new(ProblemCode::InvalidRequest, "`Last-Event-ID` must be the whole number of an event's id")
        })?,
    };
    let follow = desk.conductor.follow(&id, after).await?;
    let stream = follow.take_until(desk.shutdown.clone().cancelled_owned()).map(|event| {
        let id = event.generation.to_string();
        Ok(Event::default().id(&id).json_data(&event).unwrap_or_else(|_| Event::default().id(id)))
    });
    Ok(Sse::new(stream).keep_alive(KeepAlive::default()))
}
