//! What has struck, in order, for a whole bench.

use std::sync::Mutex;
use std::sync::atomic::{AtomicU32, Ordering};

use crate::instrument::lock;
use crate::scenario::What;

/// Entries kept; a soak of days must not fill the memory. The counts go on.
const MOST_ENTRIES: usize = 100_000;

/// One strike.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Entry {
    /// Number of the fault.
    pub(crate) fault: u32,
    /// The instrument that it befell.
    pub(crate) instrument: String,
    /// What went wrong.
    pub(crate) what: What,
    /// The number of the instrument's reply or of the acquisition, from 1; 0 if there is none.
    pub(crate) at: u64,
}

/// All strikes of a bench.
#[derive(Debug, Default)]
pub(crate) struct Ledger {
    faults: AtomicU32,
    struck: Mutex<Struck>,
}

#[derive(Debug, Default)]
struct Struck {
    entries: Vec<Entry>,
    count: u64,
}

impl Ledger {
    /// The number of the next fault that is armed, from 1.
    pub(crate) fn next_fault(&self) -> u32 {
        self.faults.fetch_add(1, Ordering::SeqCst) + 1
    }

    /// Writes a strike down.
    pub(crate) fn note(&self, entry: Entry) {
        let mut struck = lock(&self.struck);
        struck.count += 1;
        if struck.entries.len() < MOST_ENTRIES {
            struck.entries.push(entry);
        }
    }

    /// The first strikes in order, and how many there were in all.
    pub(crate) fn read(&self) -> (Vec<Entry>, u64) {
        let struck = lock(&self.struck);
        (struck.entries.clone(), struck.count)
    }
}
