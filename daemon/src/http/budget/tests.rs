use axum::response::IntoResponse;

use super::*;

/// The example that comes with the program.
fn example() -> BudgetRequest {
    planning::read(include_str!("../../../../configs/budgets/high-side-gate.toml")).unwrap().plan
}

/// A plan and a budget go through JSON and come back the same, whatever the verdict: no part is lost on the way.
#[test]
fn plans_and_budgets_come_back_from_json() {
    let mut plan = example();
    // One plan for each verdict, so that every part of the answer is there once.
    let mut verdicts = Vec::new();
    for (accuracy, rating_v, scale_spec) in
        [(0.5, 300.0, 0.015), (0.05, 300.0, 0.015), (0.04, 30.0, 0.0), (0.001, 300.0, 0.015), (0.02, 300.0, 0.0)]
    {
        plan.signal.accuracy_ratio = Some(accuracy);
        plan.probe.rating_v = Some(rating_v);
        plan.scope.scale_spec = Some(scale_spec);
        let sent: BudgetRequest = serde_json::from_str(&serde_json::to_string(&plan).unwrap()).unwrap();
        assert_eq!(sent, plan);
        let budget = answer(&sent).unwrap();
        let told: Budget = serde_json::from_str(&serde_json::to_string(&budget).unwrap()).unwrap();
        assert_eq!(told, budget);
        verdicts.push(budget.verdict);
    }
    use evenpair_api::BudgetVerdict as V;
    assert_eq!(verdicts, [V::AsTheyAre, V::AfterDeskew, V::Refused, V::OutOfReach, V::DifferentialProbe]);
}

#[test]
fn what_may_be_left_out_may_be_left_out() {
    let text = r#"{"signal": {"swing_v": 48, "edge_s": 25e-9, "difference_v": 12, "accuracy_ratio": 0.05},
                   "probe": {"attenuation": 10, "rating_v": 300}, "scope": {"bits": 12}}"#;
    let budget = answer(&serde_json::from_str(text).unwrap()).unwrap();
    assert!(!budget.assumed.is_empty() && !budget.terms.is_empty());
    assert!(serde_json::from_str::<BudgetRequest>(r#"{"signal": {"swing": 48}}"#).is_err());
}

#[tokio::test]
async fn flaws_are_a_problem_that_names_them_all() {
    let response = answer(&BudgetRequest::default()).unwrap_err().into_response();
    assert_eq!(response.status(), 422);
    let body = axum::body::to_bytes(response.into_body(), 10_000).await.unwrap();
    let problem: Problem = serde_json::from_slice(&body).unwrap();
    assert!(problem.detail.contains("`signal.swing` is missing") && problem.detail.contains("`scope.bits`"));
}
