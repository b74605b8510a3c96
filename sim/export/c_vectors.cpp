// Test vectors: stretches of the run, spread over it, with the state before and after each; and the program that replays them.
#include <fmt/format.h>

#include <algorithm>

#include "sim/export/c_files.hpp"

namespace slipbench {

namespace {

constexpr std::size_t stretches_wanted = 20, ticks_wanted = 50;

template <class S>
std::string row(const std::vector<S>& numbers) {
  std::vector<std::string> words;
  for (std::size_t i = 0; i < numbers.size(); ++i)
    words.push_back(c_literal(numbers[i]) + (i + 1 < numbers.size() ? "," : ""));
  const std::string lines = wrapped(words, "      ");
  return "    {" + lines.substr(6, lines.size() - 7) + "},\n";
}

template <class S>
std::vector<S> chosen(const std::vector<S>& all, const std::vector<std::size_t>& which) {
  std::vector<S> some;
  for (const std::size_t i : which) some.push_back(all[i]);
  return some;
}

}  // namespace

template <class S>
std::string vectors_text(ExportedPart& part, RecordedStep<S>& step, const DoorTraffic& traffic, const ExportOrigin& o) {
  const std::size_t ticks = traffic.ticks();
  part.ticks = std::min(ticks_wanted, ticks);
  part.stretches = part.ticks == 0 ? 0 : std::min(stretches_wanted, ticks / part.ticks);
  const auto first_tick = [&](std::size_t stretch) {
    return part.stretches < 2 ? 0 : stretch * (ticks - part.ticks) / (part.stretches - 1);
  };

  std::string starts, ends, in, out;
  std::size_t stretch = 0;
  for (std::size_t k = 0; k < ticks && stretch < part.stretches; ++k) {
    const std::size_t first = first_tick(stretch);
    if (k == first) {
      starts += row(chosen(step.replay->state(), step.kept));
      in += fmt::format("  {{ /* from tick {} */\n", first);
      out += fmt::format("  {{ /* from tick {} */\n", first);
    }
    const std::vector<S> all = step.replay->step(traffic.seen(k));
    const std::vector<S> answer = chosen(all, step.answered);
    for (std::size_t i = 0; i < answer.size(); ++i) {
      if (answer[i] - answer[i] != S(0))
        throw UnfitForExport(fmt::format("'{}' answered what is no number ({}) at tick {}: not fit for a board", o.name,
                                         step.out[i].member, k));
    }
    if (k < first) continue;
    std::vector<S> seen;
    for (std::size_t i = 0; i < step.in.size(); ++i)
      seen.push_back(step.in_read[i] ? static_cast<S>(traffic.seen(k)[i]) : S(0));
    in += row(seen), out += row(answer);
    if (k + 1 == first + part.ticks) {
      ends += row(chosen(step.replay->state(), step.kept));
      in += "  },\n", out += "  },\n", ++stretch;
    }
  }

  const std::string n = o.name, in_type = n + "_" + std::string(step.in_name),
                    out_type = n + "_" + std::string(step.out_name);
  std::string text = fmt::format(
      "/* Test vectors of {0}, for {0}_replay.c: {1} stretches of {2} ticks, spread over the run of {3}.\n"
      " * Each begins with the state that the simulated step had there; the first is that of {0}_init. To the bit. */\n"
      "#include \"{0}.h\"\n\n",
      n, part.stretches, part.ticks, o.scenario);
  text += fmt::format("#define VECTORS_OF \"{0}\"\n#define VECTORS_INIT {0}_init\n#define VECTORS_STEP {0}_step\n", n);
  text += fmt::format("#define VECTORS_STRETCHES {}\n#define VECTORS_TICKS {}\n", part.stretches, part.ticks);
  text += fmt::format(
      "typedef {} vectors_number;\ntypedef {}_state vectors_state;\ntypedef {} vectors_in;\ntypedef {} "
      "vectors_out;\n\n",
      c_type<S>(), n, in_type, out_type);
  const auto names = [](const auto& all, auto name_of) {
    std::vector<std::string> words;
    for (const auto& one : all) words.push_back("\"" + std::string(name_of(one)) + "\",");
    return wrapped(words, "    ");
  };
  text += "static const char *const vectors_state_names[] = {\n" + names(step.state, [](const auto& s) { return s; }) +
          "};\n";
  text += "static const char *const vectors_out_names[] = {\n" +
          names(step.out, [](const auto& f) { return f.member; }) + "};\n\n";
  text += "static const vectors_state vectors_starts[VECTORS_STRETCHES] = {\n" + starts + "};\n";
  text += "static const vectors_state vectors_ends[VECTORS_STRETCHES] = {\n" + ends + "};\n";
  text += "static const vectors_in vectors_seen[VECTORS_STRETCHES][VECTORS_TICKS] = {\n" + in + "};\n";
  text += "static const vectors_out vectors_expected[VECTORS_STRETCHES][VECTORS_TICKS] = {\n" + out + "};\n";
  return text;
}

std::string replay_text(const ExportOrigin& o) {
  constexpr const char* text = R"(/* Replays the test vectors of NAME and compares every answer and state to the bit.
 * Exit status: 0 all alike, 1 something differs (the first difference is printed).
 *   cc -std=c99 -O2 -ffp-contract=off -fno-math-errno NAME.c NAME_replay.c -o NAME_replay && ./NAME_replay */
)"
                               "#include \"NAME_vectors.h\"\n"
                               R"(
#include <stdio.h>
#include <string.h>

/* Structs of one number type have no padding: number i of one is that of the other. */
static int same(const void *got, const void *expected, unsigned count, const char *const *names, const char *where,
                unsigned stretch, unsigned tick) {
  const unsigned char *a = (const unsigned char *)got;
  const unsigned char *b = (const unsigned char *)expected;
  unsigned i;
  for (i = 0; i < count; ++i) {
    vectors_number x, y;
    memcpy(&x, a + i * sizeof x, sizeof x);
    memcpy(&y, b + i * sizeof y, sizeof y);
    if (memcmp(a + i * sizeof x, b + i * sizeof y, sizeof x) != 0) {
      printf("%s: stretch %u, tick %u: %s.%s is %a, expected %a\n", VECTORS_OF, stretch, tick, where, names[i], (double)x,
             (double)y);
      return 0;
    }
  }
  return 1;
}

int main(void) {
  const unsigned state_count = (unsigned)(sizeof(vectors_state) / sizeof(vectors_number));
  const unsigned out_count = (unsigned)(sizeof(vectors_out) / sizeof(vectors_number));
  unsigned stretch, tick;
  vectors_state state;
  VECTORS_INIT(&state);
  if (!same(&state, &vectors_starts[0], state_count, vectors_state_names, "first state", 0, 0)) return 1;
  for (stretch = 0; stretch < VECTORS_STRETCHES; ++stretch) {
    state = vectors_starts[stretch];
    for (tick = 0; tick < VECTORS_TICKS; ++tick) {
      vectors_out out;
      VECTORS_STEP(&state, &vectors_seen[stretch][tick], &out);
      if (!same(&out, &vectors_expected[stretch][tick], out_count, vectors_out_names, "answer", stretch, tick)) return 1;
    }
    if (!same(&state, &vectors_ends[stretch], state_count, vectors_state_names, "state", stretch, tick)) return 1;
  }
  printf("%s: %d stretches of %d ticks, every answer and state alike to the bit\n", VECTORS_OF, VECTORS_STRETCHES,
         VECTORS_TICKS);
  return 0;
}
)";
  std::string replaced = text;
  for (std::size_t at = 0; (at = replaced.find("NAME", at)) != std::string::npos; at += o.name.size())
    replaced.replace(at, 4, o.name);
  return replaced;
}

template std::string vectors_text(ExportedPart&, RecordedStep<float>&, const DoorTraffic&, const ExportOrigin&);
template std::string vectors_text(ExportedPart&, RecordedStep<double>&, const DoorTraffic&, const ExportOrigin&);

}  // namespace slipbench
