// The store: what goes in comes out, to the bit; what it was made from is held to; what is no store is refused.
#include <sys/resource.h>

#include <catch2/catch.hpp>
#include <csignal>
#include <limits>

#include "sim/scenario/input_error.hpp"
#include "sim/sweep/store.hpp"
#include "sim/sweep/sweep.hpp"
#include "tests/sim/sweep/plans.hpp"

using namespace slipbench;
using namespace sweep_tests;

namespace {

const Origin origin = {{"format", "1"}, {"plan", "a = 1\nb = 2\n"}, {"seed", "5"}};
const StoreColumns columns = {{"key.one", "key.\"two\", three"}, {"ekf.speed_rmse_rpm", "drive.load_dip_rpm"}};

ResultRow row(std::uint64_t k, std::uint32_t run, Figure a, Figure b, std::string value = "1") {
  return {k, run, "done", "", {std::move(value), "word"}, {a, b}};
}

std::vector<ResultRow> rows_of(const Store& store) {
  std::vector<ResultRow> rows;
  store.each_row([&](const ResultRow& r) {
    rows.push_back(r);
    return true;
  });
  return rows;
}

bool same(const ResultRow& a, const ResultRow& b) {
  return a.case_number == b.case_number && a.run == b.run && a.status == b.status && a.message == b.message &&
         a.values == b.values && a.figures == b.figures;
}

template <class Error, class F>
std::string told(F act) {
  try {
    act();
  } catch (const Error& e) {
    return e.what();
  }
  throw std::runtime_error("nothing was thrown");
}

bool says(const std::string& text, const std::string& part) {
  INFO(text);
  CHECK(text.find(part) != std::string::npos);
  return text.find(part) != std::string::npos;
}

}  // namespace

TEST_CASE("store: numbers and texts come back to the bit", "[sweep][store]") {
  const Folder folder;
  const std::string path = folder.file("s.sqlite");
  const double third = 1.0 / 3.0, tiny = std::numeric_limits<double>::denorm_min(), big = 1.7976931348623157e308;
  std::vector<ResultRow> rows = {row(0, 0, 0.1 + 0.2, third), row(0, 1, {}, -tiny), row(7, 0, big, 123456789.123456789),
                                 row(999'999'999'999u, 999'999, 5.0, {})};
  rows[1].values = {"0.30000000000000004", "9007199254740993"};  // a double's last digit; no double at all
  rows[2].values = {"-1.5e-300", "say \"hi\", it's\nµΩ °C 磁束; DROP TABLE result"};
  rows[3].values = {"007", "inf"};  // words that look like numbers
  rows[2].status = "diverged", rows[2].message = "flux of the plant, \"Ψ\" at 0.1 s";
  rows[3].status = "refused", rows[3].message = "'a' is 1";
  {
    Store store(path, origin, columns);
    store.write({rows[3], rows[1]});
    store.write({rows[0], rows[2]});
    CHECK(store.rows() == 4);
  }
  const auto check = [&](const Store& store) {
    const std::vector<ResultRow> back = rows_of(store);
    REQUIRE(back.size() == 4);
    for (std::size_t i = 0; i < 4; ++i) {
      INFO(i);
      CHECK(same(back[i], rows[i]));
    }
    CHECK(store.columns().keys == columns.keys);
    CHECK(store.columns().figures == columns.figures);
    CHECK(store.origin().size() == origin.size());
  };
  check(Store(path));
  check(Store(path, origin, columns));
}

TEST_CASE("store: a figure that is not a number is none", "[sweep][store]") {
  const Folder folder;
  Store store(folder.file("s.sqlite"), origin, columns);
  store.write({row(0, 0, std::nan(""), std::numeric_limits<double>::infinity())});
  CHECK_FALSE(rows_of(store)[0].figures[0]);
  CHECK(rows_of(store)[0].figures[1] == std::numeric_limits<double>::infinity());
  CHECK(store.figure_count("ekf.speed_rmse_rpm") == 0);
}

TEST_CASE("store: a row written again takes the place of the first", "[sweep][store]") {
  const Folder folder;
  for (const char* runs : {"2", "1000"}) {  // looked for in two ways
    Origin of_runs = origin;
    of_runs.emplace_back("runs", runs);
    Store store(folder.file(runs), of_runs, columns);
    store.write({row(3, 0, 1.0, 1.0)});
    store.write({row(3, 0, 2.0, 1.0), row(3, 1, 3.0, 1.0), row(5, 0, 3.0, 1.0)});
    CHECK(store.rows() == 3);
    CHECK(rows_of(store)[0].figures[0] == 2.0);
    CHECK(store.rows_between(0, 0, 3) == 0);
    CHECK(store.rows_between(0, 3, 3) == 0);
    CHECK(store.rows_between(0, 3, 4) == 1);
    CHECK(store.rows_between(0, 0, 6) == 2);
    CHECK(store.rows_between(1, 0, 100) == 1);
    CHECK(store.rows_between(2, 0, 100) == 0);
  }
}

TEST_CASE("store: counts, ranks and the largest are those of a sorted list", "[sweep][store]") {
  const Folder folder;
  Store store(folder.file("s.sqlite"), origin, columns);
  std::vector<ResultRow> rows;
  for (std::uint64_t k = 0; k < 1000; ++k) {
    const auto x = static_cast<double>(k * 617 % 1000);  // 617 and 1000 share no factor: 0 .. 999, each once
    rows.push_back(row(k, 0, k % 10 == 0 ? Figure() : Figure(x), {}));
    rows.back().status = k % 10 == 0 ? "diverged" : "done";
  }
  store.write(rows);
  CHECK(store.figure_count("ekf.speed_rmse_rpm") == 900);
  CHECK(store.status_count("diverged") == 100);
  std::vector<double> left;
  for (int i = 0; i < 1000; ++i)
    if (i % 10 != 0) left.push_back(i);  // k a multiple of ten is x a multiple of ten
  const std::vector<double> at = store.at_ranks("ekf.speed_rmse_rpm", {0, 450, 899, 450});
  CHECK(at == std::vector<double>{left[0], left[450], left[899], left[450]});
  const auto worst = store.largest("ekf.speed_rmse_rpm", 3);
  REQUIRE(worst.size() == 3);
  CHECK((worst[0].figures[0] == 999.0 && worst[1].figures[0] == 998.0 && worst[2].figures[0] == 997.0));
  CHECK(store.at_ranks("drive.load_dip_rpm", {}).empty());
}

TEST_CASE("store: made from something else is refused with what changed", "[sweep][store]") {
  const Folder folder;
  const std::string path = folder.file("s.sqlite");
  { const Store store(path, origin, columns); }
  const auto with = [&](std::size_t item, const std::string& text) {
    Origin other = origin;
    other[item].second = text;
    return told<InputError>([&] { const Store store(path, other, columns); });
  };
  const std::string plan = with(1, "a = 1\nb = 3\n");
  says(plan, "another plan (line 2 was 'b = 2', is 'b = 3')");
  says(plan, "name another --store");
  says(plan, path);
  says(with(1, "a = 1\nb = 2\nc = 3\n"), "line 3 was nothing, is 'c = 3'");
  says(with(1, "a = 1\n"), "line 2 was 'b = 2', is nothing");
  says(with(2, "6"), "another --seed (line 1 was '5', is '6')");
  StoreColumns more = columns;
  more.figures.push_back("drive.recovery_s");
  says(told<InputError>([&] { const Store store(path, origin, more); }), "other columns");
}

TEST_CASE("store: an edit of plan, scenario, machine file, --set or --seed is noticed", "[sweep][store]") {
  const Folder folder;
  const std::string path = write_plan(folder, grid_text()), at = folder.file("s.sqlite");
  const auto open = [&](const std::vector<Override>& set = {}, std::optional<std::uint64_t> seed = {}) {
    const SweepPlan plan = read_plan(path, set, seed);
    const Store store(at, origin_of(plan), columns_of(plan));
  };
  open();
  open();
  const auto refused = [&](const std::vector<Override>& set = {}, std::optional<std::uint64_t> seed = {}) {
    return told<InputError>([&] { open(set, seed); });
  };
  folder.write("plan.toml", replaced(grid_text(), "1.5]", "1.6]"));
  says(refused(), "another plan (line 7 was 'values = [0.7, 1.0, 1.5]', is 'values = [0.7, 1.0, 1.6]')");
  folder.write("plan.toml", grid_text());
  folder.write("scenario.toml", replaced(scenario_text(), "seed = 5", "seed = 6"));
  says(refused(), "another scenario (line 2 was 'seed = 5', is 'seed = 6')");
  folder.write("scenario.toml", scenario_text());
  folder.write("machine.toml", replaced(machine_text(), "1.25", "1.26"));
  says(refused(), "another machine file (line 6 was 'rotor_resistance_ohm = 1.25', is 'rotor_resistance_ohm = 1.26')");
  folder.write("machine.toml", machine_text());
  says(refused({{"shaft.inertia_kgm2", "0.03"}}), "another --set (line 1 was nothing, is 'shaft.inertia_kgm2=0.03')");
  says(refused({{"plan.vary.0.values", "[0.7, 1.0, 1.6]"}}), "another --set");
  says(refused({{"plan.runs", "3"}}), "another --set");
  says(refused({}, 6), "another --seed (line 1 was 'of the scenario', is '6')");
  open();
}

TEST_CASE("store: what is no store of a sweep is refused, and left as it was", "[sweep][store]") {
  const Folder folder;
  const auto refused = [&](const std::string& path) {
    return told<InputError>([&] { const Store store(path, origin, columns); });
  };
  const std::string text = folder.write("text.sqlite", "case,run\n0,0\n" + std::string(2000, 'x'));
  says(refused(text), "no store of a sweep");
  says(told<InputError>([&] { const Store store(text); }), "no store of a sweep");
  std::ifstream back(text);
  std::string first;
  std::getline(back, first);
  CHECK(first == "case,run");
  // Killed before its tables stood: an empty file is begun anew.
  const std::string empty = folder.write("empty.sqlite", "");
  says(told<InputError>([&] { const Store store(empty); }), "no store of a sweep");
  { const Store store(empty, origin, columns); }
  CHECK(Store(empty).rows() == 0);
}

TEST_CASE("store: one that cannot be opened is an error from outside, with its path and why", "[sweep][store]") {
  const Folder folder;
  const auto failed = [&](const std::string& path) {
    const std::string text = told<OutsideError>([&] { const Store store(path, origin, columns); });
    says(text, path);
    return text;
  };
  says(failed(folder.file("no/such/folder.sqlite")), "cannot open the store");
  says(failed(folder.file("")), "cannot open the store");
  says(told<OutsideError>([&] { const Store store(folder.file("none.sqlite")); }), "cannot open the store");
  CHECK_FALSE(fs::exists(folder.file("none.sqlite")));
  if (::geteuid() == 0) {
    WARN("skipped: root may write into a read-only folder; /proc stands in for one");
    says(failed("/proc/s.sqlite"), "cannot open the store");
    return;
  }
  fs::create_directory(folder.file("closed"));
  fs::permissions(folder.file("closed"), fs::perms::owner_read | fs::perms::owner_exec);
  says(failed(folder.file("closed/s.sqlite")), "cannot open the store");
  fs::permissions(folder.file("closed"), fs::perms::owner_all);
}

TEST_CASE("store: in use elsewhere it is refused, then free again", "[sweep][store]") {
  const Folder folder;
  const std::string path = folder.file("s.sqlite");
  {
    Store first(path, origin, columns);
    first.write({row(0, 0, 1.0, 1.0)});
    says(told<OutsideError>([&] { const Store second(path, origin, columns); }), "in use by another process");
    first.write({row(1, 0, 1.0, 1.0)});
  }
  CHECK(Store(path, origin, columns).rows() == 2);
}

TEST_CASE("store: a batch that does not fit leaves nothing of itself, and the next one does", "[sweep][store]") {
  const Folder folder;
  const std::string path = folder.file("s.sqlite");
  Store store(path, origin, columns);
  std::vector<ResultRow> rows;
  for (std::uint64_t k = 0; k < 5000; ++k) rows.push_back(row(k, 0, 0.1 * static_cast<double>(k), {}));
  store.write({rows[0]});
  // The limit of the file's size stands in for a full disk; the real one is in tests/tools.
  const auto before = std::signal(SIGXFSZ, SIG_IGN);
  rlimit whole{};
  ::getrlimit(RLIMIT_FSIZE, &whole);
  rlimit small = whole;
  small.rlim_cur = 60'000;
  ::setrlimit(RLIMIT_FSIZE, &small);
  std::string text;
  try {
    store.write(rows);
  } catch (const OutsideError& e) {
    text = e.what();
  }
  ::setrlimit(RLIMIT_FSIZE, &whole);
  std::signal(SIGXFSZ, before);
  says(text,
       "cannot write to the store '" + path + "': it may not grow further (the limit of a file's size, ulimit -f)");
  says(text, "make room, and the same command goes on");
  CHECK(store.rows() == 1);
  store.write(rows);
  CHECK(store.rows() == 5000);
}
