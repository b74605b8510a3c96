// The worst case as a scenario file of its own.
#include <filesystem>
#include <sstream>

#include "sim/scenario/overrides.hpp"
#include "sim/scenario/tree.hpp"
#include "sim/scenario/write.hpp"
#include "sim/sweep/worst_case.hpp"

namespace slipbench {

namespace {

namespace fs = std::filesystem;

// Files are named relative to the scenario's folder: now to that of the new file.
void move_files(Node& node, const std::string& from, const std::string& to) {
  if (node.kind == Node::Kind::text && node.name == "file" && !node.text.empty() && !fs::path(node.text).is_absolute())
    node.text = fs::proximate(fs::absolute(fs::path(from) / node.text), fs::absolute(to.empty() ? "." : to)).string();
  for (Node& child : node.children) move_files(child, from, to);
}

// The comment that the scenario opens with: what it shows, where its data are from.
std::string opening_comment(const std::string& text) {
  std::istringstream lines(text);
  std::string comment;
  for (std::string line; std::getline(lines, line) && line.starts_with('#');) comment += line + "\n";
  return comment;
}

}  // namespace

std::string scenario_text(const SweepPlan& plan, const WorstCase& worst, const std::string& figure,
                          const std::string& folder) {
  std::string why;
  const std::string text = read_text(plan.scenario, why).value_or("");
  Node root = parse_toml(text, plan.scenario);
  apply_overrides(root, overrides_of(plan, worst));
  if (plan.seed) apply_overrides(root, {{"seed", std::to_string(*plan.seed)}});
  move_files(root, fs::path(plan.scenario).parent_path().string(), folder);

  std::string head = "# Worst case found by `slipbench sweep " + plan.path + " --search " + figure + "` in " +
                     std::to_string(worst.runs) + " runs" + (worst.stopped ? ", interrupted" : "") + ":\n# ";
  head += worst.value ? figure + " = " + number_text(*worst.value) : "DIVERGED, " + worst.message;
  head += ", noise run 0, at\n";
  for (std::size_t j = 0; j < worst.at.size(); ++j) {
    for (const std::string& key : worst.box[j].keys)
      head += "#   " + key + " = " + number_text(worst.at[j]) + " (searched from " + number_text(worst.box[j].low) +
              " to " + number_text(worst.box[j].high) + ")\n";
  }
  if (worst.fresh_mean.mean) {
    head +=
        "# On " + std::to_string(worst.fresh.size()) + " other noise runs: mean " + short_text(*worst.fresh_mean.mean);
    if (worst.fresh_mean.low)
      head += ", 95 % interval " + short_text(*worst.fresh_mean.low) + " to " + short_text(*worst.fresh_mean.high);
    head += ".\n";
  }
  const std::string comment = opening_comment(text);
  if (!comment.empty()) head += "# Made from " + plan.scenario + ", which says:\n#\n" + comment;
  return head + toml_text(root);
}

}  // namespace slipbench
