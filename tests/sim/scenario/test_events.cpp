// [[event]]: read, and each way to ask for nonsense refused at its place.
#include <catch2/catch.hpp>

#include "sim/scenario/keys.hpp"
#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using namespace scenario_tests;

namespace {

const char* const good = R"(
[[event]]
at_s = 1.2
kind = "speed_sensor_fault"
fault = "no_signal"
[[event]]
at_s = 0
kind = "current_sensor_fault"
phase = "b"
fault = "stuck"
[[event]]
at_s = 1.21
kind = "speed_from"
estimator = "ekf"
[[event]]
at_s = 1.3
kind = "current_sensor_fault"
phase = "b"
fault = "repaired"
)";

struct Nonsense {
  const char *from, *to, *at, *key, *says;
};

}  // namespace

TEST_CASE("events: read as written, in file order", "[scenario][events]") {
  const Scenario s = read(whole_text() + good);
  REQUIRE(s.events.size() == 4);
  CHECK(s.events[0].at_s == 1.2);
  CHECK(s.events[0].kind == "speed_sensor_fault");
  CHECK(s.events[0].fault == "no_signal");
  CHECK(s.events[1].phase == "b");
  CHECK(s.events[2].estimator == "ekf");
  CHECK(read(whole_text() + good, {{"event.2.estimator", "fast_1"}}).events[2].estimator == "fast_1");
  CHECK(read(whole_text() + good, {{"event.2.estimator", "measured"}}).events[2].estimator == "measured");
  CHECK(read(whole_text() + good, {{"event.0.at_s", "2"}}).events[0].tick(100e-6) == 20000);  // the last tick
  Scenario set = s;
  CHECK(set_number(set, "event.0.at_s", 0.5));
  CHECK_FALSE(set_number(set, "event.4.at_s", 0.5));
}

TEST_CASE("events: nonsense is refused at its place with the way out", "[scenario][events][broken]") {
  const Nonsense table[] = {
      {"at_s = 1.2\n", "", "[[event]]\nkind = \"speed_s", "event.0.at_s", "missing key 'event.0.at_s'"},
      {"at_s = 1.2", "at_s = -1", "-1", "event.0.at_s", "from 0 to"},
      {"at_s = 1.2", "at_s = \"late\"", "\"late\"", "event.0.at_s", "a string"},
      {"at_s = 1.2", "at_s = 2.00001", "2.00001", "event.0.at_s", "it ends at 2 s"},
      {"kind = \"speed_from\"", "kind = \"speed_form\"", "\"speed_form\"", "event.2.kind", "nearest is speed_from"},
      {"kind = \"speed_from\"\n", "", "[[event]]\nat_s = 1.21", "event.2.kind", "one of speed_sensor_fault"},
      {"fault = \"no_signal\"", "fault = \"dead\"", "\"dead\"", "event.0.fault", "one of no_signal, stuck, repaired"},
      {"fault = \"no_signal\"", "", "[[event]]\nat_s = 1.2\n", "event.0.fault", "missing key"},
      {"fault = \"no_signal\"", "fault = \"repaired\"", "\"repaired\"\n[[event]]\nat_s = 0", "event.0.fault",
       "no event before 1.2 s breaks that sensor"},
      {"at_s = 1.3", "at_s = 0", nullptr, "", ""},  // at once and in file order: allowed
      {"phase = \"b\"\nfault = \"repaired\"", "phase = \"a\"\nfault = \"repaired\"", "\"repaired\"", "event.3.fault",
       "no event before 1.3 s"},
      {"fault = \"no_signal\"", "fault = \"stuck\"\nphase = \"a\"", "phase = \"a\"", "event.0.phase",
       "only with current_sensor_fault"},
      {"phase = \"b\"", "phase = \"c\"", "\"c\"\nfault = \"stuck\"", "event.1.phase", "sensors in a and b only"},
      {"phase = \"b\"", "phase = \"d\"", "\"d\"", "event.1.phase", "one of a, b, c"},
      {"phase = \"b\"\n", "", "[[event]]\nat_s = 0", "event.1.phase", "missing key"},
      {"estimator = \"ekf\"", "estimator = \"efk\"", "\"efk\"", "event.2.estimator", "nearest is ekf"},
      {"estimator = \"ekf\"", "", "[[event]]\nat_s = 1.21", "event.2.estimator", "missing key"},
      {"estimator = \"ekf\"", "estimator = 3", "3\n[[event]]\nat_s = 1.3", "event.2.estimator", "wanted is a string"},
      {"estimator = \"ekf\"", "estimatr = \"ekf\"", "estimatr", "event.2.estimatr", "'event.2.estimator'"},
      {"[[event]]", "[event]", "", "", "not valid TOML"},
  };
  for (const Nonsense& n : table) {
    const std::string spoilt = whole_text() + with(good, n.from, n.to);
    const InputError error = error_of(spoilt);
    INFO(n.to << ": " << error.what());
    if (n.at == nullptr) {
      CHECK(error.code() == "none");
      continue;
    }
    CHECK(error.code() != "none");
    CHECK(error.key() == n.key);
    CHECK(error.message().find(n.says) != std::string::npos);
    if (*n.at == '\0') continue;
    // An error in a value stands at the value, one of a whole table at its head.
    const std::size_t at = spoilt.find(n.at, spoilt.find("[score]"));
    REQUIRE(at != std::string::npos);
    const std::size_t head = std::string(n.at).rfind("[[", 0) == 0 ? 2 : 0;
    CHECK((error.place() == place_of(spoilt, at) || error.place() == place_of(spoilt, at + head)));
  }
}

TEST_CASE("events: what the drive does not have cannot fail or be taken", "[scenario][events][broken]") {
  const auto says = [](const std::string& text, const char* key, const char* what) {
    const InputError error = error_of(text);
    INFO(error.what());
    CHECK(error.key() == key);
    CHECK(error.message().find(what) != std::string::npos);
    CHECK(error.place().rfind("file.toml:", 0) == 0);
  };
  const std::string no_sensor =
      with(whole_text(), "kind = \"encoder\"\nlines_per_rev = 2048\nclock_Hz = 20e6\nwindow_s = 2e-3\ntimeout_s = 0.2",
           "kind = \"none\"");
  says(no_sensor + good, "event.0.kind", "no speed sensor that could fail");
  says(no_sensor + "[[event]]\nat_s = 1\nkind = \"speed_from\"\nestimator = \"measured\"\n", "event.0.estimator",
       "there is no speed sensor");
  says(mains_text() + "[[event]]\nat_s = 0.05\nkind = \"speed_from\"\nestimator = \"measured\"\n", "event.0.kind",
       "no place on mains");
  CHECK(error_of(mains_text() + "[[event]]\nat_s = 0.05\nkind = \"current_sensor_fault\"\nphase = \"c\"\n"
                                "fault = \"stuck\"\n")
            .code() == "none");
}
