//! From nested stages to a flat list of steps, following what has been set and where the tips are.

use super::stage::{Stage, What};
use crate::bench::{Bench, field::plain};
use crate::document::Table;
use crate::sequence::step::{Action, CapturePlan, OnVoid, Step};
use crate::sequence::transfer::TransferPlan;
use crate::units::Unit;

/// The most steps of a sequence: one each second is fourteen hours, and the journal of so many stays below 20 MB.
pub(super) const MOST_STEPS: usize = 50_000;

/// Unrolls `stages` after `first`; `None` once it has recorded a mistake.
pub(super) fn unroll(stages: &[Stage], bench: &Bench, first: Option<Step>, top: &Table<'_>) -> Option<Vec<Step>> {
    let mut unrolling = Unrolling {
        bench,
        top,
        steps: first.into_iter().collect(),
        conditions: Vec::new(),
        tips: Tips::Unknown,
        transfers: Vec::new(),
        wrong: false,
    };
    unrolling.stages(stages);
    (!unrolling.wrong).then_some(unrolling.steps)
}

/// Where the tips are.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Tips {
    /// As a deskew, a transfer or a verification left them.
    OnReference,
    /// As a route put them.
    Routed,
    /// Nothing was routed yet.
    Unknown,
}

struct Unrolling<'a, 't> {
    bench: &'a Bench,
    top: &'a Table<'t>,
    steps: Vec<Step>,
    conditions: Vec<(String, f64)>,
    tips: Tips,
    /// The transfers so far: a capture on one of their ranges has a correction.
    transfers: Vec<&'a TransferPlan>,
    wrong: bool,
}

impl<'a> Unrolling<'a, '_> {
    fn stages(&mut self, stages: &'a [Stage]) {
        for stage in stages {
            if self.wrong {
                return;
            }
            self.stage(stage);
        }
    }

    fn stage(&mut self, stage: &'a Stage) {
        match &stage.what {
            What::Ask { instrument, command } => {
                let action = Action::Ask { instrument: instrument.clone(), command: command.clone() };
                self.push(stage, action, format!("ask {instrument}: {command}"), 0.0);
            }
            What::Capture(plan) => {
                self.needs_route(stage);
                self.needs_correction(stage, plan);
                self.push(stage, Action::Capture(plan.clone()), format!("capture {}", plan.pair), 0.0);
            }
            What::Deskew(plan) => {
                self.tips = Tips::OnReference;
                self.push(stage, Action::Deskew(plan.clone()), format!("deskew {}", plan.pair), 0.0);
            }
            What::Route { route } => {
                self.tips = Tips::Routed;
                let purpose = self.bench.route(route).map_or("", |spec| spec.purpose.as_str());
                self.push(stage, Action::Route { route: route.clone() }, format!("route {route}: {purpose}"), 0.0);
            }
            What::Send { instrument, command } => {
                let action = Action::Send { instrument: instrument.clone(), command: command.clone() };
                self.push(stage, action, format!("send to {instrument}: {command}"), 0.0);
            }
            What::Set { setting, value } => self.set(stage, setting, *value),
            What::Sweep { axes, inner } => self.sweep(stage, axes, inner),
            What::Transfer(plan) => {
                self.tips = Tips::OnReference;
                self.transfers.push(plan);
                self.push(stage, Action::Transfer(plan.clone()), plan.in_words(), 0.0);
            }
            What::Verify(plan) => {
                self.tips = Tips::OnReference;
                let text = format!("verify {} on {}", plan.pair, plan.reference);
                self.push(stage, Action::Verify(plan.clone()), text, 0.0);
            }
            What::Wait { time_s } => {
                self.push(stage, Action::Wait, format!("wait {}", plain(*time_s, Unit::Second)), *time_s);
            }
        }
    }

    /// The first axis turns slowest; each is set only when its value changes.
    fn sweep(&mut self, stage: &'a Stage, axes: &'a [super::axis::Axis], inner: &'a [Stage]) {
        let Some((axis, rest)) = axes.split_first() else {
            self.stages(inner);
            return;
        };
        for &value in &axis.values {
            if self.wrong {
                return;
            }
            self.set(stage, &axis.setting, value);
            self.sweep(stage, rest, inner);
        }
    }

    fn set(&mut self, stage: &Stage, name: &str, value: f64) {
        let Some(setting) = self.bench.setting(name) else { return };
        for pair in &self.bench.pairs {
            if let Some(why) = self.bench.over_rating(name, value, pair) {
                let help =
                    "stay within the rating, or use probes that are rated for it; the rating falls with frequency";
                self.top.mistakes().add(stage.span.clone(), why, help);
                self.wrong = true;
            }
        }
        let text = format!("set {name} to {}", plain(value, setting.unit));
        let settle_s = setting.settle_s;
        match self.conditions.iter_mut().find(|(known, _)| known == name) {
            Some((_, known)) => *known = value,
            None => self.conditions.push((name.to_owned(), value)),
        }
        self.push(stage, Action::Set { setting: name.to_owned(), value }, text, settle_s);
    }

    /// After a deskew the tips are still on the reference: a capture there would measure the wrong thing all night.
    fn needs_route(&mut self, stage: &Stage) {
        if self.bench.routes.is_empty() || self.tips == Tips::Routed {
            return;
        }
        let what = match self.tips {
            Tips::OnReference => {
                "this capture comes after a deskew, a transfer or a verification: the tips are still on its reference"
            }
            _ => "nothing is routed to the tips before this capture",
        };
        self.top.mistakes().add(stage.span.clone(), what, "put a stage with `do = \"route\"` before it");
        self.wrong = true;
    }

    /// Where the pair's corrections do not hold a capture would be refused in the middle of the night.
    fn needs_correction(&mut self, stage: &Stage, plan: &CapturePlan) {
        let own = |pair: &crate::bench::PairSpec| plan.acquisition.same_range(&pair.acquisition);
        let transferred = |to: &&TransferPlan| to.pair == plan.pair && to.leads_to(&plan.acquisition);
        if plan.on_void != OnVoid::Refuse
            || self.bench.pair(&plan.pair).is_some_and(own)
            || self.transfers.iter().any(transferred)
        {
            return;
        }
        self.top.mistakes().add(
            stage.span.clone(),
            format!(
                "this capture is on another range than the corrections of pair `{}`, so it would be refused",
                plan.pair
            ),
            "leave `span` and `offset` out, put a stage with `do = \"transfer\"` to that range before it, or write \
             `on_void = \"mark\"`",
        );
        self.wrong = true;
    }

    fn push(&mut self, stage: &Stage, action: Action, text: String, rest_s: f64) {
        if self.steps.len() >= MOST_STEPS {
            if !self.wrong {
                self.top.mistakes().add(
                    stage.span.clone(),
                    format!("the sequence has more than {MOST_STEPS} steps"),
                    "make the sweeps coarser, or split the sequence: so many steps do not fit into a night",
                );
            }
            self.wrong = true;
            return;
        }
        self.steps.push(Step { action, conditions: self.conditions.clone(), text, rest_s });
    }
}
