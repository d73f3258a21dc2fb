//! What is remembered, what is replaced, and what is forgotten.

use super::*;

fn output(channel: i64, state: bool) -> Call {
    Call::new(Intent::OutputSet).with("channel", channel).with("state", state)
}

fn voltage(channel: i64, value: f64) -> Call {
    Call::new(Intent::SourceVoltage).with("channel", channel).with("value", value)
}

fn route(intent: Intent, channels: &[i64]) -> Call {
    Call::new(intent).with("channels", channels.to_vec())
}

fn memory(calls: &[Call]) -> Memory {
    let mut memory = Memory::default();
    calls.iter().for_each(|call| memory.note(call));
    memory
}

#[test]
fn the_last_setting_of_each_channel_counts_in_the_order_made() {
    let memory = memory(&[output(1, false), voltage(1, 24.0), voltage(2, 5.0), output(1, true), voltage(1, 48.0)]);
    assert_eq!(memory.calls(), [voltage(2, 5.0), output(1, true), voltage(1, 48.0)]);
}

#[test]
fn one_shape_of_a_source_replaces_another() {
    let sine = Call::new(Intent::SourceSine).with("channel", 1_i64);
    let square = Call::new(Intent::SourceSquare).with("channel", 1_i64);
    assert_eq!(memory(&[sine, square.clone()]).calls(), [square]);
}

#[test]
fn queries_and_actions_are_not_remembered() {
    let calls = [Call::new(Intent::Identify), Call::new(Intent::AcquireStart), Call::new(Intent::Clear)];
    assert_eq!(memory(&calls).calls(), []);
}

#[test]
fn closed_channels_are_closed_again_and_opened_ones_are_not() {
    let calls = [
        route(Intent::RouteClose, &[101, 102]),
        route(Intent::RouteOpen, &[101]),
        route(Intent::RouteClose, &[103, 102]),
    ];
    assert_eq!(memory(&calls).calls(), [route(Intent::RouteClose, &[103, 102])]);
}

#[test]
fn opening_all_forgets_the_routes_and_a_reset_everything() {
    let mut memory = memory(&[voltage(1, 24.0), route(Intent::RouteClose, &[101]), Call::new(Intent::RouteOpenAll)]);
    assert_eq!(memory.calls(), [voltage(1, 24.0)]);
    memory.note(&Call::new(Intent::Reset));
    assert_eq!(memory.calls(), []);
}
