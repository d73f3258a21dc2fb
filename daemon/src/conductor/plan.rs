//! From what people ask for to checked sequences, and the bench in the API's words.

use std::path::Path;

use evenpair_api::{self as api, MistakeReport, Quantity};
use evenpair_core::analysis::figures::FigureKind;
use evenpair_core::analysis::transfer::Choice;
use evenpair_core::bench::{Bench, LegSpec, OFFSETS_V, PairSpec, SPANS_V};
use evenpair_core::document::{Mistake, line_and_column};
use evenpair_core::sequence::{
    self, DeskewPlan, Sequence, TransferPlan, VerifyPlan, deskew_alone, transfer_alone, verify_alone,
};
use uuid::Uuid;

use super::Refusal;
use super::rest::RestState;
use super::workshop::Workshop;

/// The cautions that stand for every bench; the trade's usual ones, deferring to local codes and licensed practice.
const CAUTIONS: [&str; 3] = [
    "Both probe grounds are at earth. Never defeat the earth of a scope.",
    "Stay inside the probes' voltage rating, which falls with frequency, and their measurement category.",
    "Hot circuits need a qualified person; local codes and licensed practice come first.",
];

/// The pair of this name.
pub(super) fn pair<'b>(bench: &'b Bench, name: &str) -> Result<&'b PairSpec, Refusal> {
    bench.pair(name).ok_or_else(|| Refusal::UnknownPair {
        pair: name.to_owned(),
        known: bench.pairs.iter().map(|pair| pair.name.clone()).collect(),
    })
}

/// The sequence of a deskew asked for by itself.
pub(super) fn deskew(bench: &Bench, name: &str, request: &api::DeskewRequest) -> Result<Sequence, Refusal> {
    pair(bench, name)?;
    let (skew, gain) = (request.skew_reference.as_deref(), request.gain_reference.as_deref());
    let mut plan = DeskewPlan::of(bench, name, skew, gain).map_err(|error| bad(error.to_string()))?;
    plan.target_u_skew_s = target(request.target_u_skew_s, plan.target_u_skew_s)?;
    plan.most_acquisitions = most(request.most_acquisitions, plan.most_acquisitions)?;
    plan.use_scope_skew = request.use_scope_skew.unwrap_or(plan.use_scope_skew);
    plan.response = request.response.unwrap_or(plan.response);
    Ok(deskew_alone(bench, plan))
}

/// The sequence of a transfer asked for by itself.
pub(super) fn transfer(bench: &Bench, name: &str, request: &api::TransferRequest) -> Result<Sequence, Refusal> {
    pair(bench, name)?;
    let (span_v, offset_v) = (request.span_v, request.offset_v);
    if !(SPANS_V.contains(&span_v) && offset_v.is_none_or(|offset_v| OFFSETS_V.contains(&offset_v))) {
        return Err(bad(format!("a span of {span_v} V around {offset_v:?} V is no vertical range")));
    }
    let plan = TransferPlan::of(bench, name, &request.reference, span_v, offset_v);
    let mut plan = plan.map_err(|error| bad(error.to_string()))?;
    plan.choice = request.by.map_or(plan.choice, Choice::from);
    plan.target_u_skew_s = target(request.target_u_skew_s, plan.target_u_skew_s)?;
    plan.most_acquisitions = most(request.most_acquisitions, plan.most_acquisitions)?;
    Ok(transfer_alone(bench, plan))
}

/// The wanted standard uncertainty of skew, or the pair's own.
fn target(asked: Option<f64>, own: f64) -> Result<f64, Refusal> {
    match asked {
        Some(target) if !(target > 0.0 && target.is_finite()) => {
            Err(bad(format!("`target_u_skew_s` is {target}, but must be above 0 s")))
        }
        asked => Ok(asked.unwrap_or(own)),
    }
}

/// The most acquisitions asked for, or the pair's own.
fn most(asked: Option<u32>, own: u32) -> Result<u32, Refusal> {
    match asked {
        Some(most) if most == 0 || most > 10_000 => {
            Err(bad(format!("`most_acquisitions` is {most}, but must be 1 to 10000")))
        }
        asked => Ok(asked.unwrap_or(own)),
    }
}

/// The sequence of a verification asked for by itself.
pub(super) fn verify(bench: &Bench, name: &str, request: &api::VerifyRequest) -> Result<Sequence, Refusal> {
    pair(bench, name)?;
    let plan = VerifyPlan::of(bench, name, request.reference.as_deref()).map_err(|error| bad(error.to_string()))?;
    Ok(verify_alone(bench, plan))
}

fn bad(what: String) -> Refusal {
    Refusal::BadRequest { what, help: "GET /api/v1/bench shows what there is".to_owned() }
}

/// Reads a sequence and checks it against the bench.
pub(super) fn read(bench: &Bench, text: &str) -> Result<Sequence, Refusal> {
    let unit_of = |name: &str| FigureKind::parse(name).map(FigureKind::unit);
    sequence::read(text, bench, &unit_of)
        .map_err(|mistakes| Refusal::SequenceMistakes { mistakes: report(text, &mistakes) })
}

fn report(text: &str, mistakes: &[Mistake]) -> Vec<MistakeReport> {
    let one = |mistake: &Mistake| {
        let (line, column) = line_and_column(text, mistake.span.start);
        MistakeReport { line, column, what: mistake.what.clone(), help: mistake.help.clone() }
    };
    mistakes.iter().map(one).collect()
}

/// The text of the sequence that a request means.
pub(super) async fn text_of(folder: Option<&Path>, request: api::RunRequest) -> Result<String, Refusal> {
    match (request.sequence, request.text) {
        (None, Some(text)) => Ok(text),
        (Some(name), None) => {
            let known = names(folder).await;
            // Only a name that the folder lists is opened, so a name cannot lead out of it.
            let folder = folder.filter(|_| known.contains(&name));
            let Some(folder) = folder else { return Err(Refusal::UnknownSequence { name, known }) };
            let path = folder.join(format!("{name}.toml"));
            tokio::fs::read_to_string(&path)
                .await
                .map_err(|error| bad(format!("reading the sequence {}: {error}", path.display())))
        }
        _ => Err(Refusal::BadRequest {
            what: "a run needs either `sequence`, a name, or `text`, a sequence as TOML".to_owned(),
            help: "give exactly one of the two".to_owned(),
        }),
    }
}

/// The names of the sequences in the folder.
async fn names(folder: Option<&Path>) -> Vec<String> {
    let mut names = Vec::new();
    let Some(folder) = folder else { return names };
    match tokio::fs::read_dir(folder).await {
        Ok(mut entries) => {
            while let Ok(Some(entry)) = entries.next_entry().await {
                let name = entry.file_name();
                names.extend(name.to_str().and_then(|name| name.strip_suffix(".toml")).map(str::to_owned));
            }
        }
        Err(error) => tracing::warn!(folder = %folder.display(), %error, "reading the folder of sequences"),
    }
    names.sort();
    names
}

/// The sequences in the folder, each with what its check finds now.
pub(super) async fn sequences(bench: &Bench, folder: Option<&Path>) -> api::Sequences {
    let mut items = Vec::new();
    for name in names(folder).await {
        let request = api::RunRequest { sequence: Some(name.clone()), text: None };
        let checked = match text_of(folder, request).await {
            Ok(text) => read(bench, &text),
            Err(refusal) => Err(refusal),
        };
        items.push(match checked {
            Ok(sequence) => {
                let (steps, captures) = (sequence.steps.len() + sequence.always.len(), sequence.captures());
                let check = api::CheckReport { steps: steps as u64, captures: captures as u64, mistakes: Vec::new() };
                api::SequenceInfo { name, title: sequence.title, check }
            }
            Err(refusal) => {
                let mistakes = match refusal {
                    Refusal::SequenceMistakes { mistakes } => mistakes,
                    other => vec![MistakeReport { line: 1, column: 1, what: other.to_string(), help: String::new() }],
                };
                api::SequenceInfo {
                    title: name.clone(),
                    name,
                    check: api::CheckReport { steps: 0, captures: 0, mistakes },
                }
            }
        });
    }
    api::Sequences { items }
}

/// The bench in the API's words.
pub(super) fn describe(workshop: &Workshop, rest: &RestState, run: Option<Uuid>) -> api::Bench {
    let bench = &workshop.bench;
    let cautions = CAUTIONS.iter().map(|caution| (*caution).to_owned()).chain(bench.cautions.iter().cloned());
    api::Bench {
        name: bench.name.clone(),
        rest: match rest {
            RestState::Settled => api::Rest::Settled,
            RestState::Unknown | RestState::Unsettled(_) => api::Rest::Unsettled,
        },
        instruments: workshop.instruments.describe(bench),
        pairs: bench.pairs.iter().map(describe_pair).collect(),
        settings: bench
            .settings
            .iter()
            .map(|setting| api::Setting {
                name: setting.name.clone(),
                instrument: setting.call.instrument.clone(),
                unit: setting.unit.symbol().to_owned(),
                min: setting.min,
                max: setting.max,
            })
            .collect(),
        routes: bench
            .routes
            .iter()
            .map(|route| api::Route { name: route.name.clone(), purpose: route.purpose.clone() })
            .collect(),
        references: bench
            .references
            .iter()
            .map(|reference| api::Reference {
                name: reference.name.clone(),
                kind: reference.kind.name().to_owned(),
                route: reference.route.clone().unwrap_or_default(),
                frequency: Quantity::exact(reference.frequency_hz, "Hz"),
            })
            .collect(),
        run,
        cautions: cautions.collect(),
    }
}

fn describe_pair(pair: &PairSpec) -> api::Pair {
    let leg = |leg: &LegSpec| api::Leg {
        channel: leg.channel,
        probe: api::Probe {
            attenuation: leg.probe.attenuation,
            rating: Quantity::exact(leg.probe.rating_v, "V"),
            resistance: Quantity::exact(leg.probe.resistance_ohm, "Ω"),
            capacitance: Quantity::exact(leg.probe.capacitance_f, "F"),
        },
    };
    api::Pair {
        name: pair.name.clone(),
        scope: pair.scope.clone(),
        positive: leg(&pair.positive),
        negative: leg(&pair.negative),
        correction: None,
    }
}
