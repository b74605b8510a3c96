#include "plant/linear/step_figures.hpp"

#include <cmath>

namespace slipbench::linear {
namespace {

using Index = Eigen::Index;

double time(const Response& r, Index k) { return r.time_s[static_cast<std::size_t>(k)]; }

// First time at which the way (0 at the start, 1 at the end) reaches `level`; negative: never.
double first_crossing(const Response& r, const Vector& way, double level) {
  for (Index k = 0; k < way.size(); ++k) {
    if (way(k) < level) continue;
    if (k == 0 || r.sampled) return time(r, k);
    return time(r, k - 1) + (time(r, k) - time(r, k - 1)) * (level - way(k - 1)) / (way(k) - way(k - 1));
  }
  return -1.0;
}

double last_outside(const Response& r, const Vector& way, double band) {
  const auto last = way.size() - 1;
  if (std::abs(way(last) - 1.0) > band) return -1.0;
  for (Index k = last - 1; k >= 0; --k) {
    const double here = way(k) - 1.0, next = way(k + 1) - 1.0;
    if (std::abs(here) <= band) continue;
    if (r.sampled) return time(r, k + 1);
    const double edge = here > 0.0 ? band : -band;
    return time(r, k) + (time(r, k + 1) - time(r, k)) * (here - edge) / (here - next);
  }
  return time(r, 0);
}

}  // namespace

StepFigures step_figures(const Response& r, Index output, double wished, std::optional<double> final) {
  if (output < 0 || output >= r.y.cols() || r.y.rows() == 0)
    throw LinearError("there is no output " + std::to_string(output + 1) + " in this response");
  const Vector y = r.y.col(output);
  StepFigures f;
  f.final = final.value_or(y(y.size() - 1));
  f.steady_error = wished - f.final;
  const double way = f.final - y(0);
  if (!(std::abs(way) > 0.0) || !std::isfinite(way)) {
    f.rise_s = f.settling_s = way == 0.0 ? 0.0 : -1.0;
    return f;
  }
  const Vector share = (y.array() - y(0)).matrix() / way;
  Index top = 0;
  double peak = share.maxCoeff(&top);
  f.peak_time_s = time(r, top);
  if (!r.sampled && top > 0 && top + 1 < share.size()) {
    const double before = share(top - 1), after = share(top + 1), bend = before - 2.0 * peak + after;
    if (bend < 0.0) {
      const double shift = 0.5 * (before - after) / bend;
      peak -= 0.25 * (before - after) * shift;
      f.peak_time_s += shift * (time(r, top + 1) - time(r, top));
    }
  }
  f.overshoot = peak > 1.0 + 1e-12 ? peak - 1.0 : 0.0;  // less is the rounding of what settles
  const double low = first_crossing(r, share, 0.1), high = first_crossing(r, share, 0.9);
  f.rise_s = high < 0.0 ? -1.0 : high - low;
  f.settling_s = last_outside(r, share, 0.02);
  return f;
}

}  // namespace slipbench::linear
