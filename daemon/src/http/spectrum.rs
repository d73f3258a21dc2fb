//! `/runs/{id}/captures/{n}/spectrum`: a capture's spectra.

#![expect(unused_qualifications, reason = "utoipa's macro writes the path of the query's type out")]

use axum::Json;
use axum::extract::{Path, Query, State};
use evenpair_api::{Problem, ProblemCode, Spectrum};
use evenpair_core::analysis::density::{LONGEST, SHORTEST};
use serde::Deserialize;
use utoipa::IntoParams;
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;
use super::problem::Fault;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new().routes(routes!(spectrum))
}

#[derive(Deserialize, IntoParams)]
#[into_params(parameter_in = Query)]
struct Wish {
    /// The most samples in a segment, 16 to 65536; the next lower power of two that the record holds is taken.
    #[serde(default = "usual_segment")]
    segment: usize,
}

/// 2,049 bins: as many as a picture has dots across.
fn usual_segment() -> usize {
    4096
}

/// The spectra of the capture's corrected difference and common mode, in volts rms per bin and in V/√Hz.
#[utoipa::path(get, path = "/runs/{id}/captures/{n}/spectrum", tag = "captures",
    params(("id" = String, Path, description = "the run's identity"), ("n" = u32, Path, description = "the capture's number"), Wish),
    responses((status = 200, body = Spectrum), (status = 404, body = Problem), (status = 422, body = Problem)))]
async fn spectrum(
    State(desk): State<Desk>,
    Path((id, n)): Path<(String, String)>,
    wish: Result<Query<Wish>, axum::extract::rejection::QueryRejection>,
) -> Result<Json<Spectrum>, Fault> {
    let number: u32 = n.parse().map_err(|_| {
        Fault::new(ProblemCode::UnknownCapture, format!("`{n}` is not a capture's number; they count from 1"))
    })?;
    let Query(wish) = wish.map_err(|error| Fault::new(ProblemCode::InvalidRequest, error.body_text()))?;
    if !(SHORTEST..=LONGEST).contains(&wish.segment) {
        return Err(Fault::new(ProblemCode::InvalidRequest, format!("`segment` must be {SHORTEST} to {LONGEST}")));
    }
    Ok(Json(desk.conductor.spectrum(&id, number, wish.segment).await?))
}
