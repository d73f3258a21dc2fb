//! A thread that owns a database connection and does the jobs it is given, one after the other.

use std::path::{Path, PathBuf};
use std::sync::mpsc;
use std::thread::{self, JoinHandle};

use rusqlite::Connection;
use tokio::sync::oneshot;

use super::error::{Fault, StoreError};

/// Something to be done on the connection; it answers through a channel of its own.
type Job = Box<dyn FnOnce(&mut Connection) + Send>;

/// The thread and the way to it.
///
/// The queue has no bound of its own: every caller waits for its answer, so it never holds more jobs than there are
/// callers, and those are bounded where they come in.
#[derive(Debug)]
pub(super) struct Desk {
    path: PathBuf,
    jobs: Option<mpsc::Sender<Job>>,
    thread: Option<JoinHandle<()>>,
}

impl Desk {
    /// Starts the thread; `path` is the connection's file, for errors.
    ///
    /// # Errors
    /// [`StoreError::File`] when the system gives no thread.
    pub(super) fn start(name: &str, path: &Path, mut connection: Connection) -> Result<Self, StoreError> {
        let (jobs, queue) = mpsc::channel::<Job>();
        let thread = thread::Builder::new()
            .name(name.to_owned())
            .spawn(move || {
                while let Ok(job) = queue.recv() {
                    job(&mut connection);
                }
            })
            .map_err(|source| StoreError::file("start the store's thread for the database", path, source))?;
        Ok(Self { path: path.to_owned(), jobs: Some(jobs), thread: Some(thread) })
    }

    /// Has a job done and waits for its answer. `doing` completes "could not …".
    ///
    /// # Cancel safety
    /// Once it has been polled the job is carried out whole, whether or not anybody still waits for the answer.
    ///
    /// # Errors
    /// The job's, or [`StoreError::Closed`] when the thread has ended.
    pub(super) async fn ask<T: Send + 'static>(
        &self,
        doing: &'static str,
        job: impl FnOnce(&mut Connection) -> Result<T, Fault> + Send + 'static,
    ) -> Result<T, StoreError> {
        let (answer, answered) = oneshot::channel();
        let job: Job = Box::new(move |connection| {
            // The caller may have gone away; the job was done all the same.
            let _ = answer.send(job(connection));
        });
        let sent = self.jobs.as_ref().is_some_and(|jobs| jobs.send(job).is_ok());
        if !sent {
            return Err(StoreError::Closed { doing });
        }
        match answered.await {
            Ok(result) => result.map_err(|fault| fault.into_error(doing, &self.path)),
            Err(_) => Err(StoreError::Closed { doing }),
        }
    }
}

impl Drop for Desk {
    /// Lets the jobs that are already queued end, then closes the connection.
    fn drop(&mut self) {
        self.jobs = None;
        if let Some(thread) = self.thread.take() {
            // A job that panicked has already answered its caller with `Closed`.
            let _ = thread.join();
        }
    }
}
