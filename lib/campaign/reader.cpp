// SPDX-License-Identifier: Apache-2.0
#include "campaign/reader.hpp"

#include "base/text.hpp"

#include <chrono>
#include <cmath>
#include <stdexcept>

namespace fs = std::filesystem;

namespace rillstrand::campaign {

namespace {

Where where_of(const toml::node& node) {
    const auto& begin = node.source().begin;
    return {static_cast<int>(begin.line), static_cast<int>(begin.column)};
}

std::string type_of(const toml::node& node) {
    switch (node.type()) {
    case toml::node_type::table:
        return "a table";
    case toml::node_type::array:
        return "a list";
    case toml::node_type::string:
        return "a text";
    case toml::node_type::integer:
    case toml::node_type::floating_point:
        return "a number";
    case toml::node_type::boolean:
        return "true or false";
    default:
        return "a date or time";
    }
}

std::string range_text(Range range) {
    if (std::isfinite(range.low) && std::isfinite(range.high))
        return "from " + text::number(range.low) + " to " + text::number(range.high);
    if (std::isfinite(range.low))
        return (range.open_low ? "over " : "not under ") + text::number(range.low);
    return "not over " + text::number(range.high);
}

std::optional<double> number_of(const toml::node& node) {
    if (const auto* integer = node.as_integer())
        return static_cast<double>(integer->get());
    if (const auto* real = node.as_floating_point())
        return real->get();
    return std::nullopt;
}

} // namespace

void refuse_spoilt_toml() {
    throw std::logic_error{"a key is spoilt"};
}

void Reading::problem(Where where, const std::string& what) {
    problems.add(file_name + ":" + std::to_string(where.line) + ":" + std::to_string(where.column) +
                 ": " + what);
}

TableReader::TableReader(Reading& reading, const toml::table& table, std::string path)
    : m_reading{reading}, m_table{table}, m_path{std::move(path)}, m_where{where_of(table)} {}

Where TableReader::where(const std::string& key) const {
    const auto found = m_table.find(key);
    if (found == m_table.end())
        return m_where;
    const auto& begin = found->first.source().begin;
    if (begin.line == 0)
        return where_of(found->second);
    return {static_cast<int>(begin.line), static_cast<int>(begin.column)};
}

void TableReader::problem(const std::string& key, const std::string& what) const {
    m_reading.problem(where(key), (m_path.empty() ? key : m_path + "." + key) + ": " + what);
}

const toml::node* TableReader::take(const std::string& key) {
    m_known.insert(key);
    return m_table.get(key);
}

bool TableReader::check_range(const std::string& key, double value, Range range) const {
    if (std::isfinite(value) && value >= range.low && value <= range.high &&
        !(range.open_low && value == range.low))
        return true;
    if (!std::isfinite(value))
        problem(key, "is not a finite number; give a finite number");
    else
        problem(key, text::number(value) + " is out of range; give a number " + range_text(range));
    return false;
}

bool TableReader::real(const std::string& key, double& target, Range range) {
    const toml::node* node = take(key);
    if (node == nullptr)
        return false;
    const auto value = number_of(*node);
    if (!value) {
        problem(key, "is " + type_of(*node) + "; give a number, without quotation marks");
        return false;
    }
    if (!check_range(key, *value, range))
        return false;
    target = *value;
    return true;
}

bool TableReader::real(const std::string& key, std::optional<double>& target, Range range) {
    double value = 0.0;
    if (!real(key, value, range))
        return false;
    target = value;
    return true;
}

bool TableReader::integer(const std::string& key, int& target, int low, int high) {
    double value = 0.0;
    if (!real(key, value, {static_cast<double>(low), static_cast<double>(high), false}))
        return false;
    if (value != std::floor(value)) {
        problem(key, text::number(value) + " is not a whole number; give a whole number");
        return false;
    }
    target = static_cast<int>(value);
    return true;
}

bool TableReader::text(const std::string& key, std::string& target) {
    const toml::node* node = take(key);
    if (node == nullptr)
        return false;
    const auto* value = node->as_string();
    if (value == nullptr) {
        problem(key, "is " + type_of(*node) + "; give a text in quotation marks");
        return false;
    }
    target = value->get();
    return true;
}

bool TableReader::text(const std::string& key, std::optional<std::string>& target) {
    std::string value;
    if (!text(key, value))
        return false;
    target = value;
    return true;
}

bool TableReader::texts(const std::string& key, std::vector<std::string>& target) {
    const toml::node* node = take(key);
    if (node == nullptr)
        return false;
    std::vector<std::string> values;
    if (const auto* one = node->as_string())
        values.push_back(one->get());
    else if (const auto* list = node->as_array()) {
        for (const auto& item : *list) {
            if (const auto* item_text = item.as_string())
                values.push_back(item_text->get());
            else {
                problem(key,
                        "holds " + type_of(item) + "; give a list of texts in quotation marks");
                return false;
            }
        }
    } else {
        problem(key, "is " + type_of(*node) + "; give a list of texts in quotation marks");
        return false;
    }
    target = values;
    return true;
}

bool TableReader::reals(const std::string& key, std::vector<double>& target) {
    const toml::node* node = take(key);
    if (node == nullptr)
        return false;
    const auto* list = node->as_array();
    std::vector<double> values;
    if (list != nullptr) {
        for (const auto& item : *list) {
            const auto value = number_of(item);
            if (!value || !std::isfinite(*value)) {
                problem(key, "holds " + type_of(item) + " that is not a finite number");
                return false;
            }
            values.push_back(*value);
        }
    } else if (const auto one = number_of(*node)) {
        values.push_back(*one);
    } else {
        problem(key, "is " + type_of(*node) + "; give a list of numbers");
        return false;
    }
    target = values;
    return true;
}

bool TableReader::character(const std::string& key, std::optional<char>& target) {
    std::string value;
    if (!text(key, value))
        return false;
    if (value == "\\t" || value == "tab")
        value = "\t";
    if (value.size() != 1) {
        problem(key, "'" + value + "' is not one character; give one, such as \",\"");
        return false;
    }
    target = value.front();
    return true;
}

bool TableReader::time(const std::string& key, double& target_s) {
    const toml::node* node = take(key);
    if (node == nullptr)
        return false;
    const auto* value = node->as_date_time();
    if (value == nullptr || !value->get().offset) {
        problem(key, value == nullptr
                         ? "is " + type_of(*node) + "; give a time such as 2031-04-05T10:20:00Z"
                         : std::string{"has no zone offset; add Z for UTC, or an offset such as "
                                       "+02:00"});
        return false;
    }
    const toml::date_time& t = value->get();
    const std::chrono::year_month_day date{std::chrono::year{t.date.year},
                                           std::chrono::month{t.date.month},
                                           std::chrono::day{t.date.day}};
    const double days = static_cast<double>(std::chrono::sys_days{date}.time_since_epoch().count());
    target_s = days * 86400.0 + t.time.hour * 3600.0 + t.time.minute * 60.0 + t.time.second +
               t.time.nanosecond * 1e-9 - t.offset->minutes * 60.0;
    return true;
}

bool TableReader::path(const std::string& key, fs::path& target, bool must_exist) {
    std::string value;
    if (!text(key, value))
        return false;
    if (value.empty() || value.find('\0') != std::string::npos) {
        problem(key, "names no file; give a path");
        return false;
    }
    const fs::path full = (m_reading.folder / value).lexically_normal();
    std::error_code error;
    if (must_exist && !fs::exists(full, error)) {
        problem(key, "there is no file '" + value + "' in " + m_reading.folder.string() +
                         "; correct the name or put the file there");
        return false;
    }
    target = full;
    return true;
}

bool TableReader::path(const std::string& key, std::optional<fs::path>& target) {
    fs::path value;
    if (!path(key, value))
        return false;
    target = value;
    return true;
}

bool TableReader::series(const std::string& key, std::optional<SideSeries>& target) {
    bool good = false;
    table(key, [&](TableReader& inner) {
        SideSeries value;
        value.where = inner.where();
        inner.require("file", "the file of the series");
        inner.require("column", "the name of the column");
        const bool file = inner.path("file", value.file);
        const bool column = inner.text("column", value.column);
        if (file && column) {
            target = value;
            good = true;
        }
    });
    return good;
}

void TableReader::require(const std::string& key, const std::string& what) {
    m_known.insert(key);
    if (has(key))
        return;
    m_reading.problem(m_where, "'" + (m_path.empty() ? key : m_path + "." + key) +
                                   "' is missing; say " + what);
}

void TableReader::used_default(const std::string& key, const std::string& value) {
    m_known.insert(key);
    if (!has(key))
        m_reading.defaults.push_back({m_path.empty() ? key : m_path + "." + key, value});
}

void TableReader::exclusive(const std::vector<std::string>& keys) const {
    std::string first;
    for (const auto& key : keys) {
        if (!has(key))
            continue;
        if (first.empty())
            first = key;
        else
            problem(key, "stands beside '" + first + "'; keep one of the two");
    }
}

void TableReader::table(const std::string& key, const std::function<void(TableReader&)>& use) {
    const toml::node* node = take(key);
    if (node == nullptr)
        return;
    const auto* inner = node->as_table();
    if (inner == nullptr) {
        problem(key, "is " + type_of(*node) + "; give a table");
        return;
    }
    TableReader reader{m_reading, *inner, m_path.empty() ? key : m_path + "." + key};
    use(reader);
    reader.finish();
}

void TableReader::tables(const std::string& key, const std::function<void(TableReader&)>& use) {
    const toml::node* node = take(key);
    if (node == nullptr)
        return;
    const std::string path = m_path.empty() ? key : m_path + "." + key;
    const auto* list = node->as_array();
    if (list == nullptr) {
        problem(key, node->is_table()
                         ? "is one table; write it with double brackets, [[" + path + "]]"
                         : "is " + type_of(*node) + "; give tables [[" + path + "]]");
        return;
    }
    for (const auto& item : *list) {
        const auto* inner = item.as_table();
        if (inner == nullptr) {
            m_reading.problem(where_of(item), path + ": holds " + type_of(item) + "; give tables");
            continue;
        }
        TableReader reader{m_reading, *inner, path};
        use(reader);
        reader.finish();
    }
}

void TableReader::finish() {
    const std::vector<std::string> known{m_known.begin(), m_known.end()};
    for (const auto& [key, node] : m_table) {
        const std::string name{key.str()};
        if (m_known.contains(name))
            continue;
        const std::string near = text::nearest(name, known);
        const std::string shown = m_path.empty() ? name : m_path + "." + name;
        m_reading.problem(
            where(name),
            "unknown key '" + shown + "'" +
                (near.empty() ? "; remove it" : "; the nearest known key is '" + near + "'"));
    }
}

} // namespace rillstrand::campaign
