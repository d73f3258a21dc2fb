//! What every instrument has: its status and the knowledge whether an operation is pending.

use std::sync::{Arc, Mutex};

use tokio::sync::watch;

use super::bench::lock;
use crate::faults::Faults;
use crate::status::{Fault, Status, event, operation};

/// Status and pending operation of one instrument, shared by its connections and its background work.
#[derive(Debug)]
pub(crate) struct Core {
    /// Registers and error queue.
    pub(crate) status: Mutex<Status>,
    /// Counts moments at which the status may have changed.
    changes: watch::Sender<u64>,
    /// What goes wrong with it.
    pub(crate) faults: Arc<Faults>,
    life: watch::Sender<u64>,
    pending: watch::Sender<Pending>,
}

#[derive(Debug, Clone, Copy, Default)]
struct Pending {
    busy: bool,
    /// `*OPC` was sent while busy: its bit is due at the end (the operation complete command active state, IEEE 488.2
    /// 12.5.2, from memory).
    armed: bool,
}

impl Core {
    /// An idle instrument just switched on.
    pub(crate) fn new(faults: Arc<Faults>) -> Self {
        let (life, pending) = (watch::Sender::new(1), watch::Sender::new(Pending::default()));
        Self { status: Mutex::new(Status::new()), changes: watch::Sender::new(0), faults, life, pending }
    }

    /// Tells those who watch the status that it may have changed.
    pub(crate) fn touch(&self) {
        self.changes.send_modify(|count| *count = count.wrapping_add(1));
    }

    /// Notices every [`touch`](Self::touch) from now on.
    pub(crate) fn changes(&self) -> watch::Receiver<u64> {
        self.changes.subscribe()
    }

    /// Changes whenever the instrument is switched off and on.
    pub(crate) fn life(&self) -> watch::Receiver<u64> {
        self.life.subscribe()
    }

    /// The instrument is switched off and on: its status is that of the first moment, its connections are gone.
    pub(crate) fn restart(&self) {
        *lock(&self.status) = Status::new();
        self.pending.send_modify(|pending| *pending = Pending::default());
        self.life.send_modify(|life| *life = life.wrapping_add(1));
    }

    /// Puts an error into the queue.
    pub(crate) fn report(&self, fault: Fault) {
        lock(&self.status).report(fault);
        self.touch();
    }

    /// An overlapped operation begins or goes on in another condition.
    pub(crate) fn begin(&self, condition: u16) {
        lock(&self.status).operation.set_condition(condition);
        self.pending.send_modify(|pending| pending.busy = true);
        self.touch();
    }

    /// The overlapped operation has ended, one way or another.
    pub(crate) fn finish(&self) {
        let mut status = lock(&self.status);
        status.operation.set_condition(0);
        self.pending.send_modify(|pending| {
            if std::mem::take(pending).armed {
                status.raise(event::OPERATION_COMPLETE);
            }
        });
        drop(status);
        self.touch();
    }

    /// Whether an operation is pending.
    pub(crate) fn busy(&self) -> bool {
        self.pending.borrow().busy
    }

    /// Whether what is pending waits for a trigger.
    pub(crate) fn waiting(&self) -> bool {
        lock(&self.status).operation.condition() & operation::WAITING_FOR_TRIGGER != 0
    }

    /// `*OPC`: sets the bit when nothing is pending any more (IEEE 488.2 10.18).
    pub(crate) fn arm(&self) {
        let mut status = lock(&self.status);
        self.pending.send_modify(|pending| {
            if pending.busy {
                pending.armed = true;
            } else {
                status.raise(event::OPERATION_COMPLETE);
            }
        });
    }

    /// `*CLS` and `*RST` forget an `*OPC` (IEEE 488.2 10.3 and 10.32).
    pub(crate) fn disarm(&self) {
        self.pending.send_modify(|pending| pending.armed = false);
    }

    /// Waits until nothing is pending: `*OPC?` and `*WAI`.
    ///
    /// # Cancel safety
    /// Holds nothing; may be dropped at any time.
    pub(crate) async fn idle(&self) {
        // The sender lives in `self`, so the wait cannot fail.
        let _ = self.pending.subscribe().wait_for(|pending| !pending.busy).await;
    }
}
