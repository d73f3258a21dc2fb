//! `/runs`: start, list, show and stop.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::StatusCode;
use evenpair_api::{Problem, Run, RunRequest, Runs};
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;
use super::body::Body;
use super::problem::Fault;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new().routes(routes!(start, list)).routes(routes!(show)).routes(routes!(stop))
}

/// Start a sequence by name or by text. It is checked whole first; a mistake starts nothing.
#[utoipa::path(post, path = "/runs", tag = "runs", request_body = RunRequest,
    responses((status = 202, body = Run), (status = 404, body = Problem), (status = 409, body = Problem),
              (status = 413, body = Problem), (status = 422, body = Problem)))]
async fn start(State(desk): State<Desk>, Body(request): Body<RunRequest>) -> Result<(StatusCode, Json<Run>), Fault> {
    Ok((StatusCode::ACCEPTED, Json(desk.conductor.start(request).await?)))
}

/// All runs, the latest first, without their stages.
#[utoipa::path(get, path = "/runs", tag = "runs", responses((status = 200, body = Runs)))]
async fn list(State(desk): State<Desk>) -> Result<Json<Runs>, Fault> {
    Ok(Json(desk.conductor.runs().await?))
}

/// One run with its stages.
#[utoipa::path(get, path = "/runs/{id}", tag = "runs", params(("id" = String, Path, description = "the run's identity")),
    responses((status = 200, body = Run), (status = 404, body = Problem)))]
async fn show(State(desk): State<Desk>, Path(id): Path<String>) -> Result<Json<Run>, Fault> {
    Ok(Json(desk.conductor.run(&id).await?))
}

/// Stop a run: what is being done is abandoned, the `always` part and the safe state are carried out. A run that has
/// ended stays as it is.
#[utoipa::path(post, path = "/runs/{id}/stop", tag = "runs", params(("id" = String, Path, description = "the run's identity")),
    responses((status = 202, body = Run), (status = 404, body = Problem)))]
async fn stop(State(desk): State<Desk>, Path(id): Path<String>) -> Result<(StatusCode, Json<Run>), Fault> {
    Ok((StatusCode::ACCEPTED, Json(desk.conductor.stop(&id).await?)))
}
