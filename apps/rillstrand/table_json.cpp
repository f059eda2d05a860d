// SPDX-License-Identifier: Apache-2.0
#include "table_json.hpp"

#include <algorithm>
#include <cmath>

namespace rillstrand::app {

namespace {

Json cell_json(const Column& column, std::size_t row) {
    switch (column.kind) {
    case ColumnKind::real: {
        const double value = column.real[row];
        if (!std::isfinite(value) || column.decimals < 0)
            return number_json(value);
        // The same digits as in the tables.
        return Json::parse(cell_text(column, row));
    }
    case ColumnKind::integer:
        return column.integer[row];
    case ColumnKind::boolean:
        return column.integer[row] != 0;
    case ColumnKind::text:
    case ColumnKind::time:
    case ColumnKind::date: {
        std::string cell = cell_text(column, row);
        return cell.empty() ? Json{} : Json(std::move(cell));
    }
    }
    return {};
}

} // namespace

Json number_json(double value) {
    return std::isfinite(value) ? Json(value) : Json{};
}

Json rows_json(const Table& table, const std::vector<std::string>& without) {
    Json rows = Json::array();
    for (std::size_t i = 0; i < table.rows(); ++i) {
        Json row = Json::object();
        for (const auto& column : table.columns())
            if (std::find(without.begin(), without.end(), column.name) == without.end())
                row[column.name] = cell_json(column, i);
        rows.push_back(std::move(row));
    }
    return rows;
}

Json warnings_json(const Warnings& warnings) {
    Json list = Json::array();
    for (const auto& warning : warnings)
        list.push_back({{"code", warning.code}, {"text", warning.text}});
    return list;
}

std::string json_text(const Json& json) {
    return json.dump(1, ' ', false, Json::error_handler_t::replace) + "\n";
}

} // namespace rillstrand::app
