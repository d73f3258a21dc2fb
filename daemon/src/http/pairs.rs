//! `/pairs`: the pairs, their corrections, and the two things a person does with one: deskew and verify.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::StatusCode;
use evenpair_api::{Correction, DeskewRequest, Pair, Problem, Run, VerifyRequest};
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;
use super::body::Body;
use super::problem::Fault;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new()
        .routes(routes!(pairs))
        .routes(routes!(correction))
        .routes(routes!(deskew))
        .routes(routes!(verify))
}

/// Every pair of the bench.
#[utoipa::path(get, path = "/pairs", tag = "pairs", responses((status = 200, body = Vec<Pair>)))]
async fn pairs(State(desk): State<Desk>) -> Result<Json<Vec<Pair>>, Fault> {
    Ok(Json(desk.conductor.bench().await?.pairs))
}

/// The pair's correction and whether it holds now.
#[utoipa::path(get, path = "/pairs/{pair}/correction", tag = "pairs", params(("pair" = String, Path, description = "the pair's name")),
    responses((status = 200, body = Correction), (status = 404, body = Problem)))]
async fn correction(State(desk): State<Desk>, Path(pair): Path<String>) -> Result<Json<Correction>, Fault> {
    Ok(Json(desk.conductor.correction(&pair).await?))
}

/// Deskew the pair: acquire its references on both legs and make a correction, then verify it. Answers with the run.
#[utoipa::path(post, path = "/pairs/{pair}/deskew", tag = "pairs", params(("pair" = String, Path, description = "the pair's name")),
    request_body = Option<DeskewRequest>,
    responses((status = 202, body = Run), (status = 404, body = Problem), (status = 409, body = Problem), (status = 422, body = Problem)))]
async fn deskew(
    State(desk): State<Desk>,
    Path(pair): Path<String>,
    Body(request): Body<DeskewRequest>,
) -> Result<(StatusCode, Json<Run>), Fault> {
    Ok((StatusCode::ACCEPTED, Json(desk.conductor.deskew(&pair, request).await?)))
}

/// Verify the pair's correction on fresh acquisitions. Answers with the run.
#[utoipa::path(post, path = "/pairs/{pair}/verify", tag = "pairs", params(("pair" = String, Path, description = "the pair's name")),
    request_body = Option<VerifyRequest>,
    responses((status = 202, body = Run), (status = 404, body = Problem), (status = 409, body = Problem), (status = 422, body = Problem)))]
async fn verify(
    State(desk): State<Desk>,
    Path(pair): Path<String>,
    Body(request): Body<VerifyRequest>,
) -> Result<(StatusCode, Json<Run>), Fault> {
    Ok((StatusCode::ACCEPTED, Json(desk.conductor.verify(&pair, request).await?)))
}
