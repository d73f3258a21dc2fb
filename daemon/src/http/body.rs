//! A JSON body, with problem documents for what is wrong with it.

use axum::body::Bytes;
use axum::extract::{FromRequest, Request};
use axum::http::{StatusCode, header};
use evenpair_api::ProblemCode;
use serde::de::DeserializeOwned;

use super::problem::Fault;

/// A JSON body. An empty one stands for `{}`, so that `POST …/deskew` needs none.
pub(crate) struct Body<T>(pub(crate) T);

impl<S: Send + Sync, T: DeserializeOwned> FromRequest<S> for Body<T> {
    type Rejection = Fault;

    async fn from_request(request: Request, state: &S) -> Result<Self, Fault> {
        let kind = request.headers().get(header::CONTENT_TYPE).and_then(|kind| kind.to_str().ok()).map(str::to_owned);
        let bytes = Bytes::from_request(request, state).await.map_err(|rejection| {
            if rejection.status() == StatusCode::PAYLOAD_TOO_LARGE {
                let (most, saved) = (super::LARGEST_BODY >> 20, super::analyse::LARGEST_BODY >> 20);
                let limits = format!("the body is larger than this path takes ({most} MiB, `/analyse` {saved} MiB)");
                Fault::new(ProblemCode::BodyTooLarge, format!("{limits}; send less"))
            } else {
                Fault::new(ProblemCode::InvalidRequest, format!("reading the body failed: {rejection}"))
            }
        })?;
        if bytes.iter().all(u8::is_ascii_whitespace) {
            return parse(b"{}");
        }
        // A form or a plain text is what a foreign page could send without asking first; JSON it cannot.
        if kind.as_deref().is_none_or(|kind| kind.split(';').next().unwrap_or(kind).trim() != "application/json") {
            let found = kind.unwrap_or_else(|| "none".to_owned());
            return Err(Fault::new(
                ProblemCode::UnsupportedMediaType,
                format!("the body's media type is {found}; send application/json"),
            ));
        }
        parse(&bytes)
    }
}

fn parse<T: DeserializeOwned>(bytes: &[u8]) -> Result<Body<T>, Fault> {
    serde_json::from_slice(bytes).map(Body).map_err(|error| {
        Fault::new(
            ProblemCode::InvalidRequest,
            format!("the body is not what this route takes: {error}; see /api/v1/openapi.json"),
        )
    })
}
