//! `POST /budget`: the error budget of a measurement not yet made. It asks no instrument and starts nothing.

use axum::Json;
use evenpair_api::{Budget, BudgetRequest, Problem, ProblemCode};
use evenpair_core::planning;
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::Desk;
use super::body::Body;
use super::problem::Fault;

pub(super) fn routes() -> OpenApiRouter<Desk> {
    OpenApiRouter::new().routes(routes!(budget))
}

/// Predict the errors of a pair of single-ended probes before and after a deskew, and say whether they will do, or what a
/// differential probe must offer.
#[utoipa::path(post, path = "/budget", tag = "budget", request_body = BudgetRequest,
    responses((status = 200, body = Budget), (status = 413, body = Problem), (status = 415, body = Problem),
              (status = 422, body = Problem)))]
async fn budget(Body(request): Body<BudgetRequest>) -> Result<Json<Budget>, Fault> {
    answer(&request).map(Json)
}

fn answer(request: &BudgetRequest) -> Result<Budget, Fault> {
    planning::budget(request).map_err(|flaws| {
        let told: Vec<String> = flaws.iter().map(ToString::to_string).collect();
        Fault::new(ProblemCode::InvalidRequest, told.join(". "))
    })
}

#[cfg(test)]
mod tests;
