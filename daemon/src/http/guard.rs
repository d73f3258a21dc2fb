//! Host and Origin: a page from elsewhere must not drive the bench through a person's browser.

use axum::extract::Request;
use axum::http::header;
use axum::middleware::Next;
use axum::response::{IntoResponse, Response};
use evenpair_api::ProblemCode;

use super::problem::Fault;

/// Refuses a request whose `Host` is no loopback name (a name that was rebound to this machine) or whose `Origin` is
/// another site. The daemon listens on loopback only, so nobody honest comes by another name.
pub(crate) async fn check_host_and_origin(request: Request, next: Next) -> Response {
    match objection(&request) {
        Some(what) => {
            let detail = format!("{what}; ask by http://127.0.0.1 or http://localhost");
            Fault::new(ProblemCode::InvalidRequest, detail).into_response()
        }
        None => next.run(request).await,
    }
}

/// What speaks against a request.
fn objection(request: &Request) -> Option<String> {
    let text = |name| request.headers().get(name).map(|value| value.to_str().unwrap_or("?").to_owned());
    let host = text(header::HOST).or_else(|| request.uri().authority().map(ToString::to_string));
    let Some(host) = host else { return Some("the request has no Host".to_owned()) };
    if !is_loopback(&host) {
        return Some(format!("the Host `{host}` is not a loopback name"));
    }
    let origin = text(header::ORIGIN).filter(|origin| *origin != format!("http://{host}"));
    origin.map(|origin| format!("the Origin `{origin}` is not this daemon"))
}

fn is_loopback(host: &str) -> bool {
    let name = match host.strip_prefix('[') {
        Some(rest) => rest.split(']').next().unwrap_or(rest),
        None => host.rsplit_once(':').map_or(host, |(name, _)| name),
    };
    name == "localhost" || name.parse::<std::net::IpAddr>().is_ok_and(|address| address.is_loopback())
}

#[cfg(test)]
mod tests {
    use super::is_loopback;

    #[test]
    fn only_loopback_names_pass() {
        for host in ["localhost", "localhost:7488", "127.0.0.1:1", "127.0.0.9", "[::1]:7488", "[::1]"] {
            assert!(is_loopback(host), "{host}");
        }
        for host in ["bench.example", "localhost.evil.example:80", "10.0.0.1:7488", "[::2]", "", "127.0.0.1.example"] {
            assert!(!is_loopback(host), "{host}");
        }
    }
}
