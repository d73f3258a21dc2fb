//! `GET /api/v1/openapi.json`: the API described by itself.

use axum::Router;
use axum::routing::get;
use utoipa::OpenApi;

use super::Desk;

#[derive(OpenApi)]
#[openapi(info(
    title = "Evenpair",
    description = "Deskew two single-ended scope probes, measure the voltage between two points, log it with its \
                   uncertainty. Quantities are {value, u, unit} with u the standard uncertainty. Errors are problem \
                   documents (RFC 9457)."
))]
struct Head;

/// Title and description; paths and types are added by the routes themselves.
pub(crate) fn head() -> utoipa::openapi::OpenApi {
    Head::openapi()
}

/// The route that serves the finished description.
pub(crate) fn route(description: utoipa::openapi::OpenApi) -> Router<Desk> {
    let path = format!("{}/openapi.json", evenpair_api::PREFIX);
    let description = std::sync::Arc::new(description);
    Router::new().route(&path, get(async move || axum::Json(std::sync::Arc::unwrap_or_clone(description.clone()))))
}
