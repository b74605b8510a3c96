// A built-in method stepped in float, as a single-precision board would: what it sees is rounded to float at the door, its
// constants and state are float, and what it answers is exact in the caller's number type. Lanes go one after another.
#pragma once

#include <array>

#include "sim/engine/ports.hpp"

namespace slipbench {

namespace detail {

// One lane of a struct of numbers to the same struct of float, and back.
inline constexpr std::size_t most_numbers = 16;
template <class Real, class From, class To>
void to_single(const From& from, std::size_t lane, To& to) {
  std::array<float, most_numbers> flat{};
  std::size_t n = 0;
  each_number(from, [&](const Real& x) { flat[n++] = static_cast<float>(lane_of(x, lane)); });
  n = 0;
  each_number(to, [&](float& x) { x = flat[n++]; });
}
template <class Real, class From, class To>
void from_single(const From& from, std::size_t lane, To& to) {
  std::array<float, most_numbers> flat{};
  std::size_t n = 0;
  each_number(from, [&](const float& x) { flat[n++] = x; });
  n = 0;
  each_number(to, [&](Real& x) { set_lane(x, lane, static_cast<double>(flat[n++])); });
}

template <class Method>
struct SingleMethod {
  typename Method::template Constants<float> constants;
  typename Method::template State<float> state;

  void load(const MethodNumbers& numbers) {
    std::size_t n = 0;
    each_number(constants, [&](float& x) { x = static_cast<float>(numbers.constants[n++]); });
    n = 0;
    each_number(state, [&](float& x) { x = static_cast<float>(numbers.state[n++]); });
  }
  void save(std::vector<double>& to) const {
    to.clear();
    each_number(state, [&](const float& x) { to.push_back(static_cast<double>(x)); });
  }
};

// In and Out: Sample and Estimate, or Measurement and Command.
template <class Real, class Method, template <class> class In, template <class> class Out>
class SingleLanes {
 public:
  template <class Get>
  SingleLanes(Cases cases, Get numbers) {
    for (std::size_t lane = 0; lane < width_of<Real>; ++lane) lanes_[lane].load(numbers(*cases[lane]));
  }
  Out<Real> step(const In<Real>& seen) {
    Out<Real> out;
    for (std::size_t lane = 0; lane < width_of<Real>; ++lane) {
      In<float> one;
      one.tick = seen.tick;
      to_single<Real>(seen, lane, one);
      SingleMethod<Method>& method = lanes_[lane];
      from_single<Real>(Method::template step<float>(method.state, one, method.constants), lane, out);
    }
    return out;
  }
  void save(std::vector<double>& to, std::size_t lane) const { lanes_[lane].save(to); }

 private:
  std::array<SingleMethod<Method>, width_of<Real>> lanes_;
};

}  // namespace detail

template <class Real, class Method>
class SingleEstimator final : public EstimatorPortOf<Real> {
 public:
  template <class Get>
  SingleEstimator(Cases cases, Get numbers) : lanes_(cases, numbers) {}
  [[gnu::flatten]] Estimate<Real> step(const Sample<Real>& sample) override { return lanes_.step(sample); }
  void save(std::vector<double>& to, std::size_t lane) const override { lanes_.save(to, lane); }

 private:
  detail::SingleLanes<Real, Method, Sample, Estimate> lanes_;
};

template <class Real, class Method>
class SingleController final : public ControllerPortOf<Real> {
 public:
  template <class Get>
  SingleController(Cases cases, Get numbers) : lanes_(cases, numbers) {}
  [[gnu::flatten]] Command<Real> step(const Measurement<Real>& m) override { return lanes_.step(m); }
  void save(std::vector<double>& to, std::size_t lane) const override { lanes_.save(to, lane); }

 private:
  detail::SingleLanes<Real, Method, Measurement, Command> lanes_;
};

}  // namespace slipbench
