#include "tools/slipbench/keys_json.hpp"

#include "tools/slipbench/keys_out.hpp"

namespace slipbench {

namespace {

std::string_view type_name(Holds holds) {
  switch (holds) {
    case Holds::number:
      return "number";
    case Holds::whole:
      return "whole";
    case Holds::truth:
      return "truth";
    case Holds::text:
      return "text";
    case Holds::knots:
      return "knots";
    case Holds::triple:
      return "triple";
    case Holds::list:
      return "list";
    case Holds::matrices:
      return "matrices";
  }
  return "";
}

Json text_or_null(std::string_view text) { return text.empty() ? Json(nullptr) : Json(text); }

Json key_json(const SectionReference& rows, const KeyReference& row) {
  const Key& key = *row.key;
  const bool low = key.range.low > -unlimited, high = key.range.high < unlimited;
  const bool ranged = row.holds != Holds::text && row.holds != Holds::truth;
  return {{"key", key.path},
          {"section", rows.section->path},
          {"type", type_name(row.holds)},
          {"unit", text_or_null(key.unit)},
          {"minimum", ranged && low ? bound_json(key.range.low) : Json(nullptr)},
          {"minimum_excluded", ranged && low && key.range.open},
          {"maximum", ranged && high ? bound_json(key.range.high) : Json(nullptr)},
          {"words", key.words.empty() ? Json(nullptr) : Json(key.words)},
          {"required", key.need == Need::required},
          {"default", default_json(row.fallback)},
          {"otherwise", text_or_null(key.otherwise)},
          {"when", key.when.empty() ? Json(nullptr) : Json{{std::string(rows.section->selector), key.when}}},
          {"numeric", key.numeric()},
          {"live", key.live},
          {"meaning", key.meaning}};
}

}  // namespace

std::string keys_document() {
  Json document = {{"keys", Json::array()}, {"sections", Json::array()}};
  for (const SectionReference& rows : scenario_reference()) {
    const Section& section = *rows.section;
    document["sections"].push_back({{"section", section.path},
                                    {"head", rows.head()},
                                    {"list", section.is_list()},
                                    {"required", section.need == Need::required},
                                    {"selector", text_or_null(section.selector)},
                                    {"rest_from", text_or_null(section.rest_from)},
                                    {"meaning", section.meaning}});
    for (const KeyReference& row : rows.keys) document["keys"].push_back(key_json(rows, row));
  }
  return json_text(document);
}

}  // namespace slipbench
