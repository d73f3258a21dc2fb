//! A JSON body, with problem documents for what is wrong with it.

use axum::extract::{FromRequest, Request};
use axum::http::header;
use evenpair_api::ProblemCode;
use futures_util::StreamExt;
use serde::de::DeserializeOwned;

use super::problem::Fault;

/// How much of a body that is too large is read before the connection is closed on it: whoever sends more than this is
/// no client with a long sequence.
const MOST_READ: usize = 16 * super::LARGEST_BODY;

/// A JSON body. An empty one stands for `{}`, so that `POST …/deskew` needs none.
///
/// `MOST` is the largest that is taken, in bytes.
pub(crate) struct Body<T, const MOST: usize = { super::LARGEST_BODY }>(pub(crate) T);

impl<S: Send + Sync, T: DeserializeOwned, const MOST: usize> FromRequest<S> for Body<T, MOST> {
    type Rejection = Fault;

    async fn from_request(request: Request, _: &S) -> Result<Self, Fault> {
        let kind = request.headers().get(header::CONTENT_TYPE).and_then(|kind| kind.to_str().ok()).map(str::to_owned);
        let bytes = read(request, MOST).await?;
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

/// The body's bytes. One that is too large is read on and dropped for a while: a client that is still sending when the
/// connection closes sees that it broke, and not the answer.
async fn read(request: Request, most: usize) -> Result<Vec<u8>, Fault> {
    let mut stream = request.into_body().into_data_stream();
    let (mut bytes, mut length) = (Vec::new(), 0_usize);
    while let Some(part) = stream.next().await {
        let part = part.map_err(|error| {
            Fault::new(ProblemCode::InvalidRequest, format!("reading the body failed: {error}; send it again"))
        })?;
        length = length.saturating_add(part.len());
        if length > MOST_READ.max(most) {
            break;
        }
        if length <= most {
            bytes.extend_from_slice(&part);
        }
    }
    if length > most {
        let detail = format!("the body is larger than {most} bytes; send less");
        return Err(Fault::new(ProblemCode::BodyTooLarge, detail));
    }
    Ok(bytes)
}

fn parse<T: DeserializeOwned, const MOST: usize>(bytes: &[u8]) -> Result<Body<T, MOST>, Fault> {
    serde_json::from_slice(bytes).map(Body).map_err(|error| {
        Fault::new(
            ProblemCode::InvalidRequest,
            format!("the body is not what this route takes: {error}; see /api/v1/openapi.json"),
        )
    })
}
