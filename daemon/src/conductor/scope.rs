//! A pair's scope, driven in the pair's terms: volts at the tips in, two records of one acquisition out.

use std::time::Duration;

use evenpair_core::analysis::Record;
use evenpair_core::bench::{Acquisition, LegSpec, PairSpec};
use evenpair_core::dialect::{Call, Fields, Intent, Value};
use evenpair_core::units::{Unit, show};
use tokio_util::sync::CancellationToken;

use super::adjusted::{TooSmall, judge};
use super::trouble::Trouble;
use crate::session::{Handle, SessionError};

/// How often an acquisition is repeated when another client's acquisition came between the two legs.
const TRIES: u32 = 3;

/// What a sweep may cost a scope beside its record's length, in seconds: re-arming, averaging, drawing.
const SWEEP_OVERHEAD_S: f64 = 0.02;

/// The scope that both legs of a pair are on.
#[derive(Debug, Clone)]
pub(crate) struct Scope<'b> {
    pub(crate) handle: Handle,
    pub(crate) pair: &'b PairSpec,
    /// The longest that one reply may take, from the bench file.
    pub(crate) timeout_s: f64,
}

/// What a leg of the scope is set to, in volts at the tip and as the scope itself tells it.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct LegSettings {
    pub(crate) span_v: f64,
    pub(crate) offset_v: f64,
    pub(crate) coupling: String,
    /// The scope's own skew setting: how much earlier it shifts this leg's record.
    pub(crate) delay_s: f64,
}

/// What the scope made of an acquisition that it was asked for.
#[derive(Debug, Clone)]
pub(crate) struct Prepared {
    /// The acquisition as the scope says that it will be.
    pub(crate) acquisition: Acquisition,
    /// Both legs, positive first, as the scope tells them.
    pub(crate) settings: [LegSettings; 2],
    /// What it rounded or clamped, in words.
    pub(crate) told: Vec<String>,
}

/// The calls that give the scope back what it was set to.
#[derive(Debug)]
pub(crate) struct Remembered(Vec<Call>);

impl Scope<'_> {
    /// The two legs, positive first, with their names.
    fn legs(&self) -> [(&'static str, &LegSpec); 2] {
        [("positive", &self.pair.positive), ("negative", &self.pair.negative)]
    }

    /// Whether the scope has a skew setting that the dialect knows.
    pub(crate) fn has_skew_setting(&self) -> bool {
        self.handle.dialect().supports(Intent::SkewSet) && self.handle.dialect().supports(Intent::SkewGet)
    }

    /// Remembers every setting that this module changes.
    pub(crate) async fn remember(&self) -> Result<Remembered, Trouble> {
        let mut calls = Vec::new();
        for (_, leg) in self.legs() {
            let channel = i64::from(leg.channel);
            calls.push(self.copy(Intent::VerticalGet, Intent::VerticalSet, Some(channel)).await?);
            calls.push(self.copy(Intent::CouplingGet, Intent::CouplingSet, Some(channel)).await?);
            if self.has_skew_setting() {
                calls.push(self.copy(Intent::SkewGet, Intent::SkewSet, Some(channel)).await?);
            }
        }
        calls.push(self.copy(Intent::TimebaseGet, Intent::TimebaseSet, None).await?);
        calls.push(self.copy(Intent::TriggerGet, Intent::TriggerSet, None).await?);
        calls.push(self.copy(Intent::AverageGet, Intent::AverageSet, None).await?);
        Ok(Remembered(calls))
    }

    /// Gives back what was remembered; with `keep_skew` the scope's own skew setting stays as it is now.
    pub(crate) async fn give_back(&self, remembered: Remembered, keep_skew: bool) -> Result<(), Trouble> {
        for call in remembered.0 {
            if !(keep_skew && call.intent == Intent::SkewSet) {
                self.handle.call(call).await?;
            }
        }
        Ok(())
    }

    /// Asks by `get` and makes of the answer the call `set` that brings it about again.
    async fn copy(&self, get: Intent, set: Intent, channel: Option<i64>) -> Result<Call, Trouble> {
        let with_channel = |call: Call| match channel {
            Some(channel) => call.with("channel", channel),
            None => call,
        };
        let fields = self.handle.call(with_channel(Call::new(get))).await?;
        let mut call = with_channel(Call::new(set));
        for (name, value) in fields.iter() {
            call = call.with(name.clone(), value.clone());
        }
        Ok(call)
    }

    /// Sets both legs alike, the time base, the trigger and the averaging, and reads back what the scope made of it.
    pub(crate) async fn prepare(&self, acquisition: &Acquisition) -> Result<Prepared, Trouble> {
        for (_, leg) in self.legs() {
            let channel = i64::from(leg.channel);
            let attenuation = leg.probe.attenuation;
            let coupling = Value::Keyword(self.pair.coupling.keyword().to_owned());
            let vertical = Call::new(Intent::VerticalSet)
                .with("channel", channel)
                .with("span_v", acquisition.span_v / attenuation)
                .with("offset_v", acquisition.offset_v / attenuation);
            self.handle.call(vertical).await?;
            self.handle
                .call(Call::new(Intent::CouplingSet).with("channel", channel).with("coupling", coupling))
                .await?;
        }
        let timebase = Call::new(Intent::TimebaseSet)
            .with("interval_s", acquisition.interval_s)
            .with("points", i64::from(acquisition.points))
            .with("position", acquisition.position);
        self.handle.call(timebase).await?;
        let trigger = acquisition.trigger;
        let attenuation = self.pair.leg_on(trigger.channel).map_or(1.0, |leg| leg.probe.attenuation);
        let call = Call::new(Intent::TriggerSet)
            .with("channel", i64::from(trigger.channel))
            .with("level_v", trigger.level_v / attenuation)
            .with("slope", Value::Keyword(trigger.slope.name().to_owned()));
        self.handle.call(call).await?;
        self.handle.call(Call::new(Intent::AverageSet).with("count", i64::from(acquisition.averages))).await?;
        self.handle.call(Call::new(Intent::FormatSet)).await?;
        let settings = self.settings().await?;
        let got = self.read_back(acquisition).await?;
        let [(positive, _), (negative, _)] = self.legs();
        let legs = [(positive, &settings[0]), (negative, &settings[1])];
        let told = judge(acquisition, &got, legs).map_err(|TooSmall { leg, asked, got }| Trouble::TooSmall {
            pair: self.pair.name.clone(),
            instrument: self.pair.scope.clone(),
            leg,
            asked,
            got,
        })?;
        for told in &told {
            tracing::warn!(pair = %self.pair.name, instrument = %self.pair.scope, "{told}");
        }
        Ok(Prepared { acquisition: got, settings, told })
    }

    /// The time base, the trigger's level and the averaging as the scope tells them, where its dialect can ask.
    async fn read_back(&self, asked: &Acquisition) -> Result<Acquisition, Trouble> {
        let mut got = *asked;
        let speaks = |intent| self.handle.dialect().supports(intent);
        let whole = |fields: &Fields, name: &str| {
            let whole = fields.whole(name).map_err(|source| self.unreadable(source))?;
            Ok::<u32, Trouble>(u32::try_from(whole.max(0)).unwrap_or(u32::MAX))
        };
        if speaks(Intent::TimebaseGet) {
            let timebase = self.handle.call(Call::new(Intent::TimebaseGet)).await?;
            got.interval_s = self.number(&timebase, "interval_s")?;
            got.points = whole(&timebase, "points")?;
            got.position = self.number(&timebase, "position")?;
        }
        if speaks(Intent::TriggerGet) {
            let trigger = self.handle.call(Call::new(Intent::TriggerGet)).await?;
            let attenuation = self.pair.leg_on(asked.trigger.channel).map_or(1.0, |leg| leg.probe.attenuation);
            got.trigger.level_v = self.number(&trigger, "level_v")? * attenuation;
        }
        if speaks(Intent::AverageGet) {
            got.averages = whole(&self.handle.call(Call::new(Intent::AverageGet)).await?, "count")?;
        }
        Ok(got)
    }

    /// What both legs are set to, read back: a scope rounds and clamps.
    pub(crate) async fn settings(&self) -> Result<[LegSettings; 2], Trouble> {
        let [(_, positive), (_, negative)] = self.legs();
        Ok([self.leg_settings(positive).await?, self.leg_settings(negative).await?])
    }

    async fn leg_settings(&self, leg: &LegSpec) -> Result<LegSettings, Trouble> {
        let channel = i64::from(leg.channel);
        let ask = |intent| self.handle.call(Call::new(intent).with("channel", channel));
        let vertical = ask(Intent::VerticalGet).await?;
        let coupling = ask(Intent::CouplingGet).await?;
        let delay_s = if self.has_skew_setting() { self.number(&ask(Intent::SkewGet).await?, "delay_s")? } else { 0.0 };
        Ok(LegSettings {
            span_v: self.number(&vertical, "span_v")? * leg.probe.attenuation,
            offset_v: self.number(&vertical, "offset_v")? * leg.probe.attenuation,
            coupling: coupling.keyword("coupling").map_err(|source| self.unreadable(source))?.to_uppercase(),
            delay_s,
        })
    }

    /// Writes the scope's own skew settings of both legs, and tells what the scope made of them.
    pub(crate) async fn write_skew(&self, positive_s: f64, negative_s: f64) -> Result<(f64, f64), Trouble> {
        if !self.has_skew_setting() {
            return Ok((0.0, 0.0));
        }
        for ((_, leg), delay_s) in self.legs().into_iter().zip([positive_s, negative_s]) {
            let call = Call::new(Intent::SkewSet).with("channel", i64::from(leg.channel)).with("delay_s", delay_s);
            self.handle.call(call).await?;
        }
        let [positive, negative] = self.settings().await?;
        Ok((positive.delay_s, negative.delay_s))
    }

    /// One acquisition of both legs.
    ///
    /// # Cancel safety
    /// `stop` ends the waiting for the trigger and aborts the acquisition. Dropping the future costs the connection.
    pub(crate) async fn acquire(
        &self,
        acquisition: &Acquisition,
        stop: &CancellationToken,
    ) -> Result<(Record, Record), Trouble> {
        let mut mixed = (0, 0);
        for _ in 0..TRIES {
            self.sweep(acquisition, stop).await?;
            if self.handle.dialect().runs_freely() {
                // Otherwise the scope would have acquired anew before the second leg is read.
                self.handle.call(Call::new(Intent::AcquireAbort)).await?;
            }
            let (positive, first) = self.record(&self.pair.positive).await?;
            let (negative, second) = self.record(&self.pair.negative).await?;
            // Asked once more, since another client's sweep may have come between preamble and samples.
            let last = self.acquisition_number(&self.pair.negative).await?;
            if first == second && second == last {
                return Ok((positive, negative));
            }
            mixed = (first, second.max(last));
            tracing::warn!(pair = %self.pair.name, ?mixed, "the legs came from different acquisitions; acquiring again");
        }
        Err(Trouble::MixedAcquisitions { pair: self.pair.name.clone(), first: mixed.0, second: mixed.1 })
    }

    /// Starts a sweep and waits until it is complete.
    async fn sweep(&self, acquisition: &Acquisition, stop: &CancellationToken) -> Result<(), Trouble> {
        let record_s = acquisition.interval_s * f64::from(acquisition.points);
        let within_s = self.timeout_s + f64::from(acquisition.averages) * (2.0 * record_s + SWEEP_OVERHEAD_S);
        self.handle.call(Call::new(Intent::AcquireStart)).await?;
        let outcome = tokio::select! {
            outcome = self.handle.complete(Duration::from_secs_f64(within_s)) => outcome,
            () = stop.cancelled() => {
                self.abort().await;
                return Err(Trouble::Stopped);
            }
        };
        match outcome {
            Err(SessionError::NotComplete { .. }) => {
                self.abort().await;
                let trigger = match acquisition.trigger.channel {
                    0 => "the external trigger".to_owned(),
                    channel => format!("the trigger on channel {channel}"),
                };
                Err(Trouble::NoTrigger {
                    pair: self.pair.name.clone(),
                    instrument: self.pair.scope.clone(),
                    within_s,
                    trigger,
                    level: show(acquisition.trigger.level_v, Unit::Volt, 3),
                })
            }
            other => Ok(other?),
        }
    }

    /// Ends an acquisition that waits for a trigger; its failure is told by what comes next.
    async fn abort(&self) {
        if let Err(error) = self.handle.call(Call::new(Intent::AcquireAbort)).await {
            tracing::warn!(instrument = %self.pair.scope, %error, "aborting an acquisition");
        }
    }

    async fn record(&self, leg: &LegSpec) -> Result<(Record, i64), Trouble> {
        let channel = i64::from(leg.channel);
        let preamble = self.handle.call(Call::new(Intent::RecordPreamble).with("channel", channel)).await?;
        let points = preamble.whole("points").map_err(|source| self.unreadable(source))?;
        let mut blocks = Vec::new();
        for call in self.handle.dialect().data_calls(channel, points) {
            let expected = call.args.whole("count").unwrap_or(points);
            blocks.push(self.handle.data(call, u64::try_from(expected).unwrap_or(0)).await?);
        }
        let raw = self.handle.dialect().record(&preamble, &blocks).map_err(|source| self.unreadable(source))?;
        let attenuation = leg.probe.attenuation;
        let record = Record {
            samples: raw.samples,
            volts_per_code: raw.volts_per_code * attenuation,
            zero_v: raw.zero_v * attenuation,
            interval_s: raw.interval_s,
            start_s: raw.start_s,
            end_codes: raw.end_codes,
            step_v: raw.step_v * attenuation,
            averages: raw.averages,
        };
        Ok((record, raw.acquisition))
    }

    async fn acquisition_number(&self, leg: &LegSpec) -> Result<i64, Trouble> {
        let call = Call::new(Intent::RecordPreamble).with("channel", i64::from(leg.channel));
        let preamble = self.handle.call(call).await?;
        preamble.whole("acquisition").map_err(|source| self.unreadable(source))
    }

    /// The trouble with a record that was driven to its converter's ends.
    pub(crate) fn clipped(&self, leg: &'static str, record: &Record, span_v: f64) -> Trouble {
        Trouble::Clipped {
            pair: self.pair.name.clone(),
            leg,
            count: record.clipped(),
            points: record.samples.len(),
            span: show(span_v, Unit::Volt, 3),
        }
    }

    fn number(&self, fields: &Fields, name: &str) -> Result<f64, Trouble> {
        fields.number(name).map_err(|source| self.unreadable(source))
    }

    fn unreadable(&self, source: evenpair_core::dialect::DialectError) -> Trouble {
        Trouble::Dialect { instrument: self.pair.scope.clone(), source: Box::new(source) }
    }
}
