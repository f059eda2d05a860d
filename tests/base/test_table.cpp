// SPDX-License-Identifier: Apache-2.0
#include "base/table.hpp"

#include <catch2/catch.hpp>

#include <limits>

using namespace rillstrand;

TEST_CASE("a table is written as RFC 4180 text with missing cells empty", "[base]") {
    Table table{"inflows"};
    table.add_real("fibre_m", "fibre distance", "m",
                   {1.5, std::numeric_limits<double>::quiet_NaN()}, 1);
    table.add_text("label", "label", {"a \"b\", c", "=SUM(A1)"});
    table.add_boolean("used", "used", {true, false});
    table.add_time("time", "time", {0.0, 60.0});
    CHECK(to_csv(table) == "fibre_m,label,used,time\n"
                           "1.5,\"a \"\"b\"\", c\",true,1970-01-01T00:00:00Z\n"
                           ",'=SUM(A1),false,1970-01-01T00:01:00Z\n");
}
