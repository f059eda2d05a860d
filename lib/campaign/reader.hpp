// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "campaign/campaign.hpp"

namespace rillstrand::campaign {
/// @throws std::logic_error, from wherever it is called
[[noreturn]] void refuse_spoilt_toml();
} // namespace rillstrand::campaign

// What toml++ 3.3 takes for granted of a text (and, with NDEBUG, builds on) can be false of a
// spoilt one: there it throws, and the reader refuses the file.
#pragma push_macro("NDEBUG")
#undef NDEBUG
#define TOML_ASSERT(expr)                                                                          \
    ((expr) ? static_cast<void>(0) : rillstrand::campaign::refuse_spoilt_toml())
#include <toml++/toml.h>
#pragma pop_macro("NDEBUG")

#include <functional>
#include <limits>
#include <map>
#include <set>
#include <string>

namespace rillstrand::campaign {

/// What is shared by all tables of one campaign file while it is read.
struct Reading {
    std::filesystem::path folder;
    std::string file_name;
    Problems problems;
    std::vector<std::array<std::string, 2>> defaults;
    /// `file:line:column: text` is added to the problems.
    void problem(Where where, const std::string& what);
};

/// Limits of a number, and the words that say what it must be.
struct Range {
    double low = -std::numeric_limits<double>::infinity();
    double high = std::numeric_limits<double>::infinity();
    bool open_low = false; ///< low itself is not allowed
};
inline constexpr Range any_number{};
inline constexpr Range positive{0.0, std::numeric_limits<double>::infinity(), true};
inline constexpr Range not_negative{0.0, std::numeric_limits<double>::infinity(), false};

/// Takes keys out of one TOML table, checks their types and ranges, and afterwards names the keys
/// that nobody asked for.
class TableReader {
public:
    TableReader(Reading& reading, const toml::table& table, std::string path);

    Where where() const { return m_where; }
    Where where(const std::string& key) const;
    bool has(const std::string& key) const { return m_table.contains(key); }
    void problem(const std::string& key, const std::string& what) const;

    /// Each returns whether the key was there and good; the target keeps its value otherwise.
    bool real(const std::string& key, double& target, Range range = any_number);
    bool real(const std::string& key, std::optional<double>& target, Range range = any_number);
    bool integer(const std::string& key, int& target, int low, int high);
    bool text(const std::string& key, std::string& target);
    bool text(const std::string& key, std::optional<std::string>& target);
    bool texts(const std::string& key, std::vector<std::string>& target);
    bool reals(const std::string& key, std::vector<double>& target);
    bool character(const std::string& key, std::optional<char>& target);
    bool time(const std::string& key, double& target_s);
    /// A path relative to the campaign's folder; must exist.
    bool path(const std::string& key, std::filesystem::path& target, bool must_exist = true);
    bool path(const std::string& key, std::optional<std::filesystem::path>& target);
    bool series(const std::string& key, std::optional<SideSeries>& target);

    /// One word out of a list.
    template <class Enum>
    bool word(const std::string& key, Enum& target, const std::map<std::string, Enum>& words) {
        std::string given;
        if (!text(key, given))
            return false;
        const auto found = words.find(given);
        if (found != words.end()) {
            target = found->second;
            return true;
        }
        std::string list;
        for (const auto& [name, value] : words)
            list += (list.empty() ? "" : ", ") + name;
        problem(key, "'" + given + "' is none of its words; write one of " + list);
        return false;
    }

    /// Says that a required key is missing.
    void require(const std::string& key, const std::string& what);
    /// A default was used for a key that is not there.
    void used_default(const std::string& key, const std::string& value);
    /// Says that at most one of these keys may be there.
    void exclusive(const std::vector<std::string>& keys) const;
    /// Calls `use` with a reader of the table, or of each table of an array of tables.
    void table(const std::string& key, const std::function<void(TableReader&)>& use);
    void tables(const std::string& key, const std::function<void(TableReader&)>& use);
    /// Names the keys that nobody asked for.
    void finish();

private:
    const toml::node* take(const std::string& key);
    bool check_range(const std::string& key, double value, Range range) const;
    Reading& m_reading;
    const toml::table& m_table;
    std::string m_path;
    Where m_where;
    std::set<std::string> m_known;
};

} // namespace rillstrand::campaign
