// From a plan to its cases.
#include <stdexcept>

#include "sim/scenario/tree.hpp"
#include "sim/sweep/plan.hpp"

namespace slipbench {

double DrawnKey::at(double u) const {
  return distribution == Distribution::uniform ? low + u * (high - low) : mean + sigma * normal_quantile(u);
}

std::uint64_t SweepPlan::cases() const {
  if (sample) return sample->kind == DrawKind::saltelli ? sample->count * (sample->keys.size() + 2) : sample->count;
  std::uint64_t count = 1;
  for (const Vary& vary : varies) count *= vary.values.size();
  return count;
}

std::vector<std::string> SweepPlan::keys() const {
  std::vector<std::string> all;
  for (const Vary& vary : varies) all.insert(all.end(), vary.keys.begin(), vary.keys.end());
  if (sample) {
    for (const DrawnKey& key : sample->keys) all.insert(all.end(), key.keys.begin(), key.keys.end());
  }
  return all;
}

CaseMaker::CaseMaker(const SweepPlan& plan) : plan_(plan) {
  if (plan.sample) draws_.emplace(plan.sample->kind, plan.sample->count, plan.sample->keys.size(), plan.sample->seed);
}

std::vector<Override> CaseMaker::overrides(std::uint64_t k) {
  if (k >= plan_.cases()) throw std::out_of_range("no such case");
  std::vector<Override> all = plan_.overrides;
  if (draws_) {
    const std::vector<double>& point = draws_->point(k);
    for (std::size_t j = 0; j < point.size(); ++j) {
      const DrawnKey& drawn = plan_.sample->keys[j];
      for (const std::string& key : drawn.keys) all.push_back({key, number_text(drawn.at(point[j]))});
    }
    return all;
  }
  std::vector<std::size_t> at(plan_.varies.size());
  for (std::size_t v = at.size(); v-- > 0;) {
    at[v] = k % plan_.varies[v].values.size();
    k /= plan_.varies[v].values.size();
  }
  for (std::size_t v = 0; v < at.size(); ++v) {
    for (const std::string& key : plan_.varies[v].keys) all.push_back({key, plan_.varies[v].values[at[v]]});
  }
  return all;
}

}  // namespace slipbench
