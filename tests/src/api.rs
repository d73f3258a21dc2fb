//! The daemon's API as a stranger's program would use it: plain JSON over HTTP, no types of ours.

use std::time::Duration;

use serde_json::Value;

use crate::process::PATIENCE;

/// An answer of the API.
#[derive(Debug, Clone)]
pub struct Answer {
    /// The HTTP status.
    pub status: u16,
    /// The media type.
    pub media_type: String,
    /// The body's bytes.
    pub bytes: Vec<u8>,
}

impl Answer {
    /// The body as JSON.
    ///
    /// # Panics
    /// When it is none.
    #[must_use]
    pub fn json(&self) -> Value {
        serde_json::from_slice(&self.bytes)
            .unwrap_or_else(|error| panic!("{error}: {}", String::from_utf8_lossy(&self.bytes)))
    }
}

/// A daemon's API.
#[derive(Debug, Clone)]
pub struct Api {
    base: String,
    client: reqwest::Client,
}

impl Api {
    /// The API at `base`, such as `http://127.0.0.1:7488`.
    ///
    /// # Panics
    /// When no HTTP client can be made.
    #[must_use]
    pub fn new(base: &str) -> Self {
        let client = reqwest::Client::builder().timeout(PATIENCE).build().expect("an HTTP client");
        Self { base: format!("{base}/api/v1"), client }
    }

    /// Where the API begins.
    #[must_use]
    pub fn base(&self) -> &str {
        &self.base
    }

    /// Sends a request made by `make` and reads the answer.
    ///
    /// # Panics
    /// When the daemon does not answer.
    pub async fn send(&self, make: impl FnOnce(&reqwest::Client, &str) -> reqwest::RequestBuilder) -> Answer {
        let response = make(&self.client, &self.base).send().await.expect("the daemon answers");
        let media_type = response.headers().get("content-type").and_then(|kind| kind.to_str().ok()).unwrap_or("");
        Answer {
            status: response.status().as_u16(),
            media_type: media_type.to_owned(),
            bytes: response.bytes().await.expect("the whole body").to_vec(),
        }
    }

    /// `GET path`.
    pub async fn get(&self, path: &str) -> Answer {
        self.send(|client, base| client.get(format!("{base}{path}"))).await
    }

    /// `POST path` with a JSON body.
    pub async fn post(&self, path: &str, body: &Value) -> Answer {
        self.send(|client, base| client.post(format!("{base}{path}")).json(body)).await
    }

    /// `POST path`, which must be accepted (202); the identity of the run that it began.
    ///
    /// # Panics
    /// When it is not accepted.
    pub async fn begin(&self, path: &str, body: &Value) -> String {
        let answer = self.post(path, body).await;
        assert_eq!(answer.status, 202, "{path}: {}", String::from_utf8_lossy(&answer.bytes));
        answer.json()["id"].as_str().expect("a run has an id").to_owned()
    }

    /// Every event of a run up to its end, read from its stream.
    ///
    /// # Panics
    /// When the stream does not end.
    pub async fn events(&self, run: &str) -> Vec<Value> {
        self.events_until(run, |_| false).await
    }

    /// The events of a run up to the first for which `enough` says so, or to its end.
    ///
    /// # Panics
    /// When neither comes.
    pub async fn events_until(&self, run: &str, enough: impl Fn(&Value) -> bool) -> Vec<Value> {
        let url = format!("{}/runs/{run}/events", self.base);
        let read = async {
            let mut response = self.client.get(url).send().await.expect("the daemon answers");
            assert_eq!(response.status().as_u16(), 200);
            let (mut text, mut events) = (String::new(), Vec::new());
            while let Some(chunk) = response.chunk().await.expect("the stream goes on") {
                text.push_str(&String::from_utf8_lossy(&chunk));
                while let Some(end) = text.find("\n\n") {
                    let block: String = text.drain(..end + 2).collect();
                    let data: String = block.lines().filter_map(|line| line.strip_prefix("data:")).collect();
                    if data.is_empty() {
                        continue;
                    }
                    let event: Value = serde_json::from_str(&data).expect("an event is JSON");
                    let last = enough(&event);
                    events.push(event);
                    if last {
                        return events;
                    }
                }
            }
            events
        };
        tokio::time::timeout(PATIENCE + Duration::from_secs(5), read).await.expect("the run's events end")
    }

    /// Waits until a run has ended, and returns it.
    ///
    /// # Panics
    /// When it does not end.
    pub async fn ended(&self, run: &str) -> Value {
        self.events(run).await;
        self.get(&format!("/runs/{run}")).await.json()
    }
}
