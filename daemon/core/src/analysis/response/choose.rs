//! Which terms a response has: fitted on one half of the acquisitions, judged on the other.

use super::super::line;
use super::super::skew::Reference;
use super::super::spectrum::Fourier;
use super::super::{Correction, Estimate, Record};
use super::align::{self, HALF, Halves};
use super::bins::{self, Band, Bins};
use super::columns::{self, SLOW, Spectra};
use super::solve::{self, Model, System, Terms, TimeConstant};
use super::words::{self, Verdict};
use super::{BandGain, PoleZero, Prior, Response, ResponseError};

/// The lengths of filter that are tried; longer ones only add noise.
const LENGTHS: [usize; 3] = [5, 9, 17];

/// A term must bring so much rejection, summed over the bands of half a decade, to be worth having. Only what stands out
/// of the noise counts.
const WORTH_DB: f64 = 1.0;

/// A band's change counts beyond this many standard deviations of chance.
const SURE: f64 = 3.0;

/// How often the legs are aligned anew, and to what part of a sample.
const ROUNDS: usize = 4;
const ALIGNED: f64 = 1e-3;

/// The farthest that one round may move, in samples: the slope stands for a delay only over a short way.
const STEP: f64 = 1.0;

/// Spectra of both halves, once they are aligned.
struct Prepared {
    halves: Halves,
    fitted: Spectra,
    judging: Spectra,
    bins: Bins,
    time_constant: Option<TimeConstant>,
    /// Whether the time constant was known before rather than found.
    given: bool,
    /// Samples by which the skew had to grow.
    moved: f64,
}

pub(super) fn fit(
    p: &[Record],
    n: &[Record],
    correction: &Correction,
    reference: &Reference,
    prior: &Prior<'_>,
) -> Result<Response, ResponseError> {
    let prepared = prepare(p, n, correction, reference, prior)?;
    let Prepared { halves, fitted, judging, bins, time_constant, moved, .. } = &prepared;
    let samples = time_constant.map_or(halves.fitted.p.len() as f64, |found| found.samples);
    let learnt = System::new(fitted, &bins.bands, samples);
    let judge = Judge { system: System::new(judging, &bins.bands, samples), bands: &bins.bands };
    let before = Model::moved(*moved);
    let (terms, model, verdicts) = select(&learnt, &judge, &before, time_constant.is_some(), prior.filter.is_none());
    let improved = judge.gains(&before, &model);
    let mut response = Response {
        interval_s: halves.interval_s,
        skew_s: 0.0,
        pole_zero: None,
        taps: vec![1.0],
        level_v: 0.0,
        improved,
        words: Vec::new(),
        gain_u: 0.0,
    };
    if let Some(terms) = terms {
        finish(&mut response, &prepared, terms);
    }
    response.words = words::tell(&response, &verdicts, terms.is_some());
    Ok(response)
}

/// Aligns the acquisitions, a little better in each round, and takes their spectra.
fn prepare(
    p: &[Record],
    n: &[Record],
    correction: &Correction,
    reference: &Reference,
    prior: &Prior<'_>,
) -> Result<Prepared, ResponseError> {
    let mut moved = 0.0;
    let mut round = 0;
    loop {
        let mut aligned = *correction;
        let interval_s = p.first().map_or(0.0, |record| record.interval_s);
        aligned.skew_s.value += moved * interval_s;
        let halves = align::halves(p, n, &aligned, reference, prior.filter)?;
        let length = halves.fitted.p.len();
        let fourier = Fourier::new(length);
        let (positive, negative) = columns::overview(&halves.fitted, &fourier)?;
        let bins = bins::choose(&positive, &negative, length, halves.interval_s, halves.periods);
        if bins.kept.len() < 2 {
            return Err(ResponseError::NoSignal { points: length });
        }
        let (other_positive, other_negative) = columns::overview(&halves.judging, &fourier)?;
        let noise = bins::noise([&positive, &other_positive], [&negative, &other_negative]);
        let share = |one: f64, other: f64| (noise.0 * other / (one + other), noise.1 * other / (one + other));
        let (a, b) = (halves.fitted.acquisitions, halves.judging.acquisitions);
        let fitted = Spectra::of(&halves.fitted, &fourier, &bins, share(a, b))?;
        let terms = Terms { pole_zero: true, taps: 1 };
        // Few bins cannot tell a low-pass and its history from gain and delay.
        let enough = bins.kept.len() >= 6;
        let found = if enough { solve::time_constant(&fitted, terms, None, length) } else { None };
        let shown = found.filter(|found| found.shown(length));
        let known = prior.time_constant_s.map(|seconds| TimeConstant::known(seconds / interval_s));
        let time_constant = if enough { shown.or(known) } else { None };
        let given = shown.is_none() && known.is_some();
        let samples = time_constant.map_or(length as f64, |found| found.samples);
        let system = System::new(&fitted, &bins.bands, samples);
        let model =
            time_constant.and_then(|_| system.fit(terms)).or_else(|| system.fit(Terms { pole_zero: false, taps: 1 }));
        let delay = model.as_ref().map_or(0.0, System::delay);
        round += 1;
        if delay.abs() < ALIGNED || !delay.is_finite() || round == ROUNDS {
            let judging = Spectra::of(&halves.judging, &fourier, &bins, share(b, a))?;
            return Ok(Prepared { halves, fitted, judging, bins, time_constant, given, moved });
        }
        moved += delay.clamp(-STEP, STEP);
    }
}

/// Adds term after term as long as they help.
fn select(
    learnt: &System,
    judge: &Judge<'_>,
    before: &Model,
    slow: bool,
    filter: bool,
) -> (Option<Terms>, Model, Vec<(Terms, Verdict)>) {
    let mut best: (Option<Terms>, Model) = (None, before.clone());
    let mut verdicts = Vec::new();
    let plain = Terms { pole_zero: false, taps: 1 };
    let gain_and_delay = learnt.fit(plain);
    if let Some(model) = &gain_and_delay
        && judge.compare(before, model) == Verdict::Helps
    {
        best = (Some(plain), model.clone());
    }
    let with_slow = Terms { pole_zero: true, taps: 1 };
    if let Some(model) = learnt.fit(with_slow).filter(|_| slow) {
        // It must be the term itself that helps, not the gain and delay that come with it.
        let alone = gain_and_delay.as_ref().map_or(Verdict::Helps, |other| judge.compare(other, &model));
        let verdict = if alone == Verdict::Helps { judge.compare(&best.1, &model) } else { alone };
        if verdict == Verdict::Helps {
            best = (Some(with_slow), model);
        }
        verdicts.push((with_slow, verdict));
    }
    for taps in LENGTHS.into_iter().filter(|_| filter) {
        let pole_zero = best.0.is_some_and(|terms| terms.pole_zero);
        let terms = Terms { pole_zero, taps };
        let Some(model) = learnt.fit(terms) else { continue };
        let verdict = judge.compare(&best.1, &model);
        if verdict == Verdict::Helps {
            best = (Some(terms), model);
        }
        verdicts.push((terms, verdict));
    }
    (best.0, best.1, verdicts)
}

/// Fits the chosen terms to all acquisitions.
fn finish(response: &mut Response, prepared: &Prepared, terms: Terms) {
    let Prepared { halves, fitted, judging, bins, time_constant, given, moved } = prepared;
    let all = fitted.with(judging);
    let length = halves.fitted.p.len();
    let near = time_constant.map(|found| found.samples);
    let time_constant = match terms.pole_zero {
        true if *given => *time_constant,
        true => solve::time_constant(&all, terms, near, length).or(*time_constant),
        false => None,
    };
    let samples = time_constant.map_or(length as f64, |found| found.samples);
    let Some(model) = System::new(&all, &bins.bands, samples).fit(terms) else { return };
    response.gain_u = model.u_sum;
    response.skew_s = moved * halves.interval_s;
    let half = terms.taps / 2;
    response.taps = (HALF - half..=HALF + half).map(|m| model.coefficients[m]).collect();
    if terms.taps == 1 {
        response.skew_s += System::delay(&model) * halves.interval_s;
        response.taps = vec![model.sum()];
    }
    let mut slow = 0.0;
    if let Some(found) = time_constant {
        slow = model.coefficients[SLOW];
        let relative = slow / model.sum();
        let u = model.u[SLOW] / model.sum().abs();
        let value = found.samples * halves.interval_s / (1.0 + relative);
        // Short records show `ε/T`: an error of a given T is one of ε.
        let u_relative = if *given { u.hypot(relative * found.u_relative) } else { u };
        response.pole_zero = Some(PoleZero {
            time_constant_s: Estimate { value, u: value * found.u_relative.hypot(u) },
            relative: Estimate { value: relative, u: u_relative },
        });
    }
    let level = |one: &align::Mean| line::mean(&one.p) - (model.sum() + slow) * line::mean(&one.x[HALF..HALF + length]);
    let (a, b) = (halves.fitted.acquisitions, halves.judging.acquisitions);
    response.level_v = (a * level(&halves.fitted) + b * level(&halves.judging)) / (a + b);
}

/// The half of the acquisitions that judges.
struct Judge<'b> {
    system: System,
    bands: &'b [Band],
}

impl Judge<'_> {
    /// Whether `after` is better than `before`.
    ///
    /// With `d` the difference of the two corrected legs and noise of power w per bin, the residual powers differ by
    /// chance with a variance of `2w·Σ|d|²`.
    fn compare(&self, before: &Model, after: &Model) -> Verdict {
        let (noise, noise_x) = self.system.noise;
        let change = &after.coefficients - &before.coefficients;
        let taps: f64 = change.rows(0, SLOW).iter().map(|one| one * one).sum();
        let mut gained_db = 0.0;
        for (products, band) in self.system.bands.iter().zip(self.bands) {
            let (old, new) = (before.cost(products), after.cost(products));
            let full = change.clone().insert_row(columns::POSITIVE, 0.0);
            let moved = full.dot(&(products * &full)).max(0.0) + band.range.len() as f64 * noise_x * taps;
            if (old - new).abs() > SURE * (2.0 * noise * moved).sqrt() {
                let floor = self.floor(band);
                gained_db += 10.0 * (old.max(floor) / new.max(floor)).log10();
            }
        }
        match gained_db {
            gained if gained > WORTH_DB => Verdict::Helps,
            gained if gained < -WORTH_DB => Verdict::Harms,
            _ => Verdict::Nothing,
        }
    }

    /// The residual power that noise could leave in a band at a coverage factor of 2.
    fn floor(&self, band: &Band) -> f64 {
        2.0 * self.system.noise.0 * (band.range.len() as f64).sqrt()
    }

    fn gains(&self, before: &Model, after: &Model) -> Vec<BandGain> {
        let gain = |(products, band): (&nalgebra::DMatrix<f64>, &Band)| {
            let common = products[(columns::POSITIVE, columns::POSITIVE)];
            let floor = self.floor(band);
            let db = |power: f64| -10.0 * (power.max(floor) / common).log10();
            BandGain {
                from_hz: band.from_hz,
                to_hz: band.to_hz,
                before_db: db(before.cost(products)),
                after_db: db(after.cost(products)),
                floor_db: db(floor),
            }
        };
        self.system.bands.iter().zip(self.bands).map(gain).collect()
    }
}
