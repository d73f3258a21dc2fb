//! Errors as problem documents (RFC 9457): the one table of codes, statuses and titles.

use std::any::Any;

use axum::http::{HeaderValue, StatusCode, header};
use axum::response::{IntoResponse, Response};
use evenpair_api::{MistakeReport, Problem, ProblemCode};

use crate::conductor::Refusal;

/// What a handler answers when it cannot do what was asked.
#[derive(Debug)]
pub(crate) struct Fault {
    code: ProblemCode,
    detail: String,
    mistakes: Vec<MistakeReport>,
}

impl Fault {
    pub(crate) fn new(code: ProblemCode, detail: impl Into<String>) -> Self {
        Self { code, detail: detail.into(), mistakes: Vec::new() }
    }
}

/// Status and title of every problem.
fn status_and_title(code: ProblemCode) -> (StatusCode, &'static str) {
    use ProblemCode as P;
    match code {
        P::BenchUnsettled => (StatusCode::CONFLICT, "The bench is unsettled"),
        P::BodyTooLarge => (StatusCode::PAYLOAD_TOO_LARGE, "The body is too large"),
        P::InvalidRequest => (StatusCode::UNPROCESSABLE_ENTITY, "The request is not valid"),
        P::Internal => (StatusCode::INTERNAL_SERVER_ERROR, "The daemon has a fault"),
        P::MethodNotAllowed => (StatusCode::METHOD_NOT_ALLOWED, "The method is not allowed here"),
        P::NoCorrection => (StatusCode::NOT_FOUND, "The pair has no correction"),
        P::NotAcceptable => (StatusCode::NOT_ACCEPTABLE, "None of the accepted media types is offered"),
        P::SequenceRefused => (StatusCode::UNPROCESSABLE_ENTITY, "The sequence has mistakes"),
        P::ShuttingDown => (StatusCode::SERVICE_UNAVAILABLE, "The daemon is shutting down"),
        P::StoreFailed => (StatusCode::INSUFFICIENT_STORAGE, "The store failed"),
        P::UnknownCapture => (StatusCode::NOT_FOUND, "There is no such capture"),
        P::UnknownPair => (StatusCode::NOT_FOUND, "There is no such pair"),
        P::UnknownPath => (StatusCode::NOT_FOUND, "There is no such resource"),
        P::UnknownRun => (StatusCode::NOT_FOUND, "There is no such run"),
        P::UnknownSequence => (StatusCode::NOT_FOUND, "There is no such sequence"),
        P::UnsupportedMediaType => (StatusCode::UNSUPPORTED_MEDIA_TYPE, "The body's media type is not supported"),
    }
}

impl From<Refusal> for Fault {
    fn from(refusal: Refusal) -> Self {
        let detail = refusal.to_string();
        let mut fault = Self::new(ProblemCode::Internal, detail);
        fault.code = match refusal {
            Refusal::BadRequest { .. } => ProblemCode::InvalidRequest,
            Refusal::NoCorrection { .. } => ProblemCode::NoCorrection,
            Refusal::SequenceMistakes { mistakes } => {
                fault.mistakes = mistakes;
                ProblemCode::SequenceRefused
            }
            Refusal::ShuttingDown => ProblemCode::ShuttingDown,
            Refusal::Store(_) => ProblemCode::StoreFailed,
            Refusal::UnknownCapture { .. } => ProblemCode::UnknownCapture,
            Refusal::UnknownPair { .. } => ProblemCode::UnknownPair,
            Refusal::UnknownRun { .. } => ProblemCode::UnknownRun,
            Refusal::UnknownSequence { .. } => ProblemCode::UnknownSequence,
            Refusal::Unsettled { .. } => ProblemCode::BenchUnsettled,
        };
        fault
    }
}

impl IntoResponse for Fault {
    fn into_response(self) -> Response {
        let (status, title) = status_and_title(self.code);
        if status.is_server_error() {
            tracing::error!(code = ?self.code, detail = %self.detail, "request failed");
        }
        let code_name = serde_json::to_value(self.code).ok().and_then(|v| v.as_str().map(str::to_owned));
        let document = Problem {
            kind: format!("urn:evenpair:problem:{}", code_name.unwrap_or_default()),
            title: title.to_owned(),
            status: status.as_u16(),
            detail: self.detail,
            code: self.code,
            mistakes: self.mistakes,
        };
        let mut response = (status, axum::Json(document)).into_response();
        response.headers_mut().insert(header::CONTENT_TYPE, HeaderValue::from_static("application/problem+json"));
        response
    }
}

/// The answer to a request whose handler panicked; the panic's text stays in the log.
pub(crate) fn of_panic(panic: Box<dyn Any + Send + 'static>) -> Response {
    let text = panic.downcast_ref::<String>().map(String::as_str).or_else(|| panic.downcast_ref::<&str>().copied());
    tracing::error!(panic = text.unwrap_or("of an unknown kind"), "a handler panicked");
    Fault::new(ProblemCode::Internal, "the request met a fault of the daemon; its log has more").into_response()
}
