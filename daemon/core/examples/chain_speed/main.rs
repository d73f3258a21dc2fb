//! How long each stage of the analysis takes on two pairs of long records:
//! `cargo run --release -p evenpair-core --example chain_speed -- [POINTS] [--json FILE] [--write FOLDER] [--show]
//! [--only STAGE]`.
//!
//! Each stage is repeated for about a second, at least three times; printed is the processor time of one run (so that
//! what else the machine does counts little), and the shortest time by the clock. `--write` leaves the samples as 16-bit codes,
//! so that `tests/reference/compare_speed` can run the script that an engineer would write in numpy on the same ones.
//! `--only` repeats one stage, for a profiler; the others run once.

mod scene;

use evenpair_core::analysis::figures::{Allowance, Asked, Figure, FigureInput, FigureKind, compute};
use evenpair_core::analysis::interpolate::TAPS;
use evenpair_core::analysis::skew::{Reference, Shape, estimate_records};
use evenpair_core::analysis::{Correction, Estimate, Record, Samples, apply, leak, rejection};
use scene::{GAIN, INTERVAL_S, NOISE_V, OFFSET_V, SKEW_S, Scene};
use std::error::Error;
use std::time::Instant;

const BANDS: [f64; 5] = [1e5, 1e6, 1e7, 3e7, 1e8];

/// What the command line asks for.
struct Wish {
    points: usize,
    json: Option<String>,
    folder: Option<String>,
    show: bool,
    only: Option<String>,
}

fn main() -> Result<(), Box<dyn Error>> {
    let mut wish = Wish { points: 1_000_000, json: None, folder: None, show: false, only: None };
    let mut arguments = std::env::args().skip(1);
    while let Some(argument) = arguments.next() {
        match argument.as_str() {
            "--json" => wish.json = arguments.next(),
            "--write" => wish.folder = arguments.next(),
            "--show" => wish.show = true,
            "--only" => wish.only = arguments.next(),
            number => wish.points = number.parse()?,
        }
    }
    let scene = Scene::new(wish.points);
    if let Some(folder) = &wish.folder {
        write(&scene, folder)?;
    }
    run(&scene, &wish)
}

/// Times of one stage in milliseconds.
struct Stage {
    name: &'static str,
    processor: f64,
    shortest: f64,
}

/// The stages so far, and which of them is wanted.
struct Stages<'a> {
    done: Vec<Stage>,
    only: Option<&'a str>,
}

/// Repeats a stage, and hands back what it made the last time.
fn time<T>(stages: &mut Stages<'_>, name: &'static str, mut work: impl FnMut() -> T) -> T {
    let wanted = stages.only.is_none_or(|only| only == name);
    let (begun, used) = (Instant::now(), processor_ms());
    let mut shortest = f64::INFINITY;
    let mut runs = 0;
    loop {
        let lap = Instant::now();
        let made = work();
        shortest = shortest.min(lap.elapsed().as_secs_f64() * 1e3);
        runs += 1;
        if !wanted || runs >= 3 && begun.elapsed().as_secs_f64() > 1.0 {
            let processor = match (used, processor_ms()) {
                (Some(before), Some(after)) => (after - before) / f64::from(runs),
                _ => shortest,
            };
            stages.done.push(Stage { name, processor, shortest });
            return made;
        }
    }
}

/// The processor time that this thread has used, in milliseconds, where the system tells (Linux). A second thread's is
/// not in it: run on one core to have all. It is brought up to date a few hundred times a second: right to a percent
/// over a second.
fn processor_ms() -> Option<f64> {
    let text = std::fs::read_to_string("/proc/thread-self/schedstat").ok()?;
    text.split_whitespace().next()?.parse::<f64>().ok().map(|nanoseconds| nanoseconds * 1e-6)
}

fn run(scene: &Scene, wish: &Wish) -> Result<(), Box<dyn Error>> {
    let mut stages = Stages { done: Vec::new(), only: wish.only.as_deref() };
    let beyond = memory_beyond(scene)?;
    let (p, n) = &scene.reference;
    let reference = Reference { shape: Shape::Edges, period_s: None };
    let correction = time(&mut stages, "deskew", || estimate_records(p, n, &reference))?.correction();
    let measure = || rejection::measure(std::slice::from_ref(p), std::slice::from_ref(n), &correction, &BANDS);
    let bands = time(&mut stages, "rejection", measure)?;
    let (p, n) = &scene.device;
    let clipped = time(&mut stages, "clipping", || (p.clipped(), n.clipped()));
    let corrected = time(&mut stages, "correct", || apply::correct(p, n, &correction))?;
    let bound = || leak::bound(&corrected.common(), corrected.interval_s, &correction, &bands);
    let leak = time(&mut stages, "leak", bound);
    let figures = time(&mut stages, "figures", || {
        let plain = apply::plain(p, n)?;
        Ok::<_, apply::ApplyError>(compute(&FigureInput {
            corrected: &corrected,
            plain_v: Some(&plain),
            correction: &correction,
            leak: &leak,
            noise_p_v: NOISE_V,
            noise_n_v: NOISE_V,
            step_p_v: p.step_v,
            step_n_v: n.step_v,
            scale_spec: 0.01,
            clipped_p: clipped.0,
            clipped_n: clipped.1,
            averages: 1,
            allowance: Allowance::default(),
            asked: Asked::default(),
        }))
    })?;
    if wish.show {
        println!("{correction:?}\n{bands:#?}\n{leak:#?}");
        for f in &figures {
            println!("{:<14} {:12.6e} ± {:8.2e}  plain {:?}", f.kind.name(), f.value, f.u, f.plain);
        }
    }
    check(&figures, correction.skew_s.value)?;
    let stages = stages.done;
    println!("2 × {} samples; milliseconds of processor time, and shortest by the clock", wish.points);
    for stage in &stages {
        println!("{:<12} {:9.3} {:9.3}", stage.name, stage.processor, stage.shortest);
    }
    println!("{:<12} {:9.3}", "total", stages.iter().map(|s| s.processor).sum::<f64>());
    let flops = (2 * TAPS * corrected.difference_v.len()) as f64;
    let correct = stages.iter().find(|s| s.name == "correct").map_or(f64::NAN, |s| s.processor);
    println!(
        "correct: {:.1} GFLOP/s in the interpolation alone ({TAPS} taps), all else included in the time; a prototype had \
         29 with 256-bit and 50 with 512-bit instructions",
        flops / correct / 1e6
    );
    if let Some(beyond) = beyond {
        let raw = bytes(p) + bytes(n);
        println!(
            "memory of all but the deskew: {:.1} MB beyond the records, {:.2} × the {:.1} MB of the pair at work",
            beyond as f64 / 1e6,
            beyond as f64 / raw as f64,
            raw as f64 / 1e6
        );
    }
    if let Some(file) = &wish.json {
        let one = |s: &Stage| format!("\"{}\": {}, \"{}_clock\": {}", s.name, s.processor, s.name, s.shortest);
        std::fs::write(file, format!("{{{}}}\n", stages.iter().map(one).collect::<Vec<_>>().join(", ")))?;
    }
    Ok(())
}

/// The most memory that correction, figures and rejection take beyond the records, in bytes. It is taken before
/// anything else has left freed memory behind that would be used again.
fn memory_beyond(scene: &Scene) -> Result<Option<u64>, Box<dyn Error>> {
    let exact = |value| Estimate { value, u: 1e-4 * f64::abs(value) };
    let correction =
        Correction { skew_s: exact(SKEW_S), gain: exact(GAIN), offset_v: exact(OFFSET_V), gain_offset: 0.0 };
    let before = memory_peak_reset();
    let (p, n) = &scene.reference;
    let bands = rejection::measure(std::slice::from_ref(p), std::slice::from_ref(n), &correction, &BANDS)?;
    let (p, n) = &scene.device;
    let corrected = apply::correct(p, n, &correction)?;
    let leak = leak::bound(&corrected.common(), corrected.interval_s, &correction, &bands);
    let figures = compute(&FigureInput {
        corrected: &corrected,
        plain_v: Some(&apply::plain(p, n)?),
        correction: &correction,
        leak: &leak,
        noise_p_v: NOISE_V,
        noise_n_v: NOISE_V,
        step_p_v: p.step_v,
        step_n_v: n.step_v,
        scale_spec: 0.01,
        clipped_p: 0,
        clipped_n: 0,
        averages: 1,
        allowance: Allowance::default(),
        asked: Asked::default(),
    });
    check(&figures, SKEW_S)?;
    Ok(before.zip(memory_peak()).map(|(before, after)| after.saturating_sub(before)))
}

/// What was timed must also be right.
fn check(figures: &[Figure], skew_s: f64) -> Result<(), Box<dyn Error>> {
    let find = |kind| figures.iter().find(|f: &&Figure| f.kind == kind).ok_or("a figure is missing");
    let amplitude = find(FigureKind::Amplitude)?;
    let rise = find(FigureKind::RiseTime)?;
    let right = (amplitude.value - 12.5).abs() < 0.01
        && (rise.value / (20.0 * INTERVAL_S) - 1.0).abs() < 0.02
        && (skew_s - SKEW_S).abs() < 0.01 * INTERVAL_S;
    if right { Ok(()) } else { Err(format!("wrong: {amplitude:?} {rise:?} {skew_s}").into()) }
}

fn bytes(record: &Record) -> u64 {
    match &record.samples {
        Samples::Codes(codes) => 2 * codes.len() as u64,
        Samples::Numbers(numbers) => 4 * numbers.len() as u64,
    }
}

/// The process's highest use of memory in bytes, where the system tells (Linux).
fn memory_peak() -> Option<u64> {
    let status = std::fs::read_to_string("/proc/self/status").ok()?;
    let line = status.lines().find(|line| line.starts_with("VmHWM:"))?;
    line.split_whitespace().nth(1)?.parse::<u64>().ok().map(|kilobytes| kilobytes * 1024)
}

/// The same, once the mark was set back to the present use.
fn memory_peak_reset() -> Option<u64> {
    std::fs::write("/proc/self/clear_refs", "5").ok()?;
    memory_peak()
}

/// The records as little-endian 16-bit codes, for the script.
fn write(scene: &Scene, folder: &str) -> std::io::Result<()> {
    std::fs::create_dir_all(folder)?;
    let records = [
        ("reference_p", &scene.reference.0),
        ("reference_n", &scene.reference.1),
        ("device_p", &scene.device.0),
        ("device_n", &scene.device.1),
    ];
    for (name, record) in records {
        let Samples::Codes(codes) = &record.samples else { continue };
        let bytes: Vec<u8> = codes.iter().flat_map(|code| code.to_le_bytes()).collect();
        std::fs::write(format!("{folder}/{name}.i16"), bytes)?;
    }
    Ok(())
}
