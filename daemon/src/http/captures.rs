//! `/runs/{id}/captures`: what a run measured, as figures and as waveforms.

#![expect(unused_qualifications, reason = "utoipa's macro writes the path of the query's type out")]

use axum::Json;
use axum::body::Body;
use axum::extract::{Path, Query, State};
use axum::http::{HeaderMap, header};
use axum::response::{IntoResponse, Response};
use evenpair_api::{Captures, Problem, ProblemCode};
use serde::Deserialize;
use tokio_util::io::ReaderStream;
use utoipa::IntoParams;
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;
use super::problem::Fault;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new().routes(routes!(captures)).routes(routes!(waveform))
}

/// The media type of a Parquet file, as registered with IANA.
const PARQUET: &str = "application/vnd.apache.parquet";
const CSV: &str = "text/csv";

/// The most captures of one page: a few kilobytes each, so a page stays below a megabyte.
const LARGEST_PAGE: u32 = 200;

#[derive(Deserialize, IntoParams)]
#[into_params(parameter_in = Query)]
struct Page {
    /// Captures with a higher number than this; 0 to begin.
    #[serde(default)]
    after: u32,
    /// How many at most, 1 to 200.
    #[serde(default = "usual_page")]
    limit: u32,
}

fn usual_page() -> u32 {
    50
}

/// A page of the run's captures, by number.
#[utoipa::path(get, path = "/runs/{id}/captures", tag = "captures",
    params(("id" = String, Path, description = "the run's identity"), Page),
    responses((status = 200, body = Captures), (status = 404, body = Problem), (status = 422, body = Problem)))]
async fn captures(
    State(desk): State<Desk>,
    Path(id): Path<String>,
    page: Result<Query<Page>, axum::extract::rejection::QueryRejection>,
) -> Result<Json<Captures>, Fault> {
    let Query(page) = page.map_err(|error| Fault::new(ProblemCode::InvalidRequest, error.body_text()))?;
    if !(1..=LARGEST_PAGE).contains(&page.limit) {
        return Err(Fault::new(ProblemCode::InvalidRequest, format!("`limit` must be 1 to {LARGEST_PAGE}")));
    }
    Ok(Json(desk.conductor.captures(&id, page.after, page.limit).await?))
}

/// The capture's records and its corrected difference: Parquet (the stored file) or CSV in volts, as `Accept` says.
#[utoipa::path(get, path = "/runs/{id}/captures/{n}/waveform", tag = "captures",
    params(("id" = String, Path, description = "the run's identity"), ("n" = u32, Path, description = "the capture's number")),
    responses((status = 200, content((String = "application/vnd.apache.parquet"), (String = "text/csv"))),
              (status = 404, body = Problem), (status = 406, body = Problem)))]
async fn waveform(
    State(desk): State<Desk>,
    Path((id, n)): Path<(String, String)>,
    headers: HeaderMap,
) -> Result<Response, Fault> {
    let number: u32 = n.parse().map_err(|_| {
        Fault::new(ProblemCode::UnknownCapture, format!("`{n}` is not a capture's number; they count from 1"))
    })?;
    let accept = headers.get(header::ACCEPT).and_then(|accept| accept.to_str().ok()).unwrap_or("*/*");
    match choose(accept) {
        Some(PARQUET) => {
            let path = desk.conductor.waveform_file(&id, number).await?;
            let name = format!("attachment; filename=\"{id}-{number}.parquet\"");
            let file = tokio::fs::File::open(&path).await.map_err(|error| {
                Fault::new(
                    ProblemCode::StoreFailed,
                    format!("opening the capture's waveform {}: {error}", path.display()),
                )
            })?;
            let body = Body::from_stream(ReaderStream::new(file));
            Ok(([(header::CONTENT_TYPE, PARQUET.to_owned()), (header::CONTENT_DISPOSITION, name)], body)
                .into_response())
        }
        Some(_) => {
            let text = desk.conductor.waveform_csv(&id, number).await?;
            Ok(([(header::CONTENT_TYPE, "text/csv; charset=utf-8")], text).into_response())
        }
        None => {
            let offered = format!("`{accept}` asks for neither {PARQUET} nor {CSV}");
            Err(Fault::new(ProblemCode::NotAcceptable, offered))
        }
    }
}

/// The first offered type that an `Accept` header names (RFC 9110, 12.5.1; quality values are not weighed, a type with
/// q=0 is skipped).
fn choose(accept: &str) -> Option<&'static str> {
    accept.split(',').find_map(|part| {
        let mut words = part.split(';').map(str::trim);
        let kind = words.next().unwrap_or_default();
        if words.any(|word| word == "q=0") {
            return None;
        }
        match kind {
            "*/*" | "application/*" | "application/octet-stream" | PARQUET => Some(PARQUET),
            CSV | "text/*" => Some(CSV),
            _ => None,
        }
    })
}

#[cfg(test)]
mod tests {
    use super::{CSV, PARQUET, choose};

    #[test]
    fn the_first_known_type_is_chosen() {
        assert_eq!(choose("*/*"), Some(PARQUET));
        assert_eq!(choose("text/csv"), Some(CSV));
        assert_eq!(choose("image/png, text/csv;q=0.5"), Some(CSV));
        assert_eq!(choose("text/csv;q=0, application/*"), Some(PARQUET));
        assert_eq!(choose("image/png"), None);
    }
}
