// What the figures are drawn with: SVG elements as text, a plot frame with round ticks, colours that colour-blind readers
// tell apart. Coordinates in px, y downwards.
// Palette: M. Okabe, K. Ito, "Color Universal Design", 2008.
#pragma once

#include <array>
#include <string>
#include <string_view>
#include <vector>

namespace slipbench::svg {

inline constexpr std::array<std::string_view, 6> palette = {"#0072B2", "#D55E00", "#009E73",
                                                            "#CC79A7", "#E69F00", "#56B4E9"};
inline constexpr std::string_view ink = "#222222", soft_ink = "#5c5c5c", grid = "#e3e3e3", frame = "#9a9a9a";
// Colour of the n-th estimator; dash pattern from the seventh on ("" before).
std::string_view colour(std::size_t n);
std::string_view dash(std::size_t n);

std::string escaped(std::string_view text);
std::string px(double value);  // one decimal, no trailing zero
// Width of words, generously: no font is known here. `fitted` cuts words that would be wider, and says so by an ellipsis.
double width_px(std::string_view words, double size, bool bold = false);
std::string fitted(std::string_view words, double room_px, double size, bool bold = false);

std::string document(double width, double height, const std::string& title, const std::string& body);
struct TextStyle {
  double size = 12.0;
  std::string_view anchor = "start", fill = ink;
  bool bold = false;
};
std::string text(double x, double y, std::string_view words, const TextStyle& style = {});
std::string upright_text(double x, double y, std::string_view words,
                         const TextStyle& style = {});  // read from the right
std::string line(double x1, double y1, double x2, double y2, std::string_view stroke, double width = 1.0,
                 std::string_view dashes = "");
std::string rectangle(double x, double y, double width, double height, std::string_view fill, double opacity = 1.0);
std::string circle(double x, double y, double radius, std::string_view fill, double opacity = 1.0);

// Round values (1, 2, 5 times a power of ten) within [low, high], about `wanted` of them.
struct Ticks {
  std::vector<double> values;
  double step = 1.0;
  [[nodiscard]] std::string label(double value) const;
};
Ticks ticks(double low, double high, int wanted);

// A stretch of values laid onto a stretch of px.
struct Axis {
  double low = 0.0, high = 1.0, from_px = 0.0, to_px = 1.0;
  [[nodiscard]] double at(double value) const { return from_px + (value - low) / (high - low) * (to_px - from_px); }
};

}  // namespace slipbench::svg
