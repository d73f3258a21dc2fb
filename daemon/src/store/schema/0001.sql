-- Step 1 of the schema: everything that a run leaves behind.
--
-- Conventions. Identities are UUIDs as text. Times of day are RFC 3339 in UTC with nine decimals, so that they sort as
-- text. A column ending in _s, _v, _hz or _db says its unit; a column `u` or ending in _u is a standard uncertainty
-- (JCGM 100, 2.3.1) in the unit of the value before it, null where none is stated. A value that is not a number is
-- null. `place` keeps the order of a list, from 0. Columns named *_json hold JSON.

-- One execution of a sequence, or a deskew or verification by itself.
create table runs (
    id            text not null primary key, -- UUID version 7: later runs sort later
    kind          text not null,             -- deskew, sequence or verify
    title         text not null,             -- the sequence's title, or `deskew gate`
    state         text not null,             -- waiting, running, passed, failed, stopped or broken
    created_at    text not null,             -- when it was accepted
    started_at    text,                      -- when its first stage began; null before
    ended_at      text,                      -- when it ended; null before
    done          integer not null,          -- steps ended
    total         integer not null,          -- steps in all, the sweeps unrolled
    doing         text not null,             -- what is being done, in words; empty once ended
    captures      integer not null,          -- captures stored, as the run counts them: never more than there are rows
    reason        text,                      -- why it failed, was stopped or broke, in words
    failures_json text not null,             -- array of {capture, figure, text}: the limits that were exceeded
    generation    integer not null,          -- grows by one at each change
    source        text not null              -- the text that it executes, as it was accepted
) strict;
create index runs_by_time on runs (created_at, id);
create index runs_by_state on runs (state);

-- The stages that a run carried out.
create table stages (
    run       text not null references runs (id), -- the run
    step      integer not null,                   -- place in the unrolled sequence, from 0
    text      text not null,                      -- what it did, in words
    started_s real,                               -- seconds from the run's start to the stage's start
    ended_s   real,                               -- seconds from the run's start to its end; null while it runs
    outcome   text,                               -- what came of it: the reply to a question, say
    primary key (run, step)
) strict, without rowid;

-- What a run decided, in order, written before it was acted on. Folding it gives the run's state again after a crash.
create table journal (
    run        text not null references runs (id), -- the run
    number     integer not null,                   -- place in the run's journal, from 1, without gaps
    entry_json text not null,                      -- the entry; its meaning belongs to who wrote it
    primary key (run, number)
) strict, without rowid;

-- What makes the two legs of a pair agree.
create table corrections (
    id                  text not null primary key, -- UUID
    pair                text not null,             -- the pair's name in the bench file
    made_at             text not null,             -- when its last acquisition was made
    state               text not null,             -- fresh, stale or void
    skew_s              real,                      -- τ: positive when the negative leg arrives late; all of it
    skew_u              real,                      -- its standard uncertainty in seconds
    gain                real,                      -- g: the negative leg relative to the positive one
    gain_u              real,                      -- its standard uncertainty
    offset_v            real,                      -- o: volts at the tips that the negative leg has too much
    offset_u            real,                      -- its standard uncertainty in volts
    gain_offset_r       real,                      -- correlation coefficient of gain and offset; null where not known
    skew_freedom        real,                      -- degrees of freedom of skew_u; null where it is taken as well known
    gain_freedom        real,                      -- the same of gain_u
    offset_freedom      real,                      -- the same of offset_u
    limited_by          text,                      -- what limits the skew most, in words; null where not known
    scope_skew_s        real,                      -- the part of skew_s that the scope itself takes off
    scope_skew_u        real,                      -- its standard uncertainty in seconds
    acquisitions        integer not null,          -- acquisitions of the pair that went into it
    scope_identity      text not null,             -- what the scope answered to *IDN?
    skew_reference      text not null,             -- the reference that skew was taken from
    gain_reference      text not null,             -- the reference that gain and offset were taken from
    carried             integer not null,          -- 1 when skew was taken on another vertical range, else 0
    carried_from_span_v real,                      -- the span at the tip of that range; null when carried is 0
    carried_from_span_u real,                      -- its standard uncertainty in volts
    carried_added_s     real,                      -- standard uncertainty of skew that carrying adds, within skew_u
    carried_added_u     real,                      -- how well that is known; mostly null
    reasons_json        text not null,             -- array of texts: why the state is not fresh
    warnings_json       text not null              -- array of texts: what a person should know
) strict;
create index corrections_by_pair on corrections (pair, made_at, id);

-- The settings of each leg that a correction depends on.
create table correction_legs (
    correction  text not null references corrections (id), -- the correction
    leg         text not null,                             -- positive or negative
    channel     integer not null,                          -- the scope's channel, from 1
    span_v      real,                                      -- full vertical span at the tip
    span_u      real,                                      -- its standard uncertainty in volts
    offset_v    real,                                      -- vertical offset at the tip
    offset_u    real,                                      -- its standard uncertainty in volts
    coupling    text not null,                             -- DC or AC
    attenuation real,                                      -- volts at the tip per volt at the scope's input
    probe       text not null,                             -- the probe's name in the bench file
    primary key (correction, leg)
) strict, without rowid;

-- Common-mode rejection that a correction reaches, from its last verification.
create table rejection_points (
    correction   text not null references corrections (id), -- the correction
    place        integer not null,                          -- order, from 0
    frequency_hz real,                                      -- centre of the band
    before_db    real,                                      -- rejection of plain subtraction
    after_db     real,                                      -- rejection of the corrected difference
    floor_db     real,                                      -- above this noise hides the residual
    at_least     integer not null,                          -- 1 when after_db is a lower bound, else 0
    primary key (correction, place)
) strict, without rowid;

-- One acquisition of a pair. A row means that its waveform file is on the disk.
create table captures (
    run              text not null references runs (id), -- the run
    number           integer not null,                   -- number within the run, from 1
    pair             text not null,                      -- the pair's name in the bench file
    made_at          text not null,                      -- when the acquisition was read
    correction       text references corrections (id),   -- the correction that was applied; null for none
    correction_state text,                               -- its state at that time
    leak_rms_v       real,                               -- the most the common mode can have added, as rms
    leak_rms_u       real,                               -- its standard uncertainty in volts
    leak_peak_v      real,                               -- the same as peak
    leak_peak_u      real,                               -- its standard uncertainty in volts
    common_rms_v     real,                               -- rms of the common mode
    common_rms_u     real,                               -- its standard uncertainty in volts
    common_swing_v   real,                               -- peak-to-peak of the common mode
    common_swing_u   real,                               -- its standard uncertainty in volts
    warnings_json    text not null,                      -- array of texts: clipping, a void correction, …
    points           integer not null,                   -- samples in each record
    interval_s       real,                               -- time between two samples
    interval_u       real,                               -- its standard uncertainty in seconds
    file             text not null,                      -- the waveform's file, relative to the data folder
    file_bytes       integer not null,                   -- the file's length when it was written
    primary key (run, number)
) strict, without rowid;

-- The sweep's values at a capture.
create table conditions (
    run     text not null,    -- the run
    capture integer not null, -- the capture's number
    place   integer not null, -- order, outermost axis first, from 0
    setting text not null,    -- the setting's name
    value   real,             -- its value
    u       real,             -- its standard uncertainty
    unit    text not null,    -- unit of both
    primary key (run, capture, place),
    foreign key (run, capture) references captures (run, number)
) strict, without rowid;

-- The figures of a capture's corrected difference.
create table figures (
    run     text not null,    -- the run
    capture integer not null, -- the capture's number
    place   integer not null, -- order, from 0
    name    text not null,    -- rms, high_level, rise_time, …
    value   real,             -- the figure
    u       real,             -- its standard uncertainty
    unit    text not null,    -- unit of value, u, low, high and plain
    low     real,             -- lower end of the interval that holds the true value with 95 %; null for none
    high    real,             -- its upper end
    basis   text,             -- where the interval comes from: common_mode, normal, propagated or rectangular
    plain   real,             -- what plain subtraction of the two records would have given; null for none
    grade   text not null,    -- clean, shaded or swamped: how far the common mode could explain it
    valid   integer not null, -- 0 when clipping, overload or a missing feature makes it meaningless, else 1
    why     text,             -- why it is not valid
    primary key (run, capture, place),
    foreign key (run, capture) references captures (run, number)
) strict, without rowid;
create index figures_by_name on figures (name, run);

-- The terms of a figure's uncertainty (JCGM 100, 5.1).
create table terms (
    run     text not null,    -- the run
    capture integer not null, -- the capture's number
    figure  integer not null, -- the figure's place
    place   integer not null, -- order, from 0
    name    text not null,    -- noise, gain, skew, offset (or their drift), scale, calibration, quantisation, common mode
    u       real,             -- contribution to the figure's standard uncertainty, in the figure's unit
    sensitivity     real,     -- what the figure changes per unit of the source (1, s or V); null where it has none
    distribution    text not null, -- normal or rectangular
    correlated_with text,     -- name of the term that it is correlated with; null for none
    correlation     real,     -- correlation coefficient of the two contributions
    freedom real,             -- degrees of freedom of u; null where it is taken as well known
    kind    text not null,    -- A (from repeats) or B (from other knowledge)
    share   real,             -- share of the variance, half of a covariance included; all sum to 1
    primary key (run, capture, figure, place),
    foreign key (run, capture, figure) references figures (run, capture, place)
) strict, without rowid;

-- The limits that were set for a capture, and whether they were kept.
create table limits (
    run       text not null,    -- the run
    capture   integer not null, -- the capture's number
    place     integer not null, -- order, from 0
    figure    text not null,    -- the figure's name
    min       real,             -- lowest value allowed, in the figure's unit; null for none
    max       real,             -- highest value allowed; null for none
    passed    integer not null, -- 1 when the value lies within, else 0
    uncertain integer not null, -- 1 when the expanded uncertainty reaches over the limit, else 0
    primary key (run, capture, place),
    foreign key (run, capture) references captures (run, number)
) strict, without rowid;

-- What happened to a run, as it was published.
create table events (
    run        text not null references runs (id), -- the run
    generation integer not null,                   -- the run's generation after it
    at_s       real,                               -- seconds since the run was accepted
    kind       text not null,                      -- captured, corrected, progressed or state_changed
    capture    integer,                            -- the capture's number when kind is captured, else null
    event_json text,                               -- the event; null when kind is captured, as the capture has its rows
    primary key (run, generation),
    foreign key (run, capture) references captures (run, number)
) strict, without rowid;
