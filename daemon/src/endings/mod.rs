//! What ends the daemon: a signal, or the end of standard input. The first begins the orderly end; a second *signal* ends
//! at once.
//!
//! Whoever started the daemon often does both, closing its standard input and sending it a signal: that is one wish, not
//! two. So the end of standard input never counts as the second, and a signal after it is only the first.

use tokio::io::AsyncReadExt;
use tokio::signal::unix::{Signal, SignalKind, signal};
use tokio::sync::mpsc;

/// Wishes that wait to be looked at: more than a person sends.
const WAITING: usize = 16;

/// A reason to end.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Wish {
    Signal(&'static str),
    StdinClosed,
}

/// The reasons to end, as they come.
pub(crate) struct Endings {
    wishes: mpsc::Receiver<Wish>,
    signals: u32,
}

impl Endings {
    /// Listens from now on for SIGTERM and SIGINT and, if `with_stdin`, for the end of standard input.
    ///
    /// # Errors
    /// The system gives no signals.
    pub(crate) fn listen(with_stdin: bool) -> std::io::Result<Self> {
        let (sender, wishes) = mpsc::channel(WAITING);
        for (kind, name) in [(SignalKind::terminate(), "SIGTERM"), (SignalKind::interrupt(), "SIGINT")] {
            tokio::spawn(pass_on(signal(kind)?, Wish::Signal(name), sender.clone()));
        }
        if with_stdin {
            tokio::spawn(async move {
                end_of_stdin().await;
                let _ = sender.send(Wish::StdinClosed).await;
            });
        }
        Ok(Self { wishes, signals: 0 })
    }

    /// The first reason to end, in words.
    pub(crate) async fn first(&mut self) -> &'static str {
        match self.next().await {
            Wish::Signal(name) => name,
            Wish::StdinClosed => "standard input was closed",
        }
    }

    /// The second signal, in words: the wish to end at once.
    pub(crate) async fn at_once(&mut self) -> &'static str {
        loop {
            if let Wish::Signal(name) = self.next().await
                && self.signals >= 2
            {
                return name;
            }
        }
    }

    /// # Cancel safety
    /// A wish is counted in the same step in which it is taken.
    async fn next(&mut self) -> Wish {
        let Some(wish) = self.wishes.recv().await else {
            // The signals' tasks go only with the runtime.
            return std::future::pending().await;
        };
        self.signals += u32::from(matches!(wish, Wish::Signal(_)));
        wish
    }
}

async fn pass_on(mut signals: Signal, wish: Wish, sender: mpsc::Sender<Wish>) {
    while signals.recv().await.is_some() && sender.send(wish).await.is_ok() {}
}

async fn end_of_stdin() {
    let mut stdin = tokio::io::stdin();
    let mut scrap = [0; 64];
    while stdin.read(&mut scrap).await.is_ok_and(|read| read > 0) {}
}

#[cfg(test)]
mod tests;
