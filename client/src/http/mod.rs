//! The daemon's API as typed calls.

mod events;
mod resources;

use evenpair_api::{PREFIX, Problem};
use reqwest::{RequestBuilder, Response};
use serde::de::DeserializeOwned;

use crate::trouble::Trouble;

/// A daemon, seen from outside.
#[derive(Debug, Clone)]
pub(crate) struct Daemon {
    base: String,
    client: reqwest::Client,
}

impl Daemon {
    /// The daemon at `server`, such as `http://127.0.0.1:7488`. Nothing is sent yet.
    pub(crate) fn new(server: &str) -> Result<Self, Trouble> {
        let server = server.trim_end_matches('/');
        if !server.starts_with("http://") {
            return Err(Trouble::Usage(format!(
                "`{server}` is no server's address; write it like http://127.0.0.1:7488"
            )));
        }
        // A proxy has no business between a client and a daemon on loopback.
        let client = reqwest::Client::builder()
            .no_proxy()
            .connect_timeout(std::time::Duration::from_secs(5))
            .build()
            .map_err(|error| Trouble::Demo(format!("making an HTTP client: {error}")))?;
        Ok(Self { base: format!("{server}{PREFIX}"), client })
    }

    fn url(&self, path: &str) -> String {
        format!("{}{path}", self.base)
    }

    /// Sends a request; a problem document becomes an error.
    async fn send(&self, request: RequestBuilder) -> Result<Response, Trouble> {
        let response = request.send().await.map_err(|error| self.unreachable(&error))?;
        if response.status().is_success() {
            return Ok(response);
        }
        let status = response.status();
        let body = response.bytes().await.map_err(|error| self.unreachable(&error))?;
        match serde_json::from_slice::<Problem>(&body) {
            Ok(problem) => Err(Trouble::Problem(Box::new(problem))),
            Err(_) => Err(Trouble::Answer {
                url: self.base.clone(),
                what: format!("status {status} without a problem document"),
            }),
        }
    }

    async fn json<T: DeserializeOwned>(&self, request: RequestBuilder) -> Result<T, Trouble> {
        let body = self.send(request).await?.bytes().await.map_err(|error| self.unreachable(&error))?;
        serde_json::from_slice(&body).map_err(|error| Trouble::Answer {
            url: self.base.clone(),
            what: format!("something unexpected ({error})"),
        })
    }

    fn unreachable(&self, error: &reqwest::Error) -> Trouble {
        // The innermost cause says what happened ("Connection refused"); the outer ones repeat the address.
        let mut cause: &dyn std::error::Error = error;
        while let Some(inner) = cause.source() {
            cause = inner;
        }
        Trouble::Unreachable { url: self.base.clone(), reason: cause.to_string() }
    }
}

#[cfg(test)]
mod tests;
