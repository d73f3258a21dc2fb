//! `/bench`: what there is and how it is, and bringing it to rest once a person has looked.

use axum::Json;
use axum::extract::State;
use evenpair_api::{Bench, Problem};
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;
use super::problem::Fault;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new().routes(routes!(bench)).routes(routes!(settle))
}

/// The bench: instruments and their links, pairs, settings, routes, references.
#[utoipa::path(get, path = "/bench", tag = "bench", responses((status = 200, body = Bench)))]
async fn bench(State(desk): State<Desk>) -> Result<Json<Bench>, Fault> {
    Ok(Json(desk.conductor.bench().await?))
}

/// A person has looked at the bench: apply the safe state again. Refused while a run has the bench.
#[utoipa::path(post, path = "/bench/settle", tag = "bench", responses((status = 200, body = Bench), (status = 409, body = Problem)))]
async fn settle(State(desk): State<Desk>) -> Result<Json<Bench>, Fault> {
    Ok(Json(desk.conductor.settle().await?))
}
