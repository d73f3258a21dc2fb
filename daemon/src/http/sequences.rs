//! `GET /sequences`: the sequences in the bench's folder, each checked against the bench as it is now.

use axum::Json;
use axum::extract::State;
use evenpair_api::Sequences;
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new().routes(routes!(sequences))
}

/// The sequences that can be started by name, each with what its check found.
#[utoipa::path(get, path = "/sequences", tag = "sequences", responses((status = 200, body = Sequences)))]
async fn sequences(State(desk): State<Desk>) -> Json<Sequences> {
    Json(desk.conductor.sequences().await)
}
