//! The exit status, which is part of the interface.

use evenpair_api::RunState;

/// How a command ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Exit {
    /// 0: done; every limit was kept.
    Passed,
    /// 1: a limit was exceeded.
    LimitFailed,
    /// 2: it could not be completed: unreachable, broken, stopped.
    Incomplete,
    /// 3: what was asked for makes no sense.
    Usage,
}

impl Exit {
    /// The status for a run's state; one that has not ended was only begun, which is what was asked for.
    pub(crate) fn of_run(state: RunState) -> Self {
        match state {
            RunState::Waiting | RunState::Running | RunState::Passed => Self::Passed,
            RunState::Failed => Self::LimitFailed,
            RunState::Stopped | RunState::Broken => Self::Incomplete,
        }
    }
}

impl From<Exit> for std::process::ExitCode {
    fn from(exit: Exit) -> Self {
        Self::from(match exit {
            Exit::Passed => 0,
            Exit::LimitFailed => 1,
            Exit::Incomplete => 2,
            Exit::Usage => 3,
        })
    }
}
