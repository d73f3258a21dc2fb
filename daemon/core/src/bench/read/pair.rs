//! Pairs and their legs.

use super::{Declared, overrides};
use crate::analysis::Drift;
use crate::bench::spec::{Coupling, LegSpec, PairSpec, ProbeSpec};
use crate::bench::{Acquisition, field};
use crate::document::Table;
use crate::units::Unit;

/// Skew this uncertain leaves a 60 V common mode with 25 ns edges below 50 mV: good enough to begin with.
const DEFAULT_TARGET_U_SKEW_S: f64 = 20e-12;

/// Acquisitions for each reference where the file states no number.
const DEFAULT_MOST_ACQUISITIONS: u32 = 16;

/// A night: a correction made in the evening is still used in the morning.
const DEFAULT_MAX_AGE_S: f64 = 12.0 * 3600.0;

/// `[pair.NAME]`
pub(super) fn pair(name: String, table: &mut Table<'_>, declared: &Declared, probes: &[ProbeSpec]) -> Option<PairSpec> {
    let scope = field::name(table, "scope", "instrument", &declared.instruments)
        .or_else(|| table.missing("scope", "name the instrument that both legs are on"));
    let positive = leg(table, "positive", declared, probes);
    let negative = leg(table, "negative", declared, probes);
    if let (Some(positive), Some(negative)) = (&positive, &negative)
        && positive.channel == negative.channel
    {
        table.mistakes().add(
            table.span(),
            format!("both legs of pair `{name}` are on channel {}", positive.channel),
            "put each leg on a channel of its own",
        );
    }
    let coupling = field::choice(table, "coupling", &[("AC", Coupling::Ac), ("DC", Coupling::Dc)]);
    let mut reference = |key: &str, what: &str| {
        field::name(table, key, "reference", &declared.references)
            .or_else(|| table.missing(key, &format!("name the reference that {what} from")))
    };
    let skew_reference = reference("skew_reference", "skew is taken");
    let gain_reference = reference("gain_reference", "gain and offset are taken");
    let acquisition = acquisition(table);
    if let (Some(acquisition), Some(positive), Some(negative)) = (&acquisition, &positive, &negative) {
        let channel = acquisition.trigger.channel;
        if channel != 0 && channel != positive.channel && channel != negative.channel {
            table.mistakes().add(
                table.span(),
                format!("pair `{name}` is triggered by channel {channel}, which is none of its legs"),
                "trigger on a leg of the pair, or on the external input with `channel = 0`",
            );
        }
    }
    let target_u_skew_s = field::amount(table, "target_u_skew", Unit::Second, &(1e-15..=1e-6));
    let most_acquisitions = field::whole(table, "most_acquisitions", &(2..=10_000));
    let max_age_s = field::amount(table, "max_age", Unit::Second, &(1.0..=1e8));
    let drift = drift(table);
    let use_scope_skew = table.flag("use_scope_skew").is_some_and(|item| item.value);
    let response = table.flag("response").is_some_and(|item| item.value);
    table.refuse_others();
    Some(PairSpec {
        name,
        scope: scope?,
        positive: positive?,
        negative: negative?,
        coupling: coupling.unwrap_or(Coupling::Dc),
        skew_reference: skew_reference?,
        gain_reference: gain_reference?,
        acquisition: acquisition?,
        target_u_skew_s: target_u_skew_s.unwrap_or(DEFAULT_TARGET_U_SKEW_S),
        most_acquisitions: most_acquisitions.unwrap_or(DEFAULT_MOST_ACQUISITIONS),
        max_age_s: max_age_s.unwrap_or(DEFAULT_MAX_AGE_S),
        drift,
        use_scope_skew,
        response,
    })
}

/// What a correction may move by within `max_age`, each a half-width; what is not stated does not move.
fn drift(table: &mut Table<'_>) -> Drift {
    let Some(mut inner) = table.table("drift") else { return Drift::default() };
    let gain = field::ratio(&mut inner, "gain", &(0.0..=0.5));
    let skew_s = field::amount(&mut inner, "skew", Unit::Second, &(0.0..=1e-6));
    let offset_v = field::amount(&mut inner, "offset", Unit::Volt, &(0.0..=1e4));
    inner.refuse_others();
    Drift { gain: gain.unwrap_or(0.0), skew_s: skew_s.unwrap_or(0.0), offset_v: offset_v.unwrap_or(0.0) }
}

/// How the pair measures: the same keys as elsewhere, but the four that have no sensible default must be there.
fn acquisition(table: &mut Table<'_>) -> Option<Acquisition> {
    let found = overrides(table);
    let span_v = found.span_v.or_else(|| table.missing("span", "the full vertical span at the tip, for measuring"));
    let interval_s = found.interval_s.or_else(|| table.missing("interval", "the sample interval, such as `\"1 ns\"`"));
    let points = found.points.or_else(|| table.missing("points", "the samples of one record"));
    let trigger = found.trigger.or_else(|| {
        table.missing("trigger", "such as `trigger = { channel = 1, level = \"5 V\", slope = \"positive\" }`")
    });
    Some(Acquisition {
        span_v: span_v?,
        offset_v: found.offset_v.unwrap_or(0.0),
        interval_s: interval_s?,
        points: points?,
        averages: found.averages.unwrap_or(1),
        position: found.position.unwrap_or(0.5),
        trigger: trigger?,
    })
}

fn leg(table: &mut Table<'_>, key: &str, declared: &Declared, probes: &[ProbeSpec]) -> Option<LegSpec> {
    let mut inner = table
        .table(key)
        .or_else(|| table.missing(key, &format!("write `{key} = {{ channel = 1, probe = \"NAME\" }}`")))?;
    let channel = field::whole(&mut inner, "channel", &(1..=64))
        .or_else(|| inner.missing("channel", "the scope's channel, from 1"));
    let probe = field::name(&mut inner, "probe", "probe", &declared.probes)
        .or_else(|| inner.missing("probe", "name one of the `[probe.NAME]` tables"));
    inner.refuse_others();
    let probe = probes.iter().find(|known| Some(&known.name) == probe.as_ref())?.clone();
    Some(LegSpec { channel: channel?, probe })
}
