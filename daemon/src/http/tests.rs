use std::collections::BTreeSet;

use axum::response::IntoResponse;
use evenpair_api::ProblemCode;

use super::problem::{Fault, of_panic};
use super::*;

#[test]
fn the_description_names_every_route() {
    let (_, description) =
        OpenApiRouter::with_openapi(describe::head()).nest(evenpair_api::PREFIX, resources()).split_for_parts();
    let paths: BTreeSet<&str> = description.paths.paths.keys().map(String::as_str).collect();
    for path in [
        "/bench",
        "/bench/settle",
        "/budget",
        "/health",
        "/pairs",
        "/pairs/{pair}/correction",
        "/pairs/{pair}/corrections",
        "/pairs/{pair}/deskew",
        "/pairs/{pair}/transfer",
        "/pairs/{pair}/verify",
        "/runs",
        "/runs/{id}",
        "/runs/{id}/captures",
        "/runs/{id}/captures/{n}/waveform",
        "/runs/{id}/events",
        "/runs/{id}/stop",
        "/sequences",
    ] {
        assert!(paths.contains(format!("/api/v1{path}").as_str()), "{path} is missing in {paths:?}");
    }
    let schemas = description.components.unwrap().schemas;
    for name in ["Quantity", "Correction", "Capture", "Run", "Problem", "Event"] {
        assert!(schemas.contains_key(name), "{name} is missing");
    }
}

#[tokio::test]
async fn a_fault_is_a_problem_document() {
    let response = Fault::new(ProblemCode::UnknownPair, "no such pair").into_response();
    assert_eq!(response.status(), 404);
    assert_eq!(response.headers()["content-type"], "application/problem+json");
    let body = axum::body::to_bytes(response.into_body(), 10_000).await.unwrap();
    let problem: evenpair_api::Problem = serde_json::from_slice(&body).unwrap();
    assert_eq!(problem.kind, "urn:evenpair:problem:unknown-pair");
    assert_eq!((problem.status, problem.code), (404, ProblemCode::UnknownPair));
    assert_eq!(problem.detail, "no such pair");
}

#[tokio::test]
async fn a_panics_text_stays_inside() {
    let response = of_panic(Box::new("secret".to_owned()));
    assert_eq!(response.status(), 500);
    let body = axum::body::to_bytes(response.into_body(), 10_000).await.unwrap();
    assert!(!String::from_utf8_lossy(&body).contains("secret"));
}
