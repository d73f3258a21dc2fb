//! `/pairs`: the pairs, their corrections, and what a person does with one: deskew, verify, transfer to another range.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::StatusCode;
use evenpair_api::{Correction, Corrections, DeskewRequest, Pair, Problem, Run, TransferRequest, VerifyRequest};
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;
use super::body::Body;
use super::problem::Fault;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new()
        .routes(routes!(pairs))
        .routes(routes!(correction))
        .routes(routes!(corrections))
        .routes(routes!(deskew))
        .routes(routes!(transfer))
        .routes(routes!(verify))
}

/// Every pair of the bench.
#[utoipa::path(get, path = "/pairs", tag = "pairs", responses((status = 200, body = Vec<Pair>)))]
async fn pairs(State(desk): State<Desk>) -> Result<Json<Vec<Pair>>, Fault> {
    Ok(Json(desk.conductor.bench().await?.pairs))
}

/// The pair's correction on the range of the bench file, and whether it holds now.
#[utoipa::path(get, path = "/pairs/{pair}/correction", tag = "pairs", params(("pair" = String, Path, description = "the pair's name")),
    responses((status = 200, body = Correction), (status = 404, body = Problem)))]
async fn correction(State(desk): State<Desk>, Path(pair): Path<String>) -> Result<Json<Correction>, Fault> {
    Ok(Json(desk.conductor.correction(&pair).await?))
}

/// The pair's corrections, the newest of each vertical range, the newest first; each judged on its own range.
#[utoipa::path(get, path = "/pairs/{pair}/corrections", tag = "pairs", params(("pair" = String, Path, description = "the pair's name")),
    responses((status = 200, body = Corrections), (status = 404, body = Problem)))]
async fn corrections(State(desk): State<Desk>, Path(pair): Path<String>) -> Result<Json<Corrections>, Fault> {
    Ok(Json(desk.conductor.corrections(&pair).await?))
}

/// Transfer the pair's correction to another vertical range by a signal that both ranges can show. Answers with the run.
#[utoipa::path(post, path = "/pairs/{pair}/transfer", tag = "pairs", params(("pair" = String, Path, description = "the pair's name")),
    request_body = TransferRequest,
    responses((status = 202, body = Run), (status = 404, body = Problem), (status = 409, body = Problem), (status = 422, body = Problem)))]
async fn transfer(
    State(desk): State<Desk>,
    Path(pair): Path<String>,
    Body(request): Body<TransferRequest>,
) -> Result<(StatusCode, Json<Run>), Fault> {
    Ok((StatusCode::ACCEPTED, Json(desk.conductor.transfer(&pair, request).await?)))
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
