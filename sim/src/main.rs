//! Placeholder.
#![expect(dead_code, reason = "the devices that use the world are not here yet")]

mod scenario;
mod world;

fn main() {}
