//! One SCPI status register group: condition, transition filters, event and enable (SCPI-99 vol. 1, 9; from memory).

/// The bits a register can use: bit 15 is always zero.
pub(crate) const USABLE: u16 = 0x7FFF;

/// A register group such as `STATus:OPERation`.
#[derive(Debug)]
pub(crate) struct Register {
    condition: u16,
    event: u16,
    /// Which events count for the summary bit.
    pub(crate) enable: u16,
    /// Which conditions set their event when they begin.
    pub(crate) positive: u16,
    /// Which conditions set their event when they end.
    pub(crate) negative: u16,
}

impl Register {
    /// An idle register with the filters of `STATus:PRESet`.
    pub(crate) fn new() -> Self {
        Self { condition: 0, event: 0, enable: 0, positive: USABLE, negative: 0 }
    }

    /// The state as it is now.
    pub(crate) fn condition(&self) -> u16 {
        self.condition
    }

    /// Changes the condition; transitions that the filters let through are latched.
    pub(crate) fn set_condition(&mut self, bits: u16) {
        let (risen, fallen) = (bits & !self.condition, self.condition & !bits);
        self.event |= (risen & self.positive) | (fallen & self.negative);
        self.condition = bits & USABLE;
    }

    /// The latched events, cleared by reading.
    pub(crate) fn take_events(&mut self) -> u16 {
        std::mem::take(&mut self.event)
    }

    /// Forgets the latched events.
    pub(crate) fn clear_events(&mut self) {
        self.event = 0;
    }

    /// Whether an enabled event is latched.
    pub(crate) fn summary(&self) -> bool {
        self.event & self.enable != 0
    }

    /// Masks and filters of `STATus:PRESet`: nothing enabled, only positive transitions pass.
    pub(crate) fn preset(&mut self) {
        (self.enable, self.positive, self.negative) = (0, USABLE, 0);
    }
}
