//! Whether a reference suits a pair: one set of rules for the bench file, for a sequence and for a request.

use super::Acquisition;
use super::field::plain;
use super::spec::{Bench, PairSpec, ReferenceSpec};
use crate::units::Unit;

/// What a reference is used for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Role {
    /// Gain and offset are taken from it.
    Gain,
    /// Skew is taken from it.
    Skew,
    /// The rejection is shown on it.
    Verify,
}

impl Bench {
    /// How `reference` is acquired with `pair`.
    #[must_use]
    pub fn reference_acquisition(&self, pair: &PairSpec, reference: &ReferenceSpec) -> Acquisition {
        pair.acquisition.with(&reference.overrides)
    }

    /// Why `reference` must not be used with `pair` in this role, each in words; empty if it may.
    ///
    /// It may not when a probe or the vertical window does not bear its levels, when the trigger cannot see it, or when
    /// the vertical range makes the result worthless on the measuring range: attenuators differ in gain and offset from
    /// range to range, so gain, offset and rejection are only true on the very range of the measurement, and skew may
    /// be carried to it only with a stated uncertainty.
    #[must_use]
    pub fn misfits(&self, pair: &PairSpec, reference: &ReferenceSpec, role: Role) -> Vec<String> {
        let mut why = Vec::new();
        let name = &reference.name;
        let acquisition = self.reference_acquisition(pair, reference);
        let volts = |value: f64| plain(value, Unit::Volt);
        let highest = reference.low_v.abs().max(reference.high_v.abs());
        if highest > pair.rating_v() {
            why.push(format!(
                "reference `{name}` brings {} to the tips of pair `{}`, whose probes are rated for {}",
                volts(highest),
                pair.name,
                volts(pair.rating_v())
            ));
        }
        for (setting, value) in &reference.settings {
            why.extend(self.over_rating(setting, *value, pair));
        }
        let (bottom, top) = acquisition.window_v();
        if reference.low_v < bottom || reference.high_v > top {
            why.push(format!(
                "reference `{name}` lies between {} and {}, but the records of pair `{}` would hold {} to {}",
                volts(reference.low_v),
                volts(reference.high_v),
                pair.name,
                volts(bottom),
                volts(top)
            ));
        }
        let trigger = acquisition.trigger;
        if trigger.channel != 0 && pair.leg_on(trigger.channel).is_none() {
            why.push(format!(
                "reference `{name}` is triggered by channel {}, which is no leg of pair `{}`",
                trigger.channel, pair.name
            ));
        } else if trigger.channel != 0 && !(reference.low_v < trigger.level_v && trigger.level_v < reference.high_v) {
            why.push(format!(
                "the trigger level {} is not between the levels of reference `{name}`, {} and {}",
                volts(trigger.level_v),
                volts(reference.low_v),
                volts(reference.high_v)
            ));
        }
        if !acquisition.same_range(&pair.acquisition) {
            match role {
                Role::Gain | Role::Verify => why.push(format!(
                    "reference `{name}` is acquired on a span of {} around {}, pair `{}` measures on {} around {}: gain, \
                     offset and rejection do not carry over from one range to another",
                    volts(acquisition.span_v),
                    volts(acquisition.offset_v),
                    pair.name,
                    volts(pair.acquisition.span_v),
                    volts(pair.acquisition.offset_v)
                )),
                Role::Skew if reference.carry_u_s.is_none() => why.push(format!(
                    "reference `{name}` is acquired on another range than pair `{}` measures on, and its `carry` does \
                     not say how much uncertainty that adds to the skew",
                    pair.name
                )),
                Role::Skew => {}
            }
        }
        why
    }

    /// Why a correction of `pair` must not be transferred to the range of `new` by `reference`, each in words; empty if
    /// it may. Both ranges have to show the whole reference.
    #[must_use]
    pub fn misfits_between(&self, pair: &PairSpec, reference: &ReferenceSpec, new: &Acquisition) -> Vec<String> {
        let on = |range: &Acquisition| {
            let (mut pair, mut reference) = (pair.clone(), reference.clone());
            (reference.overrides.span_v, reference.overrides.offset_v) = (Some(range.span_v), Some(range.offset_v));
            (pair.acquisition.span_v, pair.acquisition.offset_v) = (range.span_v, range.offset_v);
            self.misfits(&pair, &reference, Role::Gain)
        };
        let mut why = on(&pair.acquisition);
        why.extend(on(new).into_iter().filter(|reason| !why.contains(reason)).collect::<Vec<_>>());
        if new.same_range(&pair.acquisition) {
            why.push(format!(
                "pair `{}` measures on a span of {} around {}: a deskew makes the correction of that range",
                pair.name,
                plain(new.span_v, Unit::Volt),
                plain(new.offset_v, Unit::Volt)
            ));
        }
        why
    }

    /// Why setting `name` to `value` must not be done while the probes of `pair` are on the device; `None` if it may.
    #[must_use]
    pub fn over_rating(&self, name: &str, value: f64, pair: &PairSpec) -> Option<String> {
        let setting = self.setting(name)?;
        let tip_v = setting.tip_v(value);
        (tip_v > pair.rating_v()).then(|| {
            format!(
                "`{name}` at {} brings up to {} to the tips of pair `{}`, whose probes are rated for {}",
                plain(value, setting.unit),
                plain(tip_v, Unit::Volt),
                pair.name,
                plain(pair.rating_v(), Unit::Volt)
            )
        })
    }
}
