#include "tools/slipbench/json_out.hpp"

#include <cmath>
#include <nlohmann/json.hpp>

#include "sim/board/budget.hpp"
#include "sim/scenario/scenario.hpp"
#include "sim/sweep/worst_case.hpp"
#include "tools/slipbench/comparison.hpp"
#include "tools/slipbench/export_result.hpp"
#include "tools/slipbench/run_result.hpp"
#include "tools/slipbench/sweep_result.hpp"

namespace slipbench {

namespace {

using Json = nlohmann::ordered_json;

Json value_of(Figure value) { return value && std::isfinite(*value) ? Json(*value) : Json(nullptr); }

Json columns(const std::vector<NamedValue>& values) {
  Json object = Json::object();
  for (const NamedValue& value : values) object[value.name] = value_of(value.value);
  return object;
}

template <class Figures, class List>
void add_figures(Json& object, const Figures& figures, const List& list) {
  for (const auto& entry : list) object[std::string(entry.name)] = value_of(figures.*entry.value);
}

Json bounds(const Interval& interval) {
  return interval.low ? Json::array({value_of(interval.low), value_of(interval.high)}) : Json(nullptr);
}

std::string text_of(const Json& document) {
  return document.dump(2, ' ', false, Json::error_handler_t::replace) + "\n";
}

void add_share(Json& key, const std::string& name, const Share& share) {
  key[name] = value_of(share.value);
  key[name + "_ci95"] = Json::array({value_of(share.low), value_of(share.high)});
}

void add_sensitivities(Json& document, const SweepResult& r) {
  const std::vector<std::string> names = drawn_names(*r.plan);
  Json all = Json::object(), points = Json::object();
  for (const FigureSensitivity& one : r.sensitivities) {
    Json figure = Json::object();
    for (std::size_t j = 0; j < one.shares.keys.size(); ++j) {
      Json key = Json::object();
      add_share(key, "first", one.shares.keys[j].first);
      key["total"] = nullptr, key["total_ci95"] = nullptr;  // plain draws give none
      if (one.shares.keys[j].total) add_share(key, "total", *one.shares.keys[j].total);
      figure[names[j]] = std::move(key);
    }
    all[one.figure] = std::move(figure);
    points[one.figure] = {{"used", one.shares.used}, {"lost", one.shares.lost}};
    if (!one.shares.none.empty()) points[one.figure]["none"] = one.shares.none;
  }
  document["sensitivity"] = std::move(all);
  document["sensitivity_points"] = std::move(points);
}

Json board_of(const BoardResult& b) {
  const ExchangeFigures& f = b.exchange;
  const BoardOutcome& o = b.outcome;
  Json board = {{"link", b.link},
                {"name", b.name},
                {"samples", f.samples},
                {"answers", f.answers},
                {"missing", f.missing},
                {"damaged", f.damaged},
                {"late", f.late},
                {"doubled", f.doubled},
                {"strange", f.strange},
                {"restarts", f.restarts},
                {"fault", o.fault},
                {"gates_opened_at_s", nullptr},
                {"gone", nullptr},
                {"exchange_p50_us", f.round_trip_p50_us},
                {"exchange_p99_us", f.round_trip_p99_us},
                {"exchange_max_us", f.round_trip_max_us}};
  if (o.lost) board["gates_opened_at_s"] = static_cast<double>(o.opened_tick) * b.control_period_s;
  if (o.gone) board["gone"] = o.why;
  if (!b.used_unit.empty() && f.answers > 0)
    board["used"] = {{"unit", b.used_unit}, {"least", f.used_least}, {"mean", f.used_mean}, {"most", f.used_most}};
  if (b.baud > 0.0) board["serial"] = {{"baud", b.baud}, {"exchange_us", 1e6 * serial_exchange_s(b.baud)}};
  return board;
}

}  // namespace

std::string json_document(const RunResult& r) {
  Json document;
  document["slipbench"] = SLIPBENCH_VERSION;
  document["scenario"] = r.scenario->title;
  document["seed"] = r.scenario->seed;
  document["status"] = r.status;
  if (r.outcome.diverged) document["diverged"] = {{"at_s", r.outcome.diverged_at_s}, {"what", r.outcome.diverged_what}};
  if (r.interrupted) document["interrupted"] = true;
  document["simulated_s"] = r.outcome.simulated_s;
  document["wall_s"] = r.outcome.wall_s;
  document["clipped_samples"] = r.outcome.clipped_samples;
  document["events"] = Json::array();
  for (const ActedEvent& e : r.outcome.events)
    document["events"].push_back({{"tick", e.tick}, {"time_s", e.time_s}, {"what", e.what}});
  document["final"] = columns(r.final);
  document["mean"] = columns(r.mean);
  document["drive"] = Json::object();
  add_figures(document["drive"], r.drive, drive_figures);
  document["estimators"] = Json::object();
  document["digest"] = {{"plant", r.plant_digest}};
  for (const EstimatorResult& e : r.estimators) {
    Json entry = {{"kind", e.kind}};
    add_figures(entry, e.figures, estimator_figures);
    entry["step_ns"] = value_of(e.step_ns);
    document["estimators"][e.name] = std::move(entry);
    document["digest"][e.name] = e.digest;
  }
  if (r.board) document["board"] = board_of(*r.board);
  if (r.stream) {
    document["stream"] = {{"endpoint", r.stream->endpoint},
                          {"subscribers", r.stream->subscribers},
                          {"blocks", r.stream->blocks},
                          {"rows", r.stream->rows},
                          {"dropped", r.stream->dropped}};
  }
  return text_of(document);
}

std::string json_document(const SweepResult& r) {
  const SweepOutcome& o = r.outcome;
  Json document;
  document["slipbench"] = SLIPBENCH_VERSION;
  document["cases"] = r.plan->cases();
  document["runs"] = r.plan->runs;
  document["done"] = r.rows;
  document["failed"] = r.diverged + r.refused;
  document["diverged"] = r.diverged;
  document["refused"] = r.refused;
  document["lost"] = r.lost;
  document["resumed"] = o.resumed;
  document["wall_s"] = o.wall_s;
  document["simulated_s"] = o.simulated_s;
  document["lanes"] = o.lanes;
  document["threads"] = o.threads;
  document["isa"] = o.isa;
  document["store"] = r.store;
  document["ran_alone"] = Json::object();
  for (const auto& [reason, rows] : o.not_in_lanes) document["ran_alone"][reason] = rows;
  if (!r.sensitivities.empty()) add_sensitivities(document, r);
  if (o.stopped) document["interrupted"] = true;
  if (r.cluster)
    document["slurm"] = {{"shards", r.cluster->shards}, {"submitted", r.cluster->submitted}, {"lost", r.cluster->lost}};
  if (r.merged)
    document["merged"] = {{"rows", r.merged->rows}, {"twice", r.merged->twice}, {"missing", r.merged->missing}};
  return text_of(document);
}

std::string json_document(const WorstCase& w, const std::string& figure, const std::string& file) {
  Json search = {{"figure", figure}, {"runs", w.runs}, {"status", w.status.empty() ? Json(nullptr) : Json(w.status)}};
  search["best"] = Json::object();
  for (std::size_t j = 0; j < w.at.size(); ++j) {
    for (const std::string& key : w.box[j].keys) search["best"][key] = w.at[j];
  }
  search["value"] = value_of(w.value);
  search["fresh"] = {{"mean", value_of(w.fresh_mean.mean)},
                     {"ci95", bounds(w.fresh_mean)},
                     {"runs", w.fresh.size()},
                     {"diverged", w.fresh_diverged}};
  search["without"] = w.without;
  search["flat"] = w.flat;
  if (!file.empty()) search["file"] = file;
  if (w.stopped) search["interrupted"] = true;
  return text_of({{"slipbench", SLIPBENCH_VERSION}, {"search", search}});
}

std::string json_document(const Comparison& c) {
  Json document;
  document["runs"] = c.runs();
  document["in_loop"] = c.in_loop;
  if (c.stopped) document["interrupted"] = true;
  document["estimators"] = Json::object();
  document["differences"] = Json::array();
  for (std::size_t e = 0; e < c.estimators.size(); ++e) {
    Json entry = Json::object();
    for (std::size_t f = 0; f < c.figure_names.size(); ++f) {
      const Interval interval = c.interval(e, f);
      entry[std::string(c.figure_names[f])] = {
          {"mean", value_of(interval.mean)}, {"ci95", bounds(interval)}, {"runs", interval.runs}};
    }
    entry["lost_runs"] = c.estimators[e].lost_runs();
    entry["diverged_runs"] = c.estimators[e].diverged_runs();
    document["estimators"][c.estimators[e].name] = std::move(entry);
    for (std::size_t b = e + 1; b < c.estimators.size(); ++b) {
      for (std::size_t f = 0; f < c.figure_names.size(); ++f) {
        const Interval d = c.difference(e, b, f);
        document["differences"].push_back({{"a", c.estimators[e].name},
                                           {"b", c.estimators[b].name},
                                           {"figure", c.figure_names[f]},
                                           {"mean", value_of(d.mean)},
                                           {"ci95", bounds(d)}});
      }
    }
  }
  return text_of(document);
}

std::string json_document(const CheckDocument& check) {
  Json document = {{"slipbench", SLIPBENCH_VERSION},
                   {"file", check.file},
                   {"kind", check.kind},
                   {"title", check.title},
                   {"valid", true}};
  document["facts"] = Json::object();
  for (const Fact& fact : check.facts) {
    document["facts"][fact.key] = fact.text.empty() ? value_of(fact.number) : Json(fact.text);
  }
  return text_of(document);
}

std::string json_document(const ExportResult& r) {
  Json document = {
      {"slipbench", SLIPBENCH_VERSION}, {"scenario", r.scenario}, {"format", export_format},
      {"precision", r.precision},       {"folder", r.folder},     {"control_period_s", r.control_period_s}};
  document["parts"] = Json::object();
  for (std::size_t i = 0; i < r.parts.size(); ++i) {
    const ExportedPart& part = r.parts[i];
    const OperationCount& o = part.operations;
    Json entry = {
        {"kind", part.kind}, {"state_bytes", part.state_bytes}, {"vector_ticks", part.stretches * part.ticks}};
    entry["operations"] = {{"all", o.all()},     {"add", o.add},          {"multiply", o.multiply},
                           {"divide", o.divide}, {"square_root", o.root}, {"compare", o.compare},
                           {"choose", o.choose}, {"other", o.other}};
    entry["files"] = Json::array();
    for (const ExportedFile& file : part.files) entry["files"].push_back(file.name);
    if (i < r.costs.size()) {
      const BoardCost& c = r.costs[i];
      entry["cortex_m4f"] = {{"instructions_least", c.least},
                             {"instructions_mean", c.mean},
                             {"instructions_most", c.most},
                             {"ticks", c.ticks},
                             {"flash_bytes", c.flash_bytes}};
    }
    document["parts"][part.name] = std::move(entry);
  }
  if (!r.costs.empty()) {
    document["clock_MHz"] = r.band.clock_MHz;
    document["clocks_per_instruction"] = {r.band.least, r.band.most};
    document["shortest_control_period_us"] = Json::object();
    for (const ShortestPeriod& p : r.periods())
      document["shortest_control_period_us"][p.of] = {r.band.least_us(p.instructions), r.band.most_us(p.instructions)};
  }
  return text_of(document);
}

std::string json_document(const ErrorDocument& error) {
  return text_of(
      {{"error", {{"place", error.place}, {"key", error.key}, {"message", error.message}, {"code", error.code}}}});
}

}  // namespace slipbench
