//! `POST /analyse`: records that some scope saved, analysed like the bench's own.

use axum::Json;
use evenpair_api::{Analysis, AnalysisRequest, Problem};
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;
use super::body::Body;
use super::problem::Fault;
use crate::conductor;

/// The largest body of this route: two acquisitions of half a million rows with three numbers of 20 characters each.
/// Longer ones are for `evenpair analyse`, which reads files itself.
const LARGEST_BODY: usize = 64 << 20;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new().routes(routes!(analyse))
}

/// Deskew, correct and measure saved records, sent as text. Nothing is stored.
#[utoipa::path(post, path = "/analyse", tag = "analysis", request_body = AnalysisRequest,
    responses((status = 200, body = Analysis), (status = 413, body = Problem), (status = 415, body = Problem),
              (status = 422, body = Problem)))]
async fn analyse(Body(request): Body<AnalysisRequest, LARGEST_BODY>) -> Result<Json<Analysis>, Fault> {
    Ok(Json(conductor::analyse(request).await?))
}
