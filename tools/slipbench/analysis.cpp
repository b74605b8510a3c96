#include "tools/slipbench/analysis.hpp"

#include <algorithm>

#include "plant/linear/zeros.hpp"

namespace slipbench {

namespace {

constexpr double two_pi = 6.283185307179586;

// The value, or the sentence that says why there is none.
template <class F>
auto tried(F&& make) -> Maybe<decltype(make())> {
  try {
    return {make(), ""};
  } catch (const linear::LinearError& error) {
    return {{}, error.what()};
  }
}

void warn(Analysis& a, const std::string& warning) {
  if (!warning.empty() && std::find(a.warnings.begin(), a.warnings.end(), warning) == a.warnings.end())
    a.warnings.push_back(warning);
}

}  // namespace

Analysis analyse(const linear::System& system, double period_s, double at_Hz) {
  Analysis a;
  a.system = system;
  a.modes = linear::modes_of(system);
  a.tests = linear::pbh(system);
  a.verdict = linear::stability_of(system);
  a.ranks = linear::ranks_of(system);
  a.stabilisable = linear::stabilisable(system, &a.stabilisable_why);
  a.detectable = linear::detectable(system, &a.detectable_why);
  a.minimal = tried([&] { return linear::minimal(system); });
  a.balanced = tried([&] { return linear::balanced(system); });
  a.parts = tried([&] { return linear::kalman_form(system); });
  a.modal = tried([&] { return linear::modal_form(system); });
  a.gramians = tried([&] { return linear::gramians(system); });
  a.zeros = tried([&] { return linear::transmission_zeros(system); });
  a.dc_gain = tried([&] { return linear::dc_gain(system); });
  warn(a, a.ranks.warning);
  if (a.minimal) warn(a, a.minimal->warning);
  if (a.parts) warn(a, a.parts->warning);
  if (a.balanced) warn(a, a.balanced->warning);
  if (a.gramians) warn(a, a.gramians->warning);
  if (period_s > 0.0) {
    for (const auto method :
         {linear::Discretisation::zero_order_hold, linear::Discretisation::euler, linear::Discretisation::tustin}) {
      a.discretised.push_back(tried([&] {
        return Discretised{method, period_s, linear::discretise(system, period_s, method),
                           linear::discretisation_error(system, period_s, method)};
      }));
      if (!a.discretised.back())
        a.discretised.back().why = std::string(linear::name_of(method)) + ": " + a.discretised.back().why;
    }
  }
  a.at_Hz = at_Hz;
  if (at_Hz > 0.0) a.at = tried([&] { return linear::frequency_response(system, two_pi * at_Hz); });
  return a;
}

}  // namespace slipbench
