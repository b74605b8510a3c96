// Sample in, Estimate out: the estimator's door in C++, over any number type. For double they have the very layout of
// estimator_abi.h, which says what each field means.
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>

#include "estimators/estimator_abi.h"
#include "plant/math/fields.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

template <class Real>
struct Sample {
  std::uint32_t size = sizeof(Sample);
  std::uint32_t version = SLIPBENCH_ESTIMATOR_ABI_VERSION;
  std::int64_t tick = 0;
  Real u_alpha{}, u_beta{}, i_alpha{}, i_beta{}, dc_link{}, speed{};
  SLIPBENCH_FIELDS(u_alpha, u_beta, i_alpha, i_beta, dc_link, speed)
};

template <class Real>
struct Estimate {
  std::uint32_t size = sizeof(Estimate);
  std::uint32_t version = SLIPBENCH_ESTIMATOR_ABI_VERSION;
  Real speed{}, rotor_flux{}, rotor_flux_angle{}, torque{}, trust{}, has_covariance{};
  std::array<Real, 6> covariance{};
  SLIPBENCH_FIELDS(speed, rotor_flux, rotor_flux_angle, torque, trust, has_covariance, covariance)
};

static_assert(sizeof(Sample<double>) == sizeof(slipbench_sample));
static_assert(offsetof(Sample<double>, tick) == offsetof(slipbench_sample, tick));
static_assert(offsetof(Sample<double>, u_alpha) == offsetof(slipbench_sample, u_alpha_V));
static_assert(offsetof(Sample<double>, u_beta) == offsetof(slipbench_sample, u_beta_V));
static_assert(offsetof(Sample<double>, i_alpha) == offsetof(slipbench_sample, i_alpha_A));
static_assert(offsetof(Sample<double>, i_beta) == offsetof(slipbench_sample, i_beta_A));
static_assert(offsetof(Sample<double>, dc_link) == offsetof(slipbench_sample, dc_link_V));
static_assert(offsetof(Sample<double>, speed) == offsetof(slipbench_sample, speed_rad_s));
static_assert(sizeof(Estimate<double>) == sizeof(slipbench_estimate));
static_assert(offsetof(Estimate<double>, speed) == offsetof(slipbench_estimate, speed_rad_s));
static_assert(offsetof(Estimate<double>, rotor_flux) == offsetof(slipbench_estimate, rotor_flux_Wb));
static_assert(offsetof(Estimate<double>, rotor_flux_angle) == offsetof(slipbench_estimate, rotor_flux_angle_rad));
static_assert(offsetof(Estimate<double>, torque) == offsetof(slipbench_estimate, torque_Nm));
static_assert(offsetof(Estimate<double>, trust) == offsetof(slipbench_estimate, trust));
static_assert(offsetof(Estimate<double>, has_covariance) == offsetof(slipbench_estimate, has_covariance));
static_assert(offsetof(Estimate<double>, covariance) == offsetof(slipbench_estimate, covariance));

}  // namespace slipbench
