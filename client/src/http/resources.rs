//! A call per resource.

use bytes::Bytes;
use evenpair_api::{
    Bench, Capture, Captures, Correction, Corrections, DeskewRequest, Run, RunRequest, Runs, TransferRequest,
    VerifyRequest,
};

use super::Daemon;
use crate::trouble::Trouble;

/// How many captures are asked for at once.
const PAGE: u32 = 100;

impl Daemon {
    /// `GET /bench`
    pub(crate) async fn bench(&self) -> Result<Bench, Trouble> {
        self.json(self.client.get(self.url("/bench"))).await
    }

    /// `POST /bench/settle`
    pub(crate) async fn settle(&self) -> Result<Bench, Trouble> {
        self.json(self.client.post(self.url("/bench/settle"))).await
    }

    /// `GET /pairs/{pair}/correction`
    pub(crate) async fn correction(&self, pair: &str) -> Result<Correction, Trouble> {
        self.json(self.client.get(self.url(&format!("/pairs/{}/correction", segment(pair))))).await
    }

    /// `GET /pairs/{pair}/corrections`
    pub(crate) async fn corrections(&self, pair: &str) -> Result<Corrections, Trouble> {
        self.json(self.client.get(self.url(&format!("/pairs/{}/corrections", segment(pair))))).await
    }

    /// `POST /pairs/{pair}/transfer`
    pub(crate) async fn transfer(&self, pair: &str, request: &TransferRequest) -> Result<Run, Trouble> {
        self.json(self.client.post(self.url(&format!("/pairs/{}/transfer", segment(pair)))).json(request)).await
    }

    /// `POST /pairs/{pair}/deskew`
    pub(crate) async fn deskew(&self, pair: &str, request: &DeskewRequest) -> Result<Run, Trouble> {
        self.json(self.client.post(self.url(&format!("/pairs/{}/deskew", segment(pair)))).json(request)).await
    }

    /// `POST /pairs/{pair}/verify`
    pub(crate) async fn verify(&self, pair: &str, request: &VerifyRequest) -> Result<Run, Trouble> {
        self.json(self.client.post(self.url(&format!("/pairs/{}/verify", segment(pair)))).json(request)).await
    }

    /// `POST /runs`
    pub(crate) async fn start(&self, request: &RunRequest) -> Result<Run, Trouble> {
        self.json(self.client.post(self.url("/runs")).json(request)).await
    }

    /// `GET /runs`
    pub(crate) async fn runs(&self) -> Result<Runs, Trouble> {
        self.json(self.client.get(self.url("/runs"))).await
    }

    /// `GET /runs/{id}`; `last` stands for the latest.
    pub(crate) async fn run(&self, id: &str) -> Result<Run, Trouble> {
        if id == "last" {
            let latest = self.runs().await?.items.into_iter().next();
            let latest = latest.ok_or_else(|| Trouble::Usage("there is no run yet".to_owned()))?;
            return self.json(self.client.get(self.url(&format!("/runs/{}", latest.id)))).await;
        }
        self.json(self.client.get(self.url(&format!("/runs/{}", segment(id))))).await
    }

    /// `POST /runs/{id}/stop`
    pub(crate) async fn stop(&self, id: &str) -> Result<Run, Trouble> {
        self.json(self.client.post(self.url(&format!("/runs/{}/stop", segment(id))))).await
    }

    /// Every capture of a run, page after page.
    pub(crate) async fn captures(&self, id: &str) -> Result<Vec<Capture>, Trouble> {
        let (mut all, mut after) = (Vec::new(), Some(0));
        while let Some(from) = after {
            let path = format!("/runs/{}/captures?after={from}&limit={PAGE}", segment(id));
            let page: Captures = self.json(self.client.get(self.url(&path))).await?;
            all.extend(page.items);
            after = page.next;
        }
        Ok(all)
    }

    /// `GET /runs/{id}/captures/{n}/waveform` as `media_type`.
    pub(crate) async fn waveform(&self, id: &str, number: u32, media_type: &str) -> Result<Bytes, Trouble> {
        let url = self.url(&format!("/runs/{}/captures/{number}/waveform", segment(id)));
        let response = self.send(self.client.get(url).header("accept", media_type)).await?;
        response.bytes().await.map_err(|error| self.unreachable(&error))
    }
}

/// A name as one segment of a path: whatever it holds, it cannot become another path (RFC 3986, 2.3).
pub(super) fn segment(name: &str) -> String {
    let mut text = String::with_capacity(name.len());
    for byte in name.bytes() {
        match byte {
            b'A'..=b'Z' | b'a'..=b'z' | b'0'..=b'9' | b'-' | b'_' | b'~' => text.push(char::from(byte)),
            b'.' if name != "." && name != ".." => text.push('.'),
            _ => text.push_str(&format!("%{byte:02X}")),
        }
    }
    text
}

#[cfg(test)]
mod tests {
    use super::segment;

    #[test]
    fn a_name_stays_one_segment() {
        assert_eq!(segment("gate"), "gate");
        assert_eq!(segment("a/b?c#d"), "a%2Fb%3Fc%23d");
        assert_eq!(segment(".."), "%2E%2E");
        assert_eq!(segment("v1.2"), "v1.2");
        assert_eq!(segment("ü"), "%C3%BC");
    }
}
