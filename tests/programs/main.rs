//! Whole-program tests: the real binaries on a simulated bench, driven as a user would drive them.

#![allow(clippy::unwrap_used, reason = "a test that cannot go on has failed")]
#![allow(clippy::float_cmp, reason = "what a supply is set to comes back as the very number")]

mod analyse;
mod bench;
mod commands;
mod crash;
mod demo;
mod deskew;
mod devices;
mod dialect;
mod faults;
mod files;
mod hislip;
mod hostile;
mod personalities;
mod ranges;
mod references;
mod refusals;
mod response;
mod rest;
mod scripts;
mod sequences;
mod spectrum;
mod worlds;
