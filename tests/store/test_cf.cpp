// SPDX-License-Identifier: Apache-2.0
#include "helpers.hpp"
#include "store/metadata.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rillstrand;
using namespace rillstrand::testing;
using Catch::Matchers::Contains;

namespace {

// EPSG:25832 in WKT 1, as PROJ's database has it.
const char* const utm32 =
    "PROJCS[\"ETRS89 / UTM zone 32N\",GEOGCS[\"ETRS89\",DATUM[\"European_Terrestrial_Reference_"
    "System_1989\",SPHEROID[\"GRS 1980\",6378137,298.257222101]],PRIMEM[\"Greenwich\",0],UNIT["
    "\"degree\",0.0174532925199433]],PROJECTION[\"Transverse_Mercator\"],PARAMETER[\"latitude_of_"
    "origin\",0],PARAMETER[\"central_meridian\",9],PARAMETER[\"scale_factor\",0.9996],PARAMETER["
    "\"false_easting\",500000],PARAMETER[\"false_northing\",0],UNIT[\"metre\",1],AUTHORITY["
    "\"EPSG\",\"25832\"]]";

store::Positions positions_of(Eigen::Index n) {
    store::Positions positions;
    positions.lon_deg = Eigen::ArrayXd::LinSpaced(n, 8.0, 8.01);
    positions.lat_deg = Eigen::ArrayXd::LinSpaced(n, 47.0, 47.02);
    positions.x_m = Eigen::ArrayXd::LinSpaced(n, 512000.0, 512700.0);
    positions.y_m = Eigen::ArrayXd::LinSpaced(n, 5278000.0, 5279000.0);
    positions.z_m = Eigen::ArrayXd::Constant(n, 412.0);
    positions.position_sd_m = Eigen::ArrayXd::Constant(n, 0.7);
    positions.station_m = Eigen::ArrayXd::LinSpaced(n, 0.0, 1200.0);
    positions.lon_deg(3) = positions.lat_deg(3) = positions.x_m(3) = positions.y_m(3) = NAN;
    positions.crs_wkt = utm32;
    positions.crs_name = "EPSG:25832";
    return positions;
}

} // namespace

TEST_CASE("the canonical record keeps the CF conventions", "[store][published]") {
    std::mt19937_64 random{2};
    const fs::path folder = fresh_folder("cf");
    for (const double step : {0.01, 0.001, 0.0078125}) {
        const fs::path path = folder / "r.nc";
        auto head = head_of(300, 300.0);
        head.source = "an invented campaign";
        head.history = "2031-04-05T06:07:08Z written";
        head.quantities = {record::Quantity::temperature, record::Quantity::stokes};
        const Eigen::ArrayXXf values = on_grid(400, 300, step, random);
        store::CanonicalWriter writer{path, head};
        for (Eigen::Index i = 0; i < values.rows(); ++i)
            writer.add_row(1.9e9 + 300.0 * static_cast<double>(i),
                           {values.row(i).transpose(), values.row(i).transpose() * 3.0F});
        writer.finish();
        const Said bare = python("check_cf.py", path.string());
        CAPTURE(step, bare.text);
        CHECK(bare.status == 0);

        store::add_positions(path, positions_of(300));
        store::ChannelQuality quality;
        quality.noise_c = Eigen::ArrayXd::Constant(300, 0.05);
        quality.flag.assign(300, 0);
        quality.flag[7] = 2;
        quality.flag_meanings = {"good", "noisy", "no_position"};
        quality.stretch.assign(300, "Höhbach reach");
        quality.stretch[0] = "";
        store::add_quality(path, quality);
        store::Discovery discovery;
        discovery.title = "Upper Harrowbeck, summer low flow";
        discovery.creator = "A. Müller";
        discovery.licence = "CC-BY-4.0";
        discovery.keywords = {"stream temperature", "fibre"};
        store::set_discovery(path, discovery);
        store::set_discovery(path, discovery); // again: in place, not twice
        store::add_positions(path, positions_of(300));
        const Said whole = python("check_cf.py", path.string());
        CAPTURE(whole.text);
        CHECK(whole.status == 0);
        CHECK(differing(read_all(*store::open_canonical(path)), values) == 0);
    }
}

TEST_CASE("general tools give back the values and what was added", "[store][published]") {
    std::mt19937_64 random{4};
    const fs::path folder = fresh_folder("tools");
    const fs::path path = folder / "r.nc";
    const Eigen::ArrayXXf values = on_grid(600, 270, 0.01, random);
    write_record(path, values, 300.0, 1933149600.0);
    store::add_positions(path, positions_of(270));
    store::Discovery discovery;
    discovery.creator = "A. Müller";
    store::set_discovery(path, discovery);
    {
        std::FILE* file = std::fopen((folder / "values.f32").c_str(), "wb");
        for (Eigen::Index i = 0; i < values.rows(); ++i) {
            const Eigen::ArrayXf row = values.row(i);
            std::fwrite(row.data(), sizeof(float), static_cast<std::size_t>(row.size()), file);
        }
        std::fclose(file);
    }
    const Said said =
        python("compare_tools.py", path.string() + " " + (folder / "values.f32").string());
    CAPTURE(said.text);
    CHECK(said.status == 0);
}

TEST_CASE("arrays of another length than the channels are refused", "[store]") {
    const fs::path path = fresh_folder("lengths") / "r.nc";
    write_record(path, Eigen::ArrayXXf::Constant(3, 20, 1.5F), 60.0);
    CHECK_THROWS_WITH(store::add_positions(path, positions_of(19)),
                      Contains("lon has 19 values for 20 channels"));
    store::ChannelQuality quality;
    quality.flag.assign(21, 0);
    CHECK_THROWS_WITH(store::add_quality(path, quality),
                      Contains("flag has 21 values for 20 channels"));
    CHECK_THROWS_AS(store::set_discovery(path.parent_path() / "none.nc", {}), MachineError);
    CHECK(python("check_cf.py", path.string()).text ==
          path.string() + ": no global attribute source (2.6.2)\n");
}
