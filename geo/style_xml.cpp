// SPDX-License-Identifier: Apache-2.0
#include "base/text.hpp"
#include "layers_write.hpp"
#include "style.hpp"

namespace rillstrand::geo {

namespace {
using writing::joined;
using writing::xml;

constexpr double mm_per_px = 0.28; // the standard pixel of OGC 05-077r4
constexpr const char* edge_colour = "#303030";

bool is_line(const LayerStyle& style) {
    return style.geometry == GeometryKind::line_string_z;
}

std::string parameter(const char* name, const std::string& value) {
    return std::string{"<se:SvgParameter name=\""} + name + "\">" + value + "</se:SvgParameter>";
}

std::string sld_symbol(const LayerStyle& style, const StyleRule& rule) {
    if (is_line(style))
        return "<se:LineSymbolizer><se:Stroke>" + parameter("stroke", hex(rule.colour)) +
               parameter("stroke-width", text::number(rule.size_px)) +
               parameter("stroke-linecap", "round") + "</se:Stroke></se:LineSymbolizer>\n";
    std::string mark = "<se:WellKnownName>circle</se:WellKnownName><se:Fill>" +
                       parameter("fill", hex(rule.colour)) +
                       parameter("fill-opacity", text::number(rule.opacity)) + "</se:Fill>";
    if (rule.outline)
        mark += "<se:Stroke>" + parameter("stroke", edge_colour) +
                parameter("stroke-width", "0.5") + "</se:Stroke>";
    return "<se:PointSymbolizer><se:Graphic><se:Mark>" + mark + "</se:Mark><se:Size>" +
           text::number(rule.size_px) + "</se:Size></se:Graphic></se:PointSymbolizer>\n";
}

std::string comparison(const char* test, const StyleRule& rule, const std::string& value) {
    return std::string{"<ogc:"} + test + "><ogc:PropertyName>" + xml(rule.column) +
           "</ogc:PropertyName><ogc:Literal>" + xml(value) + "</ogc:Literal></ogc:" + test + ">";
}

std::string sld_filter(const StyleRule& rule) {
    switch (rule.test) {
    case StyleRule::Test::all:
        return {};
    case StyleRule::Test::otherwise:
        return "<se:ElseFilter/>";
    case StyleRule::Test::equal:
        return "<ogc:Filter>" + comparison("PropertyIsEqualTo", rule, rule.value) + "</ogc:Filter>";
    case StyleRule::Test::range:
        return "<ogc:Filter><ogc:And>" +
               comparison("PropertyIsGreaterThanOrEqualTo", rule, text::number(rule.from)) +
               comparison(rule.closed ? "PropertyIsLessThanOrEqualTo" : "PropertyIsLessThan", rule,
                          text::number(rule.to)) +
               "</ogc:And></ogc:Filter>";
    }
    return {};
}

std::string sld_rules(const LayerStyle& style, const std::vector<StyleRule>& rules) {
    if (rules.empty())
        return {};
    std::string text = "<se:FeatureTypeStyle>\n";
    for (std::size_t i = 0; i < rules.size(); ++i)
        text += "<se:Rule><se:Name>class " + std::to_string(i + 1) +
                "</se:Name><se:Description><se:Title>" + xml(rules[i].label) +
                "</se:Title></se:Description>" + sld_filter(rules[i]) +
                sld_symbol(style, rules[i]) + "</se:Rule>\n";
    return text + "</se:FeatureTypeStyle>\n";
}

std::string quoted(const std::string& text, char quote) {
    std::string result(1, quote);
    for (const char c : text) {
        if (c == quote || (c == '\\' && quote == '\''))
            result += c;
        result += c;
    }
    return result + quote;
}

std::string qml_filter(const StyleRule& rule) {
    const std::string column = quoted(rule.column, '"');
    switch (rule.test) {
    case StyleRule::Test::all:
        return {};
    case StyleRule::Test::otherwise:
        return "ELSE";
    case StyleRule::Test::equal:
        return column + " = " + (rule.is_boolean ? rule.value : quoted(rule.value, '\''));
    case StyleRule::Test::range:
        return column + " >= " + text::number(rule.from) + " AND " + column +
               (rule.closed ? " <= " : " < ") + text::number(rule.to);
    }
    return {};
}

std::string qml_colour(Rgb colour) {
    return std::to_string(colour.r) + ',' + std::to_string(colour.g) + ',' +
           std::to_string(colour.b) + ",255";
}

/// ` name="value"`.
std::string attribute(const char* name, const std::string& value) {
    return joined({" ", name, "=\"", xml(value), "\""});
}

std::string property(const char* key, const std::string& value) {
    return std::string{"<prop k=\""} + key + "\" v=\"" + xml(value) + "\"/>";
}

std::string qml_symbol(const LayerStyle& style, const StyleRule& rule, std::size_t number) {
    const bool line = is_line(style);
    std::string text = joined(
        {"<symbol", attribute("type", line ? "line" : "marker"),
         attribute("name", std::to_string(number)), attribute("alpha", text::number(rule.opacity)),
         attribute("clip_to_extent", "1"), attribute("force_rhr", "0"), "><layer",
         attribute("class", line ? "SimpleLine" : "SimpleMarker"), attribute("enabled", "1"),
         attribute("locked", "0"), attribute("pass", rule.outline ? "1" : "0"), ">"});
    const std::string size = text::fixed(rule.size_px * mm_per_px, 2);
    if (line) {
        text += property("line_color", qml_colour(rule.colour)) + property("line_width", size) +
                property("line_width_unit", "MM") + property("capstyle", "round") +
                property("joinstyle", "round") + property("line_style", "solid");
    } else {
        text += property("name", "circle") + property("color", qml_colour(rule.colour)) +
                property("size", size) + property("size_unit", "MM") +
                property("outline_color", "48,48,48,255") + property("outline_width", "0.14") +
                property("outline_width_unit", "MM") +
                property("outline_style", rule.outline ? "solid" : "no");
    }
    return text + "</layer></symbol>\n";
}

std::string qml_time(const LayerStyle& style) {
    if (style.time_by.empty())
        return {};
    return joined({"<temporal", attribute("enabled", "1"), attribute("mode", "1"),
                   attribute("startField", style.time_by), attribute("endField", ""),
                   attribute("durationField", ""),
                   attribute("durationUnit", style.time_is_date ? "d" : "min"),
                   attribute("fixedDuration", style.time_is_date ? "1" : "0"),
                   attribute("accumulate", "0"), attribute("startExpression", ""),
                   attribute("endExpression", ""), attribute("limitMode", "0"),
                   "><fixedRange><start></start><end></end></fixedRange></temporal>\n"});
}
} // namespace

std::string to_sld(const LayerStyle& style) {
    const std::string title = style.title.empty() ? style.layer : style.title;
    return "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n"
           "<StyledLayerDescriptor version=\"1.1.0\" xmlns=\"http://www.opengis.net/sld\" "
           "xmlns:se=\"http://www.opengis.net/se\" xmlns:ogc=\"http://www.opengis.net/ogc\" "
           "xmlns:xlink=\"http://www.w3.org/1999/xlink\" "
           "xmlns:xsi=\"http://www.w3.org/2001/XMLSchema-instance\" "
           "xsi:schemaLocation=\"http://www.opengis.net/sld "
           "http://schemas.opengis.net/sld/1.1.0/StyledLayerDescriptor.xsd\">\n"
           "<NamedLayer><se:Name>" +
           xml(style.layer) + "</se:Name><UserStyle><se:Name>" + xml(style.layer) +
           "</se:Name><se:Description><se:Title>" + xml(title) + "</se:Title></se:Description>\n" +
           sld_rules(style, style.halos) + sld_rules(style, style.classes) +
           "</UserStyle></NamedLayer>\n</StyledLayerDescriptor>\n";
}

std::string to_qml(const LayerStyle& style) {
    std::vector<StyleRule> rules = style.halos;
    rules.insert(rules.end(), style.classes.begin(), style.classes.end());
    std::string rule_list, symbols;
    for (std::size_t i = 0; i < rules.size(); ++i) {
        const std::string number = std::to_string(i);
        const std::string filter = qml_filter(rules[i]);
        // Halos stand in a group of their own, so that 'otherwise' looks at the classes alone.
        if (i == 0 && !style.halos.empty())
            rule_list += "<rule key=\"halos\" label=\"uncertainty\">\n";
        rule_list +=
            joined({"<rule", attribute("key", "rule" + number), attribute("symbol", number),
                    filter.empty() ? "" : attribute("filter", filter),
                    attribute("label", rules[i].label), "/>\n"});
        if (i + 1 == style.halos.size())
            rule_list += "</rule>\n<rule key=\"classes\">\n";
        symbols += qml_symbol(style, rules[i], i);
    }
    if (!style.halos.empty())
        rule_list += "</rule>\n";
    return "<!DOCTYPE qgis PUBLIC 'http://mrcc.com/qgis.dtd' 'SYSTEM'>\n"
           "<qgis version=\"3.22.0\" styleCategories=\"Symbology|Temporal\">\n" +
           qml_time(style) +
           "<renderer-v2 type=\"RuleRenderer\" symbollevels=\"1\" forceraster=\"0\" "
           "enableorderby=\"0\">\n<rules key=\"root\">\n" +
           rule_list + "</rules>\n<symbols>\n" + symbols + "</symbols>\n</renderer-v2>\n</qgis>\n";
}

} // namespace rillstrand::geo
