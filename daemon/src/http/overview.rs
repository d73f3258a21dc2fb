//! `GET /bench`: what there is and how it is.

use axum::Json;
use axum::extract::State;
use evenpair_api::Bench;
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new().routes(routes!(bench))
}

/// The bench: instruments and their links, pairs, settings, routes, references.
#[utoipa::path(get, path = "/bench", tag = "bench", responses((status = 200, body = Bench)))]
async fn bench(State(desk): State<Desk>) -> Json<Bench> {
    Json(desk.conductor.bench())
}
