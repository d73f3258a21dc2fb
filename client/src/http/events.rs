//! Following a run's events, across dropped connections.

use std::time::Duration;

use evenpair_api::{Event, EventKind};
use eventsource_stream::Eventsource;
use futures_util::StreamExt;

use super::{Daemon, resources};
use crate::trouble::Trouble;

/// How often in a row a dropped stream is taken up again before it counts as gone.
const MOST_RETRIES: u32 = 5;

/// The wait before the first of them; it doubles each time.
const FIRST_WAIT: Duration = Duration::from_millis(200);

impl Daemon {
    /// Calls `each` for every event of the run from the first, until the run has ended or `each` fails.
    ///
    /// A connection that drops is taken up again after the last event that was seen, so each comes exactly once.
    pub(crate) async fn follow(
        &self,
        id: &str,
        mut each: impl FnMut(&Event) -> Result<(), Trouble>,
    ) -> Result<(), Trouble> {
        let url = self.url(&format!("/runs/{}/events", resources::segment(id)));
        let (mut seen, mut retries) = (0u64, 0);
        loop {
            let why = match self.read_events(&url, &mut seen, &mut retries, &mut each).await {
                Ok(Stream::Ended) => return Ok(()),
                Ok(Stream::Dropped(why)) => why,
                Err(Trouble::Unreachable { reason, .. }) if seen > 0 => reason,
                Err(trouble) => return Err(trouble),
            };
            if retries >= MOST_RETRIES {
                return Err(Trouble::Unreachable {
                    url: self.base.clone(),
                    reason: format!("{why}; the run goes on without us"),
                });
            }
            tokio::time::sleep(FIRST_WAIT * 2u32.pow(retries)).await;
            retries += 1;
        }
    }

    async fn read_events(
        &self,
        url: &str,
        seen: &mut u64,
        retries: &mut u32,
        each: &mut impl FnMut(&Event) -> Result<(), Trouble>,
    ) -> Result<Stream, Trouble> {
        let request =
            self.client.get(url).header("accept", "text/event-stream").header("last-event-id", seen.to_string());
        let mut stream = self.send(request).await?.bytes_stream().eventsource();
        while let Some(message) = stream.next().await {
            let message = match message {
                Ok(message) => message,
                Err(error) => return Ok(Stream::Dropped(error.to_string())),
            };
            let event: Event = serde_json::from_str(&message.data).map_err(|error| Trouble::Answer {
                url: url.to_owned(),
                what: format!("an event that is none ({error})"),
            })?;
            if event.generation <= *seen {
                continue;
            }
            *seen = event.generation;
            *retries = 0;
            each(&event)?;
            if matches!(&event.kind, EventKind::StateChanged { state, .. } if state.ended()) {
                return Ok(Stream::Ended);
            }
        }
        Ok(Stream::Dropped("the stream of events ended before the run".to_owned()))
    }
}

/// How a stream of events came to its end.
enum Stream {
    /// With the run.
    Ended,
    /// Before it.
    Dropped(String),
}
