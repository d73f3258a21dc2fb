//! The switch unit that connects the probe tips. What it can do, without any header.
//!
//! Channels: 101 the reference to both tips, 102 the node to both tips, 103 the gate to the P tip and the node to the
//! N tip; 104 to 108 lead nowhere. Of 101 to 103 at most one can be closed.

use std::sync::Arc;

use super::bench::{Bench, lock};
use super::tree::{Call, Model};
use crate::status::Fault;
use crate::world::Controls;

/// Channels that exist.
const CHANNELS: std::ops::RangeInclusive<u32> = 101..=108;
/// Channels that lead to the same tips.
const EXCLUSIVE: std::ops::RangeInclusive<u32> = 101..=103;

/// The switch unit on a bench; its contacts are among the bench's controls.
pub(crate) struct Switch {
    bench: Arc<Bench>,
}

impl Switch {
    /// A switch unit on `bench`.
    pub(crate) fn new(bench: Arc<Bench>) -> Self {
        Self { bench }
    }

    /// Answers for each channel of the list whether it is in the wanted state.
    pub(crate) fn tell(&self, call: &mut Call<'_>, closed: bool) -> Result<(), Fault> {
        let list = channels(call)?;
        let states = self.with(|controls| {
            list.iter().map(|channel| controls.closed.contains(channel) == closed).collect::<Vec<_>>()
        });
        let states: Vec<&str> = states.into_iter().map(|state| if state { "1" } else { "0" }).collect();
        call.answer(states.join(","));
        Ok(())
    }
}

impl Model for Switch {
    type Settings = Controls;

    fn with<R>(&self, act: impl FnOnce(&mut Controls) -> R) -> R {
        act(&mut lock(&self.bench.controls))
    }

    fn changed(&self) {
        self.bench.touch();
    }

    fn reset(&self) {
        self.with(|controls| controls.closed.clear());
        self.changed();
    }
}

/// The channel list of a command, all of whose channels exist.
fn channels(call: &mut Call<'_>) -> Result<Vec<u32>, Fault> {
    let list = call.args.channels()?;
    call.args.finish()?;
    if list.iter().all(|channel| CHANNELS.contains(channel)) { Ok(list) } else { Err(Fault::OutOfRange) }
}

/// Closes all channels of the list, or none if two sources would meet.
pub(crate) fn close(switch: &Switch, call: &mut Call<'_>) -> Result<(), Fault> {
    let list = channels(call)?;
    switch.with(|controls| {
        let mut closed = controls.closed.clone();
        closed.extend(list);
        if closed.range(EXCLUSIVE).count() > 1 {
            return Err(Fault::SettingsConflict);
        }
        controls.closed = closed;
        Ok(())
    })?;
    switch.changed();
    Ok(())
}

/// Opens the channels of the list.
pub(crate) fn open(switch: &Switch, call: &mut Call<'_>) -> Result<(), Fault> {
    let list = channels(call)?;
    switch.with(|controls| controls.closed.retain(|channel| !list.contains(channel)));
    switch.changed();
    Ok(())
}

/// Opens everything.
pub(crate) fn open_all(switch: &Switch, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    switch.reset();
    Ok(())
}

/// Answers with the list of the closed channels.
pub(crate) fn closed(switch: &Switch, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    let list: Vec<String> = switch.with(|controls| controls.closed.iter().map(u32::to_string).collect());
    call.answer(format!("(@{})", list.join(",")));
    Ok(())
}
