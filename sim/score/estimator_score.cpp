#include "sim/score/estimator_score.hpp"

namespace slipbench {

EstimatorScore::EstimatorScore(const ScoreBasis& basis) {
  const ScoreBasis* const alone = &basis;
  limits_ = ScoreLimits<double>({&alone, 1});
}

void EstimatorScore::control_tick(const TickView& view) {
  const PlantRow& plant = *view.plant;
  const JudgedBy<double> truth{plant[P::speed_rpm], plant[P::rotor_flux], plant[P::rotor_flux_angle], plant[P::torque]};
  const bool in_window = limits_.in_window(view.time_s);
  for (std::size_t i = 0; i < tallies_.size() && i < view.estimates.size(); ++i) {
    const Estimate<double>& e = view.estimates[i];
    tallies_[i].judge(limits_, in_window, truth, {e.speed, e.rotor_flux, e.rotor_flux_angle, e.torque}, view.time_s);
  }
}

std::vector<EstimatorFigures> EstimatorScore::figures() const {
  std::vector<EstimatorFigures> all;
  for (const auto& tally : tallies_) all.push_back(tally.figures(0));
  return all;
}

}  // namespace slipbench
