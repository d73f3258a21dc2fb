-- Corrections that were transferred from another vertical range.

-- What a transferred correction came from; a correction that was not transferred has no row.
create table transfers (
    correction      text not null primary key references corrections (id), -- the correction on the new range
    from_correction text not null references corrections (id),             -- the one on the old range
    from_made_at    text not null,                                         -- when that one was made
    from_span_v     real,                                                  -- span of the old range at the tip
    from_span_u     real,                                                  -- its standard uncertainty in volts
    from_offset_v   real,                                                  -- middle of the old range at the tip
    from_offset_u   real,                                                  -- its standard uncertainty in volts
    reference       text not null,                                         -- the signal that both ranges showed
    skew_by         text not null,                                         -- carried, common or legs
    levels_by       text not null                                          -- common or legs
) strict, without rowid;
