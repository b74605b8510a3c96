// JSON Schema of state-space files. Shapes that must fit each other, and conjugate poles, are for `check FILE` alone.
#include "sim/scenario/matrix_node.hpp"
#include "sim/scenario/system_design.hpp"
#include "tools/slipbench/keys_json.hpp"
#include "tools/slipbench/keys_out.hpp"

namespace slipbench {

namespace {

Json words(std::span<const std::string_view> all) {
  Json list = Json::array();
  for (const std::string_view word : all) list.push_back(word);
  return list;
}

Json element() { return {{"type", "number"}, {"minimum", -largest_element}, {"maximum", largest_element}}; }

Json list_of(Json items) { return {{"type", "array"}, {"maxItems", largest_order}, {"items", std::move(items)}}; }

Json names() {
  Json list = list_of({{"type", "string"}, {"minLength", 1}, {"maxLength", 60}});
  list["uniqueItems"] = true;
  return list;
}

Json value_of(DesignKey::Holds holds) {
  switch (holds) {
    case DesignKey::Holds::kind:
      return {{"enum", words(design_kinds())}};
    case DesignKey::Holds::rule:
      return {{"enum", words(pi_rules())}};
    case DesignKey::Holds::matrix:
      return list_of(list_of(element()));
    case DesignKey::Holds::poles:
      return list_of(
          {{"anyOf", {element(), {{"type", "array"}, {"minItems", 2}, {"maxItems", 2}, {"items", element()}}}}});
    case DesignKey::Holds::names:
      return names();
    case DesignKey::Holds::number:
      return element();
    case DesignKey::Holds::positive:
      return {{"type", "number"}, {"exclusiveMinimum", 0.0}, {"maximum", 1e9}};
  }
  return true;
}

Json described(Json schema, std::string_view meaning) {
  schema["description"] = meaning;
  return schema;
}

Json system_table() {
  Json schema = {{"description", "x' = A x + B u, y = C x + D u"}, {"type", "object"}, {"additionalProperties", false}};
  const auto add = [&](const char* name, Json value, const char* meaning) {
    schema["properties"][name] = described(std::move(value), meaning);
  };
  const Json matrix = list_of(list_of(element()));
  add("A", matrix, "square, a list of rows");
  add("B", matrix, "a row a state, a column an input");
  add("C", matrix, "a row an output, a column a state");
  add("D", matrix, "feedthrough; default: none");
  add("E", matrix, "descriptor form, E x' = A x + B u: rows of zeros are algebraic");
  add("sample_period_s", {{"type", "number"}, {"exclusiveMinimum", 0.0}, {"maximum", 1e6}},
      "present: discrete time (s)");
  add("states", names(), "names of the states; default: x1, x2, ...");
  add("inputs", names(), "names of the inputs; default: u1, u2, ...");
  add("outputs", names(), "names of the outputs; default: y1, y2, ...");
  schema["required"] = Json::array({"A"});
  return schema;
}

Json design_table() {
  Json schema = {{"description", "what `design` is asked for"}, {"type", "object"}, {"additionalProperties", false}};
  for (const DesignKey& key : design_keys())
    schema["properties"][std::string(key.name)] = described(value_of(key.holds), key.meaning);
  schema["required"] = Json::array({"kind"});
  for (const std::string_view kind : design_kinds()) {
    Json foreign = Json::object();
    for (const DesignKey& key : design_keys()) {
      if (!key.goes_with(kind)) foreign[std::string(key.name)] = false;
    }
    Json rule = Json::object();
    rule["if"]["properties"]["kind"]["const"] = kind;
    rule["if"]["required"] = Json::array({"kind"});
    rule["then"]["properties"] = foreign;
    schema["allOf"].push_back(std::move(rule));
  }
  return schema;
}

}  // namespace

std::string system_schema() {
  Json schema = {{"$schema", "http://json-schema.org/draft-07/schema#"},
                 {"title", "slipbench state-space system"},
                 {"description", "A linear plant and a design for it. `slipbench check FILE` knows more."},
                 {"type", "object"},
                 {"additionalProperties", false},
                 {"required", Json::array({"system"})}};
  schema["properties"] = {{"format", {{"const", 1}}},
                          {"title", {{"type", "string"}}},
                          {"source", {{"type", "string"}}},
                          {"system", system_table()},
                          {"design", design_table()}};
  return json_text(schema);
}

}  // namespace slipbench
