// Rows that the methods bring: gathered in this one unit, so that the methods' templates are compiled once here.
#include <algorithm>
#include <stdexcept>

#include "controllers/methods.hpp"
#include "estimators/methods.hpp"
#include "sim/scenario/keys.hpp"

namespace slipbench {
namespace {

struct MethodKind {
  std::string_view kind;
  std::span<const Setting> settings;
  bool takes_speed = true;   // of a controller
  bool needs_speed = false;  // of an estimator
};
using MethodKinds = std::vector<MethodKind>;

// What a program added to the kinds built in, until the table of keys is built.
struct OwnKinds {
  MethodKinds estimators, controllers;
  bool table_built = false;
};
OwnKinds& own_kinds() {
  static OwnKinds own;
  return own;
}

MethodKinds all_estimators() {
  MethodKinds all;
  each_estimator_method([&]<class Method>() { all.push_back({Method::kind, Method::settings, true, requires { Method::needs_speed; }
});
});
all.insert(all.end(), own_kinds().estimators.begin(), own_kinds().estimators.end());
return all;
}

MethodKinds all_controllers() {
  MethodKinds all;
  each_controller_method([&]<class Method>() { all.push_back({Method::kind, Method::settings, Method::takes_speed}); });
  all.insert(all.end(), own_kinds().controllers.begin(), own_kinds().controllers.end());
  return all;
}

std::vector<std::string_view> names_of(const MethodKinds& kinds) {
  std::vector<std::string_view> names;
  for (const MethodKind& k : kinds) names.push_back(k.kind);
  return names;
}

void add_rows(std::vector<Key>& rows, const MethodKind& method, const std::string& table,
              Settings& (*of)(Scenario&, std::size_t)) {
  for (const Setting& s : method.settings) {
    const bool derives = s.fallback != s.fallback;
    rows.push_back({.path = table + "." + std::string(s.name),
                    .slot = MethodSetting{&s, of},
                    .unit = s.unit,
                    .range = {s.low, s.high},
                    .when = {method.kind},
                    .otherwise = derives ? std::string_view("derived from nameplate and sensors") : std::string_view(),
                    .meaning = s.meaning});
  }
}

bool clean(std::string_view name) {
  return !name.empty() && std::all_of(name.begin(), name.end(), [](char c) {
    return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '_';
  });
}

// Throws where a kind added by a program cannot be told from what there is.
void admit(const MethodKind& added, const MethodKinds& there, const std::string& what, const std::string& table) {
  const std::string kind(added.kind), who = what + " kind \"" + kind + "\"";
  if (own_kinds().table_built)
    throw std::logic_error(who +
                           " is added too late: the table of keys is built with the first scenario that is read; "
                           "add it before");
  if (!clean(kind)) throw std::logic_error(who + ": a kind is made of letters, digits and _");
  const std::vector<std::string_view> kinds = names_of(there);
  if (std::count(kinds.begin(), kinds.end(), added.kind) > 0)
    throw std::logic_error(who + " is there already; add each kind once, under a name of its own");
  std::vector<Key> rows;
  drive_keys(rows);
  for (const Setting& s : added.settings) {
    const std::string path = table + "." + std::string(s.name);
    const bool taken = std::any_of(rows.begin(), rows.end(), [&](const Key& key) { return key.path == path; });
    const auto same = [&](const Setting& other) { return other.name == s.name; };
    const bool twice = std::count_if(added.settings.begin(), added.settings.end(), same) > 1;
    if (!clean(s.name) || taken || twice)
      throw std::logic_error(who + ": its setting \"" + std::string(s.name) + "\" " +
                             (taken   ? "is a key that every " + what + " has"
                              : twice ? "stands twice"
                                      : "is no name: letters, digits and _"));
    if (!(s.low <= s.high) || s.fallback < s.low || s.fallback > s.high)
      throw std::logic_error(who + ": the range of its setting \"" + std::string(s.name) +
                             "\" is empty or leaves its default out");
  }
}

}  // namespace

std::vector<Key> method_keys() {
  own_kinds().table_built = true;
  std::vector<Key> rows;
  for (const MethodKind& method : all_controllers()) {
    add_rows(rows, method, "controller", [](Scenario& s, std::size_t) -> Settings& { return s.controller.settings; });
  }
  for (const MethodKind& method : all_estimators()) {
    add_rows(rows, method, "estimator[]",
             [](Scenario& s, std::size_t i) -> Settings& { return s.estimators[i].settings; });
  }
  return rows;
}

std::vector<std::string_view> estimator_kinds() { return names_of(all_estimators()); }
std::vector<std::string_view> controller_kinds() { return names_of(all_controllers()); }

std::vector<std::string_view> speed_taking_controllers() {
  MethodKinds takers;
  for (const MethodKind& method : all_controllers()) {
    if (method.takes_speed) takers.push_back(method);
  }
  return names_of(takers);
}

bool ControllerSettings::takes_speed() const {
  const std::vector<std::string_view> takers = speed_taking_controllers();
  return std::count(takers.begin(), takers.end(), kind) > 0;
}

bool EstimatorSettings::needs_speed() const {
  const MethodKinds all = all_estimators();
  return std::any_of(all.begin(), all.end(), [&](const MethodKind& m) { return m.kind == kind && m.needs_speed; });
}

void add_estimator_keys(std::string_view kind, std::span<const Setting> settings) {
  admit({kind, settings}, all_estimators(), "estimator", "estimator[]");
  own_kinds().estimators.push_back({kind, settings});
}

void add_controller_keys(std::string_view kind, std::span<const Setting> settings, bool takes_speed) {
  admit({kind, settings, takes_speed}, all_controllers(), "controller", "controller");
  own_kinds().controllers.push_back({kind, settings, takes_speed});
}

}  // namespace slipbench
