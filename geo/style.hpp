// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "layers.hpp"

#include <cstddef>
#include <cstdint>
#include <optional>
#include <string>
#include <vector>

/// Colours, classes and the style files that travel with the layers.
namespace rillstrand::geo {

struct Rgb {
    std::uint8_t r = 0, g = 0, b = 0;
    friend bool operator==(Rgb, Rgb) = default;
};

/// `#rrggbb`.
std::string hex(Rgb colour);

/// A colour of the CIE 1976 L*a*b* space (white point D65) in sRGB, clipped to what a screen shows.
/// Source: CIE 15:2004; IEC 61966-2-1:1999.
Rgb rgb_from_lab(double lightness, double a, double b);

/// Colours that run from dark blue over grey to light yellow on a straight line in CIE L*a*b*:
/// even steps to the eye, and told apart with red-green blindness, since lightness and the
/// blue-yellow axis alone change.
/// @param count  at least 1
std::vector<Rgb> sequential_colours(int count);

/// Colours from blue over near-white to orange, on two straight lines in CIE L*a*b*; an odd count
/// has the near-white in its middle.
std::vector<Rgb> diverging_colours(int count);

/// Up to eight colours for names, then again from the first one.
/// Source: Okabe & Ito (2002), Color Universal Design.
std::vector<Rgb> categorical_colours(int count);

/// Limits of classes that follow the data, count + 1 of them at most, rising; the first and last
/// are the data's extremes. Round limits of even width where these fill the classes (none holds
/// over half of the values), else quantiles. Diverging: symmetric about zero. NaN are left out; no
/// values: empty; one value: that value twice.
std::vector<double> class_limits(std::vector<double> values, int count, bool diverging);

/// One symbol and which rows get it.
struct StyleRule {
    enum class Test { all, range, equal, otherwise }; ///< otherwise: no other rule holds
    Test test = Test::all;
    std::string column;
    double from = 0.0, to = 0.0; ///< range: from <= value < to
    bool closed = false;         ///< range: value <= to (the last class)
    std::string value;           ///< equal; of booleans `true` or `false`
    bool is_boolean = false;
    std::string label; ///< for the legend
    Rgb colour;
    double opacity = 1.0;
    double size_px = 7.0; ///< of a point's circle; width of a line
    bool outline = true;  ///< a thin dark edge
};

/// How a layer is drawn: halos (uncertainty) lie under the classes of colour.
struct LayerStyle {
    std::string layer;
    std::string title;
    GeometryKind geometry = GeometryKind::none;
    std::vector<StyleRule> halos;
    std::vector<StyleRule> classes;
    std::string time_by; ///< date or time column for a temporal player
    bool time_is_date = false;
};

/// What a layer of this name is best coloured by, as far as its columns allow; anything that
/// `layer.look` names stands.
Look complete_look(const Layer& layer);
/// The same for a table whose rows have geometries elsewhere.
Look complete_look(const Table& table, Look look);

/// The style of a layer. No colours to be told from the data (no such column, all missing): one
/// plain symbol.
LayerStyle make_style(const Layer& layer);
/// The same for a table whose rows have geometries elsewhere.
LayerStyle make_style(const Table& table, GeometryKind geometry, const Look& look);

/// The class of colour that a row falls into, if any.
std::optional<std::size_t> matching_class(const LayerStyle& style, const Table& table,
                                          std::size_t row);

/// OGC Styled Layer Descriptor 1.1.0 (OGC 05-078r4) with Symbology Encoding 1.1.0 (05-077r4).
std::string to_sld(const LayerStyle& style);

/// The same rules in the XML form that QGIS stores beside layers (column styleQML of
/// layer_styles), so that it draws them without being asked.
std::string to_qml(const LayerStyle& style);

} // namespace rillstrand::geo
