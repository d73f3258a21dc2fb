//! Placeholder.
#![allow(dead_code, unused_imports)]
mod store;
fn main() {}
