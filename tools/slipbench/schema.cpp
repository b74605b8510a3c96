// Schemas: a section becomes an object; what depends on the word of its selector stands in one if/then a word, which gives
// clearer messages than one alternative a word.
#include <algorithm>

#include "tools/slipbench/keys_json.hpp"
#include "tools/slipbench/keys_out.hpp"

namespace slipbench {

namespace {

constexpr std::string_view draft = "http://json-schema.org/draft-07/schema#";
constexpr int longest_list = 256;  // tables, as the reader takes them

Json number_schema(const Key& key, const char* type) {
  Json schema = {{"type", type}};
  if (key.range.low > -unlimited) schema[key.range.open ? "exclusiveMinimum" : "minimum"] = bound_json(key.range.low);
  if (key.range.high < unlimited) schema["maximum"] = bound_json(key.range.high);
  return schema;
}

Json some(Json items) { return {{"type", "array"}, {"minItems", 1}, {"items", std::move(items)}}; }

Json value_schema(const KeyReference& row) {
  const Key& key = *row.key;
  switch (row.holds) {
    case Holds::number:
      return number_schema(key, "number");
    case Holds::whole:
      return number_schema(key, "integer");
    case Holds::truth:
      // A method's choice may be given as 0 or 1 too.
      if (std::holds_alternative<MethodSetting>(key.slot)) return {{"enum", Json::array({false, true, 0, 1})}};
      return {{"type", "boolean"}};
    case Holds::text:
      return key.words.empty() ? Json{{"type", "string"}} : Json{{"type", "string"}, {"enum", key.words}};
    case Holds::knots:
      return {{"type", "array"},
              {"minItems", 1},
              {"items",
               {{"type", "array"},
                {"minItems", 2},
                {"maxItems", 2},
                {"items", Json::array({Json{{"type", "number"}}, number_schema(key, "number")})}}}};
    case Holds::triple:
      return {{"type", "array"}, {"minItems", 3}, {"maxItems", 3}, {"items", number_schema(key, "number")}};
    case Holds::list:
      return some(number_schema(key, "number"));
    case Holds::matrices:
      return some(some(some(number_schema(key, "number"))));
  }
  return true;
}

Json key_schema(const KeyReference& row) {
  const Key& key = *row.key;
  std::string description(key.meaning);
  if (description.ends_with('.')) description.pop_back();
  if (!key.unit.empty()) description += " (" + std::string(key.unit) + ")";
  if (!key.otherwise.empty()) description += "; default: " + std::string(key.otherwise);
  Json schema = {{"description", description}};
  schema.update(value_schema(row));
  if (!std::holds_alternative<std::monostate>(row.fallback)) schema["default"] = default_json(row.fallback);
  return schema;
}

bool belongs(const Key& key, std::string_view word) {
  return key.when.empty() || std::count(key.when.begin(), key.when.end(), word) > 0;
}

Json required_names(std::vector<std::string_view> names) { return {{"required", std::move(names)}}; }

// `required` of the section, unless a file may give the rest; then only where none is named.
void require(Json& schema, const Json& names, std::string_view rest_from) {
  if (names.empty()) return;
  if (rest_from.empty()) {
    schema["required"] = names;
  } else {
    schema["if"] = required_names({rest_from});
    schema["else"] = Json{{"required", names}};
  }
}

// What holds with one word of the selector: keys of other words are refused, keys of several kinds get their own form.
Json word_rule(const SectionReference& rows, std::string_view word, bool is_default, std::string_view rest_from) {
  const std::string selector(rows.section->selector);
  Json condition = {{"properties", {{selector, {{"const", word}}}}}};
  if (!is_default) {
    condition["required"] = Json::array({selector});
  } else if (!rest_from.empty()) {  // the file may choose another word
    condition["anyOf"] = Json::array({required_names({selector}), Json{{"not", required_names({rest_from})}}});
  }
  Json then = Json::object(), properties = Json::object(), required = Json::array();
  for (const KeyReference& row : rows.keys) {
    const Key& key = *row.key;
    if (key.when.empty()) continue;
    const std::string name(key.name());
    if (belongs(key, word)) {
      properties[name] = key_schema(row);
      if (key.need == Need::required) required.push_back(name);
    } else if (!properties.contains(name)) {
      properties[name] = false;
    }
  }
  // Where a key has one form only, the section itself describes it.
  for (const KeyReference& row : rows.keys) {
    const std::string name(row.key->name());
    const auto forms = std::count_if(rows.keys.begin(), rows.keys.end(),
                                     [&](const KeyReference& other) { return other.key->path == row.key->path; });
    if (forms == 1 && properties.contains(name) && properties[name] != false) properties.erase(name);
  }
  if (!properties.empty()) then["properties"] = properties;
  require(then, required, rest_from);
  return then.empty() ? then : Json{{"if", condition}, {"then", then}};
}

Json section_schema(const SectionReference& rows, std::string_view rest_from) {
  const Section& section = *rows.section;
  Json schema = {{"description", section.meaning}, {"type", "object"}, {"additionalProperties", false}};
  Json properties = Json::object(), required = Json::array(), rules = Json::array();
  for (const KeyReference& row : rows.keys) {
    const std::string name(row.key->name());
    if (name == section.rest_from && rest_from.empty()) continue;  // this file names no other
    properties[name] = properties.contains(name) ? Json(true) : key_schema(row);
    if (row.key->need == Need::required && row.key->when.empty()) required.push_back(name);
  }
  for (const KeyReference& row : rows.keys) {
    if (section.selector.empty() || row.key->name() != section.selector) continue;
    const std::string* fallback = std::get_if<std::string>(&row.fallback);
    for (const std::string_view word : row.key->words) {
      Json rule = word_rule(rows, word, fallback != nullptr && *fallback == word, rest_from);
      if (!rule.empty()) rules.push_back(std::move(rule));
    }
  }
  schema["properties"] = std::move(properties);
  require(schema, required, rest_from);
  if (!rules.empty()) schema["allOf"] = std::move(rules);
  return schema;
}

// The section at `path` with all that lies below it.
Json tree_schema(const std::vector<SectionReference>& sections, std::string_view path) {
  Json schema;
  for (const SectionReference& rows : sections) {
    if (rows.section->path == path) schema = section_schema(rows, rows.section->rest_from);
  }
  for (const SectionReference& rows : sections) {
    std::string name(rows.section->path);
    const bool list = rows.section->is_list();
    if (list) name.resize(name.size() - 2);
    const std::size_t dot = name.rfind('.');
    const std::string parent = dot == std::string::npos ? "" : name.substr(0, dot);
    if (name.empty() || parent != path) continue;
    Json below = tree_schema(sections, rows.section->path);
    name = name.substr(dot == std::string::npos ? 0 : dot + 1);
    schema["properties"][name] =
        list ? Json{{"type", "array"}, {"maxItems", longest_list}, {"items", std::move(below)}} : std::move(below);
    if (rows.section->need == Need::required) schema["required"].push_back(name);
  }
  return schema;
}

Json headed(const std::string& title, const std::string& description, const Json& schema) {
  Json document = {{"$schema", draft}, {"title", title}, {"description", description}};
  Json rest = schema;
  rest.erase("description");
  document.update(rest);
  return document;
}

}  // namespace

std::string scenario_schema() {
  return json_text(headed("slipbench scenario", "A drive and what is asked of it. `slipbench check FILE` knows more.",
                          tree_schema(scenario_reference(), "")));
}

std::string machine_schema() {
  Json schema = {{"type", "object"}, {"additionalProperties", false}, {"required", Json::array({"machine"})}};
  for (const std::string_view head : machine_file_heads) schema["properties"][std::string(head)] = {{"type", "string"}};
  for (const SectionReference& rows : scenario_reference()) {
    if (rows.section->path == "machine") schema["properties"]["machine"] = section_schema(rows, "");
    if (!rows.section->path.empty()) continue;
    for (const KeyReference& row : rows.keys) {
      const std::string name(row.key->name());
      if (schema["properties"].contains(name)) schema["properties"][name] = key_schema(row);
    }
  }
  return json_text(
      headed("slipbench machine", "Equivalent circuit and nameplate. `slipbench check FILE` knows more.", schema));
}

}  // namespace slipbench
