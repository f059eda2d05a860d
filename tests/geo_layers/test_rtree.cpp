// SPDX-License-Identifier: Apache-2.0
#include "geo_layers/reread.hpp"
#include "geo_layers/sample_layers.hpp"

#include "layers.hpp"

#include <catch2/catch.hpp>

#include <limits>
#include <random>

using namespace rillstrand;
using namespace rillstrand::geo;

namespace {
LayerSet scattered(int rows, bool lines) {
    std::mt19937 random{static_cast<unsigned>(rows)};
    std::uniform_real_distribution<double> place{0.0, 1e6};
    LayerSet set;
    set.crs = "EPSG:25832";
    set.now = "2031-07-01T12:00:00Z";
    std::vector<double> fibre;
    std::vector<std::vector<Eigen::Vector3d>> vertices;
    for (int i = 0; i < rows; ++i) {
        fibre.push_back(i);
        const Eigen::Vector3d a{place(random), place(random), 1.0};
        vertices.push_back({a});
        if (lines)
            vertices.back().push_back(a + Eigen::Vector3d{place(random) / 1e3, -7.0, 0.0});
        if (i % 13 == 5)
            vertices.back().clear();
    }
    Table table{"channels"};
    table.add_real("fibre_m", "", "m", fibre);
    set.layers = {{std::move(table),
                   lines ? GeometryKind::line_string_z : GeometryKind::point_z,
                   vertices,
                   {}}};
    return set;
}
} // namespace

// SQLite's own rtreecheck (in check_gpkg.py) and GDAL's validator judge the packed tree; sizes at
// and around full nodes of 51 cells, and of three levels.
TEST_CASE("a packed spatial index is whole", "[layers][published]") {
    const bool lines = GENERATE(false, true);
    for (const int rows : {0, 1, 51, 52, 55, 56, 57, 2601, 2900, 6000}) {
        INFO(rows << " rows, lines " << lines);
        const auto folder = sample::fresh_folder("rtree");
        write_layers(scattered(rows, lines), {campaign::LayerFormat::gpkg}, folder);
        const std::string check = std::string{"/usr/bin/python3 "} + RILLSTRAND_TEST_DATA +
                                  "/check_gpkg.py " + (folder / "layers.gpkg").string() +
                                  " > /dev/null";
        CHECK(std::system(check.c_str()) == 0); // NOLINT: a test's own command
    }
}

TEST_CASE("a search in the index finds what a search through all finds", "[layers][property]") {
    const bool lines = GENERATE(false, true);
    const auto folder = sample::fresh_folder("rtree_search");
    const LayerSet set = scattered(5000, lines);
    write_layers(set, {campaign::LayerFormat::gpkg}, folder);
    const auto file = reread::open(folder / "layers.gpkg");
    OGRLayer* layer = file->GetLayer(0);
    REQUIRE(layer->TestCapability(OLCFastSpatialFilter)); // the index is taken as one
    std::mt19937 random{3};
    std::uniform_real_distribution<double> place{0.0, 1e6};
    for (int trial = 0; trial < 50; ++trial) {
        const double x = place(random), y = place(random), size = place(random) / 4.0;
        layer->SetSpatialFilterRect(x, y, x + size, y + size);
        GIntBig expected = 0;
        for (const auto& v : set.layers[0].vertices) {
            if (v.empty())
                continue;
            OGRLineString line;
            for (const auto& p : v)
                line.addPoint(p.x(), p.y());
            OGREnvelope box;
            line.getEnvelope(&box);
            OGREnvelope window;
            window.Merge(x, y);
            window.Merge(x + size, y + size);
            // Lines are narrow against the windows: their boxes decide but for a few at the edges.
            expected += window.Intersects(box) ? 1 : 0;
        }
        const GIntBig found = layer->GetFeatureCount();
        if (lines)
            CHECK(std::abs(found - expected) <= 2);
        else
            CHECK(found == expected);
    }
}

TEST_CASE("the index follows edits", "[layers][property]") {
    const auto folder = sample::fresh_folder("rtree_edit");
    write_layers(scattered(3000, false), {campaign::LayerFormat::gpkg}, folder);
    GDALAllRegister();
    {
        const reread::File file{
            GDALDataset::Open((folder / "layers.gpkg").c_str(), GDAL_OF_VECTOR | GDAL_OF_UPDATE)};
        OGRLayer* layer = file->GetLayerByName("channels");
        for (int fid = 1; fid <= 1500; ++fid)
            REQUIRE(layer->DeleteFeature(fid) == OGRERR_NONE);
        for (int fid = 1600; fid < 1700; ++fid) {
            const std::unique_ptr<OGRFeature> feature{layer->GetFeature(fid)};
            feature->SetGeometryDirectly(new OGRPoint{5e6 + fid, 5e6, 0.0}); // OGR takes it over
            REQUIRE(layer->SetFeature(feature.get()) == OGRERR_NONE);
        }
    }
    const std::string check = std::string{"/usr/bin/python3 "} + RILLSTRAND_TEST_DATA +
                              "/check_gpkg.py " + (folder / "layers.gpkg").string() +
                              " > /dev/null";
    CHECK(std::system(check.c_str()) == 0); // NOLINT: a test's own command
    const auto file = reread::open(folder / "layers.gpkg");
    OGRLayer* layer = file->GetLayerByName("channels");
    layer->SetSpatialFilterRect(4.9e6, 4.9e6, 5.1e6, 5.1e6);
    CHECK(layer->GetFeatureCount() == 100);
}
