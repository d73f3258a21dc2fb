//! `GET /health`: whether the daemon serves, and whether all instruments answer.

use axum::Json;
use axum::extract::State;
use evenpair_api::{LinkState, Rest};
use serde::Serialize;
use utoipa::ToSchema;
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new().routes(routes!(health))
}

/// How the daemon and its bench are.
#[derive(Serialize, ToSchema)]
struct Health {
    /// The daemon's version.
    version: String,
    /// Whether every instrument's link is up.
    links_up: bool,
    /// Whether the bench is at rest.
    rest: Rest,
}

/// Whether the daemon serves, and whether all instruments answer.
#[utoipa::path(get, path = "/health", tag = "health", responses((status = 200, body = Health)))]
async fn health(State(desk): State<Desk>) -> Json<Health> {
    let bench = desk.conductor.bench_itself();
    Json(Health {
        version: env!("CARGO_PKG_VERSION").to_owned(),
        links_up: bench.instruments.iter().all(|instrument| instrument.link == LinkState::Up),
        rest: bench.rest,
    })
}
