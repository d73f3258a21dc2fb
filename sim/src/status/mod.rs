//! The status model of IEEE 488.2 chapter 11 with the registers and the error queue that SCPI-99 adds.

mod fault;
mod register;

use std::collections::VecDeque;

pub(crate) use fault::Fault;
pub(crate) use register::Register;

/// Bits of the standard event status register (IEEE 488.2 11.5.1.1, from memory).
pub(crate) mod event {
    /// Every pending operation has finished after `*OPC`.
    pub(crate) const OPERATION_COMPLETE: u8 = 1;
    /// A query could not be answered.
    pub(crate) const QUERY_ERROR: u8 = 1 << 2;
    /// The instrument itself failed.
    pub(crate) const DEVICE_ERROR: u8 = 1 << 3;
    /// A command was understood but could not be carried out as it stood.
    pub(crate) const EXECUTION_ERROR: u8 = 1 << 4;
    /// A message was not understood.
    pub(crate) const COMMAND_ERROR: u8 = 1 << 5;
    /// The instrument was switched on since the register was last read.
    pub(crate) const POWER_ON: u8 = 1 << 7;
}

/// Bits of the status byte (IEEE 488.2 11.2; bits 2, 3 and 7 after SCPI-99 vol. 1, 9; from memory).
pub(crate) mod byte {
    /// The error queue is not empty.
    pub(crate) const ERRORS: u8 = 1 << 2;
    /// Summary of the questionable register.
    pub(crate) const QUESTIONABLE: u8 = 1 << 3;
    /// MAV: a reply waits in the output queue.
    pub(crate) const MESSAGE_AVAILABLE: u8 = 1 << 4;
    /// ESB: summary of the standard event register.
    pub(crate) const EVENT: u8 = 1 << 5;
    /// MSS: summary of the status byte itself through the service request enable register.
    pub(crate) const MASTER: u8 = 1 << 6;
    /// Summary of the operation register.
    pub(crate) const OPERATION: u8 = 1 << 7;
}

/// Bits of the operation condition register (SCPI-99 vol. 1, 9.3; from memory).
pub(crate) mod operation {
    /// A sweep is in progress.
    pub(crate) const SWEEPING: u16 = 1 << 3;
    /// A measurement is in progress.
    pub(crate) const MEASURING: u16 = 1 << 4;
    /// The instrument waits for a trigger event.
    pub(crate) const WAITING_FOR_TRIGGER: u16 = 1 << 5;
}

/// Entries the error queue holds. SCPI-99 wants at least two; twenty is enough for a message full of mistakes.
pub(crate) const QUEUE_LENGTH: usize = 20;

/// All that an instrument tells about itself through `*STB?`, `*ESR?`, `STATus` and `SYSTem:ERRor`.
#[derive(Debug)]
pub(crate) struct Status {
    events: u8,
    /// Mask of `*ESE`.
    pub(crate) event_enable: u8,
    request_enable: u8,
    /// The `STATus:OPERation` group.
    pub(crate) operation: Register,
    /// The `STATus:QUEStionable` group.
    pub(crate) questionable: Register,
    errors: VecDeque<Fault>,
}

impl Status {
    /// The state just after power-on: everything clear but the power-on bit.
    pub(crate) fn new() -> Self {
        Self {
            events: event::POWER_ON,
            event_enable: 0,
            request_enable: 0,
            operation: Register::new(),
            questionable: Register::new(),
            errors: VecDeque::with_capacity(QUEUE_LENGTH),
        }
    }

    /// Puts an error into the queue and sets its event bit. When the queue is full its newest entry gives way to
    /// -350 "Queue overflow" and the error is lost (SCPI-99 vol. 2, 21.8.1, from memory).
    pub(crate) fn report(&mut self, fault: Fault) {
        self.events |= fault.event_bit();
        if self.errors.len() < QUEUE_LENGTH {
            self.errors.push_back(fault);
        } else if let Some(newest) = self.errors.back_mut() {
            *newest = Fault::QueueOverflow;
            self.events |= Fault::QueueOverflow.event_bit();
        }
    }

    /// Takes the oldest error out of the queue.
    pub(crate) fn next_error(&mut self) -> Option<Fault> {
        self.errors.pop_front()
    }

    /// How many errors wait.
    pub(crate) fn error_count(&self) -> usize {
        self.errors.len()
    }

    /// Sets bits of the standard event register.
    pub(crate) fn raise(&mut self, bits: u8) {
        self.events |= bits;
    }

    /// `*ESR?`: the standard event register, cleared by reading.
    pub(crate) fn take_events(&mut self) -> u8 {
        std::mem::take(&mut self.events)
    }

    /// `*SRE`: bit 6 cannot be set (IEEE 488.2 11.3.2.2, from memory).
    pub(crate) fn enable_requests(&mut self, mask: u8) {
        self.request_enable = mask & !byte::MASTER;
    }

    /// `*SRE?`
    pub(crate) fn request_enable(&self) -> u8 {
        self.request_enable
    }

    /// `*STB?`: the status byte with MSS in bit 6. `message_available` is true when the asker's output queue already
    /// holds a reply.
    pub(crate) fn status_byte(&self, message_available: bool) -> u8 {
        let mut bits = 0;
        let summaries = [
            (!self.errors.is_empty(), byte::ERRORS),
            (self.questionable.summary(), byte::QUESTIONABLE),
            (message_available, byte::MESSAGE_AVAILABLE),
            (self.events & self.event_enable != 0, byte::EVENT),
            (self.operation.summary(), byte::OPERATION),
        ];
        for (set, bit) in summaries {
            if set {
                bits |= bit;
            }
        }
        if bits & self.request_enable != 0 { bits | byte::MASTER } else { bits }
    }

    /// `*CLS`: clears the event registers and the error queue; masks and conditions stay (IEEE 488.2 10.3).
    pub(crate) fn clear(&mut self) {
        self.events = 0;
        self.operation.clear_events();
        self.questionable.clear_events();
        self.errors.clear();
    }

    /// `STATus:PRESet`: sets the masks and filters of the SCPI registers to their defaults.
    pub(crate) fn preset(&mut self) {
        self.operation.preset();
        self.questionable.preset();
    }
}

#[cfg(test)]
mod tests;
