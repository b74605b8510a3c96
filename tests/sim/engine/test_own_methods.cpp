// Kinds that a program adds itself: known to reader, errors and engine like the built-in ones, and no trace on the others.
#include <catch2/catch.hpp>
#include <cmath>
#include <stdexcept>
#include <string>

#include "controllers/rotor_flux_oriented.hpp"
#include "estimators/luenberger.hpp"
#include "estimators/reduced_order.hpp"
#include "sim/engine/own_methods.hpp"
#include "sim/engine/simulate.hpp"
#include "sim/record/digest.hpp"
#include "sim/score/estimator_score.hpp"
#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using scenario_tests::error_of;
using scenario_tests::with;

namespace {

// The reduced-order observer under another name: what it estimates must be the built-in one's, bit by bit.
struct Twin : ReducedOrder {
  static constexpr std::string_view kind = "twin";
};
struct ControlTwin : RotorFluxOriented {
  static constexpr std::string_view kind = "control_twin";
};

// Answers a speed that the scenario sets: every figure of it follows from the truth alone.
struct Constant {
  static constexpr std::string_view kind = "constant";
  static constexpr std::array<Setting, 2> settings{{
      {"guess_rad_s", "rad/s", -1000.0, 1000.0, 10.0, "the speed that is answered"},
      {"guess_trust", "", 0.0, 1.0, derived, "the trust that is answered; default 1/2"},
  }};
  template <class Real>
  struct Constants {
    Real guess{}, trust{};
  };
  template <class Real>
  struct State {};
  static Constants<double> prepare(const EstimatorSetup&, const Settings& given) {
    if (given.value("guess_rad_s", 10.0) == 0.0) throw std::invalid_argument("a guess of nothing");
    return {given.value("guess_rad_s", 10.0), given.value("guess_trust", 0.5)};
  }
  static State<double> begin(const EstimatorSetup&, const Constants<double>&) { return {}; }
  template <class Real>
  static Estimate<Real> step(State<Real>&, const Sample<Real>&, const Constants<Real>& c) {
    Estimate<Real> out;
    out.speed = c.guess;
    out.trust = c.trust;
    return out;
  }
};

template <class Base, int which>
struct Named : Base {
  static constexpr std::array<std::string_view, 7> names{"late",     "bad name", "namesake",    "two_alike",
                                                         "no_range", "",         "out_of_range"};
  static constexpr std::string_view kind = names[which];
};
struct Namesake : Named<Constant, 2> {
  static constexpr std::array<Setting, 1> settings{{{"kind", "", 0.0, 1.0, 0.5, "clashes"}}};
};
struct ControlNamesake : Named<ControlTwin, 2> {
  static constexpr std::array<Setting, 1> settings{{{"delay_periods", "", 0.0, 1.0, 0.5, "clashes"}}};
};
struct TwoAlike : Named<Constant, 3> {
  static constexpr std::array<Setting, 2> settings{{{"a", "", 0, 1, 0.5, ""}, {"a", "", 0, 1, 0.5, ""}}};
};
struct NoRange : Named<Constant, 4> {
  static constexpr std::array<Setting, 1> settings{{{"a", "", 1, 0, derived, ""}}};
};
struct OutOfRange : Named<Constant, 6> {
  static constexpr std::array<Setting, 1> settings{{{"a", "", 0, 1, 2, ""}}};
};

template <class F>
std::string refusal_of(F&& add) {
  try {
    add();
  } catch (const std::logic_error& error) {
    return error.what();
  }
  return "not refused";
}

// Added before main, so before any scenario is read; what is refused then is kept for the test below.
std::vector<std::string> refused;
const bool added = [] {
  add_estimator<Twin>();
  add_estimator<Constant>();
  add_controller<ControlTwin>();
  refused = {
      refusal_of(add_estimator<Constant>),
      refusal_of(add_estimator<Luenberger>),
      refusal_of(add_controller<ControlTwin>),
      refusal_of(add_estimator<Named<Constant, 1>>),
      refusal_of(add_estimator<Named<Constant, 5>>),
      refusal_of(add_estimator<Namesake>),
      refusal_of(add_controller<ControlNamesake>),
      refusal_of(add_estimator<TwoAlike>),
      refusal_of(add_estimator<NoRange>),
      refusal_of(add_estimator<OutOfRange>),
  };
  return true;
}();

const std::string riders = R"(
[[estimator]]
name = "mine"
kind = "constant"
guess_rad_s = 50
[[estimator]]
name = "twin"
kind = "twin"
speed_filter_Hz = 40
)";

// A loaded run-up, closed over the Luenberger observer beside a reduced-order one; invented drive of the whole text.
std::string drive_text(const std::string& tail = {}) {
  std::string text = scenario_tests::whole_text();
  text = with(text, "duration_s = 2.0", "duration_s = 0.3");
  text = with(text, "[0.5, 0.0], [0.5, 8.0]", "[0.2, 0.0], [0.2, 8.0]");
  text = with(text, "kind = \"extended_kalman\"\nload_torque = true", "kind = \"reduced_order\"\nspeed_filter_Hz = 40");
  text = with(text, "from_s = 0.5\nto_s = 1.5", "from_s = 0.1\nto_s = 0.3");
  return text + tail;
}

struct Result {
  std::string plant;
  std::vector<std::string> estimators;
  std::vector<EstimatorFigures> figures;
  std::vector<double> guess_errors_rpm;  // of 50 rad/s, over the window
};
struct Truth : RunObserver {
  std::vector<double> errors;
  void control_tick(const TickView& v) override {
    if (v.time_s > 0.1 - 1e-9) errors.push_back(50.0 * 30.0 / 3.14159265358979323846 - (*v.plant)[P::speed_rpm]);
  }
};
Result run(const std::string& text) {
  const Scenario s = scenario_tests::read(text);
  EstimatorScore score(score_basis(s));
  RunDigest digest;
  Truth truth;
  const std::array<RunObserver*, 3> observers{&score, &digest, &truth};
  simulate(s, observers);
  Result r{digest.plant(), {}, score.figures(), truth.errors};
  for (std::size_t i = 0; i < digest.estimator_count(); ++i) r.estimators.push_back(digest.estimator(i));
  return r;
}

bool holds(const std::string& text, const std::string& part) { return text.find(part) != std::string::npos; }

}  // namespace

TEST_CASE("own methods: estimators added leave plant and others as they were, to the bit", "[engine][property]") {
  const Result without = run(drive_text()), both = run(drive_text(riders));
  REQUIRE(both.estimators.size() == 4);
  CHECK(both.plant == without.plant);
  CHECK(both.estimators[0] == without.estimators[0]);
  CHECK(both.estimators[1] == without.estimators[1]);
  // The built-in method under another name: the same numbers through the other door.
  CHECK(both.estimators[3] == both.estimators[0]);
  CHECK(both.estimators[2] != both.estimators[0]);
}

TEST_CASE("own methods: an estimator added is scored like any other", "[engine][property]") {
  const Result r = run(drive_text(riders));
  double square = 0.0, sum = 0.0;
  for (const double e : r.guess_errors_rpm) square += e * e, sum += e;
  const double n = static_cast<double>(r.guess_errors_rpm.size());
  REQUIRE(n == 2001);  // 0.1 s to 0.3 s at 100 us, both ends
  // The definition, summed here; 2001 sums of doubles leave 1e-12.
  CHECK(*r.figures[2].speed_rmse_rpm == Approx(std::sqrt(square / n)).epsilon(1e-11));
  CHECK(*r.figures[2].speed_bias_rpm == Approx(sum / n).epsilon(1e-11));
}

TEST_CASE("own methods: a controller added closes the loop like the built-in one it copies", "[engine][property]") {
  const std::string text = drive_text();
  const Result twin = run(with(text, "kind = \"rotor_flux_oriented\"", "kind = \"control_twin\""));
  CHECK(twin.plant == run(text).plant);
  CHECK(error_of(with(with(text, "\"rotor_flux_oriented\"", "\"control_twin\""), "current_bandwidth_Hz = 300",
                      "current_bandwidth_Hz = 30000"))
            .code() == "range");
}

TEST_CASE("own methods: settings are keys with range, nearest name and kind", "[engine][property]") {
  const std::string text = drive_text(riders);
  const Scenario s = scenario_tests::read(text, {{"estimator.2.guess_trust", "0.25"}});
  CHECK(s.estimators[2].settings.value("guess_rad_s", 0.0) == 50.0);
  CHECK(s.estimators[2].settings.value("guess_trust", 0.0) == 0.25);

  const InputError range = error_of(with(text, "guess_rad_s = 50", "guess_rad_s = 5000"));
  CHECK(range.code() == "range");
  CHECK(holds(range.what(), "1000"));
  const InputError typo = error_of(with(text, "guess_rad_s = 50", "gess_rad_s = 50"));
  CHECK(typo.code() == "unknown_key");
  CHECK(holds(typo.what(), "estimator.2.guess_rad_s"));
  CHECK(typo.place() == scenario_tests::place_of(text, text.find("guess_rad_s")));
  CHECK(holds(error_of(with(text, "kind = \"constant\"", "kind = \"constent\"")).what(), "constant"));
  const InputError elsewhere = error_of(text + "guess_rad_s = 4\n");
  CHECK(holds(elsewhere.what(), "only with constant"));
}

TEST_CASE("own methods: data that an estimator cannot do with end the run before it starts", "[engine][property]") {
  const Scenario s = scenario_tests::read(with(drive_text(riders), "guess_rad_s = 50", "guess_rad_s = 0"));
  try {
    check_start(s);
    FAIL("not refused");
  } catch (const InputError& error) {
    CHECK(error.key() == "estimator.2");
    CHECK(holds(error.what(), "'mine' cannot be set up: a guess of nothing"));
  }
}

TEST_CASE("own methods: too late, twice, or not to be told apart is refused", "[engine][property]") {
  REQUIRE(added);
  const std::array<const char*, 10> reasons{
      "there already",       "there already",        "there already", "letters, digits", "letters, digits",
      "every estimator has", "every controller has", "stands twice",  "range",           "range"};
  for (std::size_t i = 0; i < reasons.size(); ++i) {
    INFO(i << ": " << refused.at(i));
    CHECK(holds(refused[i], reasons[i]));
  }
  scenario_tests::read(drive_text());
  CHECK(holds(refusal_of(add_estimator<Named<Constant, 0>>), "too late"));
  CHECK(holds(refusal_of(add_controller<Named<ControlTwin, 0>>), "too late"));
  // What was refused left nothing behind.
  const InputError unknown = error_of(with(drive_text(riders), "kind = \"constant\"", "kind = \"late\""));
  CHECK(holds(unknown.what(), "twin"));
  CHECK_FALSE(holds(unknown.what(), "namesake"));
}
