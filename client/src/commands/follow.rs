//! Following a run to its end.

use evenpair_api::Run;

use crate::http::Daemon;
use crate::progress::Progress;
use crate::trouble::Trouble;

/// Shows a run's events until it has ended, and returns it as it is then. With `silent` nothing is shown.
pub(crate) async fn follow(daemon: &Daemon, id: &str, silent: bool) -> Result<Run, Trouble> {
    let mut progress = Progress::new(silent);
    daemon.follow(id, |event| progress.show(event)).await?;
    daemon.run(id).await
}
