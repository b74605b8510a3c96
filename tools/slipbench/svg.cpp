#include "tools/slipbench/svg.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace slipbench::svg {

std::string_view colour(std::size_t n) { return palette[n % palette.size()]; }
std::string_view dash(std::size_t n) { return n < palette.size() ? "" : n < 2 * palette.size() ? "6 2" : "2 2"; }

std::string escaped(std::string_view text) {
  std::string out;
  for (const char c : text) {
    switch (c) {
      case '&':
        out += "&amp;";
        break;
      case '<':
        out += "&lt;";
        break;
      case '>':
        out += "&gt;";
        break;
      case '"':
        out += "&quot;";
        break;
      default:
        out += static_cast<unsigned char>(c) < 0x20 || c == 0x7f ? ' ' : c;  // XML has no control characters
    }
  }
  return out;
}

std::string px(double value) {
  std::string text = fmt::format("{:.1f}", std::round(value * 10.0) / 10.0 + 0.0);
  if (text.ends_with(".0")) text.resize(text.size() - 2);
  return text == "-0" ? "0" : text;
}

double width_px(std::string_view words, double size, bool bold) {
  const auto signs = std::count_if(words.begin(), words.end(),
                                   [](char c) { return (static_cast<unsigned char>(c) & 0xC0u) != 0x80u; });
  return (bold ? 0.67 : 0.62) * size * static_cast<double>(signs);  // mean of Latin text in the widest of our fonts
}

std::string fitted(std::string_view words, double room_px, double size, bool bold) {
  if (width_px(words, size, bold) <= room_px) return std::string(words);
  std::string kept(words);
  while (!kept.empty() && width_px(kept, size, bold) + size > room_px) {
    while (!kept.empty() && (static_cast<unsigned char>(kept.back()) & 0xC0u) == 0x80u) kept.pop_back();
    if (!kept.empty()) kept.pop_back();
  }
  return kept + "…";
}

std::string document(double width, double height, const std::string& title, const std::string& body) {
  return fmt::format(
      "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n"
      "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{0}\" height=\"{1}\" viewBox=\"0 0 {0} {1}\" "
      "font-family=\"'DejaVu Sans', 'Helvetica Neue', Arial, sans-serif\" "
      "role=\"img\">\n<title>{2}</title>\n{3}{4}</svg>\n",
      px(width), px(height), escaped(title), rectangle(0, 0, width, height, "#ffffff"), body);
}

std::string text(double x, double y, std::string_view words, const TextStyle& style) {
  return fmt::format("<text x=\"{}\" y=\"{}\" font-size=\"{}\" fill=\"{}\"{}{}>{}</text>\n", px(x), px(y),
                     px(style.size), style.fill,
                     style.anchor == "start" ? "" : fmt::format(" text-anchor=\"{}\"", style.anchor),
                     style.bold ? " font-weight=\"bold\"" : "", escaped(words));
}

std::string upright_text(double x, double y, std::string_view words, const TextStyle& style) {
  return fmt::format("<g transform=\"translate({},{}) rotate(-90)\">{}</g>\n", px(x), px(y), text(0, 0, words, style));
}

std::string line(double x1, double y1, double x2, double y2, std::string_view stroke, double width,
                 std::string_view dashes) {
  return fmt::format("<line x1=\"{}\" y1=\"{}\" x2=\"{}\" y2=\"{}\" stroke=\"{}\" stroke-width=\"{}\"{}/>\n", px(x1),
                     px(y1), px(x2), px(y2), stroke, px(width),
                     dashes.empty() ? "" : fmt::format(" stroke-dasharray=\"{}\"", dashes));
}

std::string rectangle(double x, double y, double width, double height, std::string_view fill, double opacity) {
  return fmt::format("<rect x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\" fill=\"{}\"{}/>\n", px(x), px(y), px(width),
                     px(height), fill, opacity < 1.0 ? fmt::format(" fill-opacity=\"{:.2f}\"", opacity) : "");
}

std::string circle(double x, double y, double radius, std::string_view fill, double opacity) {
  return fmt::format("<circle cx=\"{}\" cy=\"{}\" r=\"{}\" fill=\"{}\"{}/>\n", px(x), px(y), px(radius), fill,
                     opacity < 1.0 ? fmt::format(" fill-opacity=\"{:.2f}\"", opacity) : "");
}

std::string Ticks::label(double value) const {
  if (std::fabs(value) < 1e-9 * step) value = 0.0;
  if (std::fabs(value) >= 1e6 || step < 1e-5) return fmt::format("{:g}", value);
  return fmt::format("{:.{}f}", value, std::max(0, static_cast<int>(-std::floor(std::log10(step) + 1e-9))));
}

Ticks ticks(double low, double high, int wanted) {
  Ticks result;
  const double rough = (high - low) / wanted, power = std::pow(10.0, std::floor(std::log10(rough)));
  const double lead = rough / power;
  result.step = power * (lead < 1.5 ? 1.0 : lead < 3.5 ? 2.0 : lead < 7.5 ? 5.0 : 10.0);
  const double first = std::ceil(low / result.step - 1e-9), last = std::floor(high / result.step + 1e-9);
  for (double n = first; n <= last && result.values.size() < 100; n += 1.0) result.values.push_back(n * result.step);
  return result;
}

}  // namespace slipbench::svg
