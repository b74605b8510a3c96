#include "sim/sweep/store_sensitivity.hpp"

#include <limits>
#include <stdexcept>

namespace slipbench {

namespace {

constexpr double none = std::numeric_limits<double>::quiet_NaN();

// Gathers the runs of a case, hands on the mean of each figure.
template <class Take>
void each_mean(const SweepPlan& plan, const Store& store, const std::vector<std::string>& figures, Take&& take) {
  std::vector<double> sums(figures.size(), 0.0);
  std::uint64_t at = 0;
  std::uint32_t runs = 0;
  const auto hand_on = [&] {
    if (runs == 0) return;
    for (double& sum : sums) sum = runs == plan.runs ? sum / runs : none;
    take(at, sums);
    sums.assign(sums.size(), 0.0), runs = 0;
  };
  store.each_figures(figures, [&](std::uint64_t k, const std::vector<Figure>& values) {
    if (k != at) hand_on();
    at = k, ++runs;
    for (std::size_t f = 0; f < sums.size(); ++f) sums[f] += values[f].value_or(none);
  });
  hand_on();
}

std::vector<FigureSensitivity> of_saltelli(const SweepPlan& plan, const Store& store,
                                           const std::vector<std::string>& figures) {
  const Sampling& sample = *plan.sample;
  const std::size_t members = sample.keys.size() + 2;
  std::vector<SaltelliIndices> indices(figures.size(), {sample.count, sample.keys.size()});
  std::vector<std::vector<double>> outputs(figures.size(), std::vector<double>(members, none));
  std::uint64_t base = 0;
  const auto hand_on = [&] {
    for (std::size_t f = 0; f < figures.size(); ++f) {
      indices[f].add(base, outputs[f]);
      outputs[f].assign(members, none);
    }
  };
  each_mean(plan, store, figures, [&](std::uint64_t k, const std::vector<double>& means) {
    if (k / members != base) hand_on();
    base = k / members;
    for (std::size_t f = 0; f < figures.size(); ++f) outputs[f][k % members] = means[f];
  });
  hand_on();
  std::vector<FigureSensitivity> all;
  for (std::size_t f = 0; f < figures.size(); ++f) all.push_back({figures[f], indices[f].result(sample.seed)});
  return all;
}

std::vector<FigureSensitivity> of_plain_draws(const SweepPlan& plan, const Store& store,
                                              const std::vector<std::string>& figures) {
  const Sampling& sample = *plan.sample;
  Draws draws(sample.kind, sample.count, sample.keys.size(), sample.seed);
  std::vector<BinnedIndices> indices(figures.size(),
                                     {sample.count, sample.keys.size(), sample.kind == DrawKind::sobol});
  each_mean(plan, store, figures, [&](std::uint64_t k, const std::vector<double>& means) {
    const std::vector<double>& u = draws.point(k);
    for (std::size_t f = 0; f < figures.size(); ++f) indices[f].add(k, u, means[f]);
  });
  std::vector<FigureSensitivity> all;
  for (std::size_t f = 0; f < figures.size(); ++f) all.push_back({figures[f], indices[f].result(sample.seed)});
  return all;
}

}  // namespace

std::vector<std::string> drawn_names(const SweepPlan& plan) {
  std::vector<std::string> names;
  for (const DrawnKey& drawn : plan.sample->keys) {
    names.emplace_back();
    for (const std::string& key : drawn.keys) names.back() += (names.back().empty() ? "" : "+") + key;
  }
  return names;
}

std::vector<FigureSensitivity> sensitivities_of(const SweepPlan& plan, const Store& store,
                                                const std::vector<std::string>& figures) {
  if (!plan.sample) throw std::invalid_argument("sensitivities of a plan that draws nothing");
  return plan.sample->kind == DrawKind::saltelli ? of_saltelli(plan, store, figures)
                                                 : of_plain_draws(plan, store, figures);
}

}  // namespace slipbench
