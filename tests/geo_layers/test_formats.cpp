// SPDX-License-Identifier: Apache-2.0
#include "geo_layers/reread.hpp"
#include "geo_layers/sample_layers.hpp"

#include "base/text.hpp"
#include "layers.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <fstream>
#include <map>
#include <sstream>

using namespace rillstrand;
using namespace rillstrand::geo;
using campaign::LayerFormat;

namespace {
std::string content(const std::filesystem::path& file) {
    std::ifstream in{file, std::ios::binary};
    std::ostringstream text;
    text << in.rdbuf();
    return text.str();
}

bool passes(const std::string& command) {
    return std::system((command + " > /dev/null").c_str()) == 0; // NOLINT: a test's own command
}

std::string script(const std::string& name) {
    return std::string{"/usr/bin/python3 "} + RILLSTRAND_TEST_DATA + "/" + name + " ";
}

const double degree_step = 0.6e-8; // half a unit of the eighth decimal, and rounding: under 1 mm
} // namespace

TEST_CASE("a GeoPackage gives everything back", "[layers][property]") {
    const auto folder = sample::fresh_folder("gpkg");
    const LayerSet set = sample::layer_set();
    const auto written = write_layers(set, {LayerFormat::gpkg}, folder);
    CHECK(written.warnings.empty());
    for (const auto& file : written.files)
        CHECK(std::filesystem::exists(folder / file));
    const auto file = reread::open(folder / "layers.gpkg");
    REQUIRE(file != nullptr);
    for (const auto& layer : set.layers)
        reread::check_layer(*file, text::slug(layer.table.name()), layer, {});
}

// OGC 12-128r17, GeoPackage Encoding Standard; GDAL's validator of python3-gdal.
TEST_CASE("the GeoPackage follows the standard", "[layers][published]") {
    const auto folder = sample::fresh_folder("gpkg_valid");
    write_layers(sample::layer_set(), {LayerFormat::gpkg}, folder);
    CHECK(passes(script("check_gpkg.py") + (folder / "layers.gpkg").string()));
}

TEST_CASE("a GeoPackage of an empty set follows the standard", "[layers][property]") {
    const auto folder = sample::fresh_folder("gpkg_empty");
    LayerSet set = sample::layer_set();
    for (auto& layer : set.layers) {
        Table none{layer.table.name(), layer.table.title()};
        none.add_real("fibre_m", "fibre distance", "m", {});
        layer.table = std::move(none);
        layer.vertices.clear();
    }
    set.views.clear();
    write_layers(set,
                 {LayerFormat::gpkg, LayerFormat::geojson, LayerFormat::flatgeobuf,
                  LayerFormat::kml, LayerFormat::gpx, LayerFormat::shapefile, LayerFormat::csv},
                 folder);
    CHECK(passes(script("check_gpkg.py") + (folder / "layers.gpkg").string()));
    CHECK(passes(script("check_geojson.py") + (folder / "layers").string() + "/*.geojson"));
}

TEST_CASE("a temporal view joins days and points", "[layers][property]") {
    const auto folder = sample::fresh_folder("gpkg_view");
    write_layers(sample::layer_set(), {LayerFormat::gpkg}, folder);
    const auto file = reread::open(folder / "layers.gpkg");
    OGRLayer* view = file->GetLayerByName("snow_daily_map");
    REQUIRE(view != nullptr);
    CHECK(view->GetFeatureCount() == 4);
    CHECK(view->GetLayerDefn()
              ->GetFieldDefn(view->GetLayerDefn()->GetFieldIndex("date"))
              ->GetType() == OFTDate);
    const std::unique_ptr<OGRFeature> last{view->GetFeature(4)};
    REQUIRE(last != nullptr);
    CHECK(std::string{last->GetFieldAsString("state")} == "unknown");
    CHECK(last->GetGeometryRef()->toPoint()->getX() == 512349.5);
    OGRLayer* plan = file->ExecuteSQL(
        "EXPLAIN QUERY PLAN SELECT * FROM snow_daily_map WHERE date = '2031-04-05'", nullptr,
        nullptr);
    REQUIRE(plan != nullptr); // a day is found by an index, not by reading every row
    std::string steps;
    while (const std::unique_ptr<OGRFeature> step{plan->GetNextFeature()})
        steps += std::string{step->GetFieldAsString("detail")} + "; ";
    file->ReleaseResultSet(plan);
    CHECK(steps.find("SEARCH t USING INDEX snow_daily_map_times") != std::string::npos);
    OGRLayer* column = file->GetLayerByName("column_mast_a_map");
    REQUIRE(column != nullptr);
    REQUIRE(column->GetFeatureCount() == 2);
    while (const std::unique_ptr<OGRFeature> row{column->GetNextFeature()})
        CHECK(row->GetGeometryRef()->toPoint()->getX() == 512400.0);
}

TEST_CASE("fields and layers of a GeoPackage are described", "[layers][property]") {
    const auto folder = sample::fresh_folder("gpkg_words");
    write_layers(sample::layer_set(), {LayerFormat::gpkg}, folder);
    const auto file = reread::open(folder / "layers.gpkg");
    const auto ask = [&](const std::string& sql) {
        OGRLayer* result = file->ExecuteSQL(sql.c_str(), nullptr, nullptr);
        REQUIRE(result != nullptr);
        const std::unique_ptr<OGRFeature> row{result->GetNextFeature()};
        std::string text = row == nullptr ? "" : row->GetFieldAsString(0);
        file->ReleaseResultSet(result);
        return text;
    };
    CHECK(ask("SELECT title || '|' || description FROM gpkg_data_columns WHERE "
              "table_name = 'channels' AND column_name = 'mean_c'") ==
          "mean temperature|unit: degC");
    const std::string metadata =
        ask("SELECT m.metadata FROM gpkg_metadata m JOIN gpkg_metadata_reference r ON "
            "r.md_file_id = m.id WHERE r.table_name = 'channels'");
    CHECK(metadata.find("campaign.toml 0123&apos;abc") != std::string::npos);
    CHECK(metadata.find("<script>") == std::string::npos);
    CHECK(ask("SELECT '' || last_change FROM gpkg_contents WHERE table_name = 'cable'") ==
          "2031-07-01T12:00:00.000Z");
    CHECK(ask("SELECT count(*) FROM layer_styles WHERE useAsDefault = 1") == "7");
}

// Checks G-70: POINT(6 49.7), EPSG:4326, built by hand from OGC 12-128, clause 2.1.3.
TEST_CASE("a point has the bytes of the standard", "[layers][published]") {
    const auto folder = sample::fresh_folder("gpkg_bytes");
    LayerSet set;
    set.crs = "EPSG:4326";
    set.now = "2031-07-01T12:00:00Z";
    Table table{"place"};
    table.add_real("fibre_m", "", "m", {1.0});
    set.layers = {point_layer(std::move(table), GeometryKind::point, {6.0}, {49.7})};
    write_layers(set, {LayerFormat::gpkg}, folder);
    const auto file = reread::open(folder / "layers.gpkg");
    OGRLayer* result = file->ExecuteSQL("SELECT hex(geom) FROM place", nullptr, nullptr);
    const std::unique_ptr<OGRFeature> row{result->GetNextFeature()};
    CHECK(std::string{row->GetFieldAsString(0)} ==
          "47500001E6100000010100000000000000000018409A99999999D94840");
    file->ReleaseResultSet(result);
}

TEST_CASE("GeoJSON gives everything back in longitude and latitude", "[layers][property]") {
    const auto folder = sample::fresh_folder("geojson");
    const LayerSet set = sample::layer_set();
    write_layers(set, {LayerFormat::geojson}, folder);
    reread::Promise promise;
    promise.degrees = degree_step;
    for (const auto& layer : set.layers) {
        const std::string name = text::slug(layer.table.name());
        const auto file = reread::open(folder / "layers" / (name + ".geojson"));
        REQUIRE(file != nullptr);
        reread::check_layer(*file, name, layer, promise);
    }
    // RFC 7946, checks G-60 to G-66.
    CHECK(passes(script("check_geojson.py") + (folder / "layers").string() + "/*.geojson"));
}

TEST_CASE("a line over the antimeridian is cut in GeoJSON", "[layers][published]") {
    const auto folder = sample::fresh_folder("geojson_cut"); // RFC 7946, 3.1.9
    LayerSet set;
    set.crs = "EPSG:4326";
    Table table{"cable"};
    table.add_real("from_m", "", "m", {0.0});
    Layer line{std::move(table), GeometryKind::line_string_z, {}, {}};
    line.vertices = {{{179.5, -17.0, 1.0}, {-179.5, -17.5, 2.0}}};
    set.layers = {line};
    write_layers(set, {LayerFormat::geojson}, folder);
    const std::string text = content(folder / "layers/cable.geojson");
    CHECK(text.find(R"("MultiLineString","coordinates":[[[179.50000000,-17.00000000,1.000],)"
                    R"([180.00000000,-17.25000000,1.500]],[[-180.00000000,-17.25000000,1.500],)"
                    R"([-179.50000000,-17.50000000,2.000]]])") != std::string::npos);
    CHECK(passes(script("check_geojson.py") + (folder / "layers/cable.geojson").string()));
}

TEST_CASE("CSV gives everything back", "[layers][property]") {
    const auto folder = sample::fresh_folder("csv");
    const LayerSet set = sample::layer_set();
    write_layers(set, {LayerFormat::csv}, folder);
    reread::Promise promise;
    promise.types = false;
    for (const auto& layer : set.layers) {
        const std::string name = text::slug(layer.table.name());
        const auto file =
            reread::open(folder / "layers" / (name + ".csv"), {"EMPTY_STRING_AS_NULL=YES"});
        REQUIRE(file != nullptr);
        reread::check_layer(*file, name, layer, promise);
    }
}

TEST_CASE("FlatGeobuf gives every placed row back", "[layers][property]") {
    const auto folder = sample::fresh_folder("fgb");
    const LayerSet set = sample::layer_set();
    const auto written = write_layers(set, {LayerFormat::flatgeobuf}, folder);
    reread::Promise promise;
    promise.unplaced_rows = false;
    promise.order = false; // rows stand in the order of the index in the file
    for (const auto& layer : set.layers) {
        if (layer.geometry == GeometryKind::none)
            continue;
        const std::string name = text::slug(layer.table.name());
        const auto file = reread::open(folder / "layers" / (name + ".fgb"));
        REQUIRE(file != nullptr);
        reread::check_layer(*file, name, layer, promise);
    }
    std::vector<std::string> codes;
    for (const auto& warning : written.warnings)
        codes.push_back(warning.code);
    CHECK(codes == std::vector<std::string>{"flatgeobuf-rows-left-out", "flatgeobuf-rows-left-out",
                                            "layers-without-place"});
}

TEST_CASE("KML gives every layer with places back", "[layers][property]") {
    const auto folder = sample::fresh_folder("kml");
    LayerSet set = sample::layer_set();
    write_layers(set, {LayerFormat::kml}, folder);
    const auto file = reread::open(folder / "layers.kml");
    REQUIRE(file != nullptr);
    reread::Promise promise;
    promise.degrees = degree_step;
    promise.types = false;
    for (const auto& layer : set.layers)
        if (layer.geometry != GeometryKind::none)
            reread::check_layer(*file, text::slug(layer.table.name()), layer, promise);
    CHECK(passes("/usr/bin/python3 -c 'import sys, xml.dom.minidom as m; m.parse(sys.argv[1])' " +
                 (folder / "layers.kml").string()));
}

TEST_CASE("GPX holds findings as waypoints and the cable as a track", "[layers][property]") {
    const auto folder = sample::fresh_folder("gpx");
    write_layers(sample::layer_set(), {LayerFormat::gpx}, folder);
    const auto file = reread::open(folder / "findings.gpx");
    REQUIRE(file != nullptr);
    OGRLayer* points = file->GetLayerByName("waypoints");
    REQUIRE(points != nullptr);
    REQUIRE(points->GetFeatureCount() == 1);
    const std::unique_ptr<OGRFeature> point{points->GetNextFeature()};
    CHECK(std::string{point->GetFieldAsString("name")} == "step 1, 101 m");
    CHECK(std::string{point->GetFieldAsString("desc")}.find("share of discharge: 0.125") !=
          std::string::npos);
    OGRPoint expected{512346.0, 5278121.0};
    OGRSpatialReference from, to;
    from.importFromEPSG(25832);
    to.importFromEPSG(4326);
    from.SetAxisMappingStrategy(OAMS_TRADITIONAL_GIS_ORDER);
    to.SetAxisMappingStrategy(OAMS_TRADITIONAL_GIS_ORDER);
    expected.assignSpatialReference(&from);
    REQUIRE(expected.transformTo(&to) == OGRERR_NONE);
    CHECK(std::abs(point->GetGeometryRef()->toPoint()->getX() - expected.getX()) < degree_step);
    CHECK(std::abs(point->GetGeometryRef()->toPoint()->getY() - expected.getY()) < degree_step);
    CHECK(file->GetLayerByName("tracks")->GetFeatureCount() == 1); // the other stretch has no place
}

TEST_CASE("a zipped shapefile gives everything back under short names", "[layers][property]") {
    const auto folder = sample::fresh_folder("shapefile");
    const LayerSet set = sample::layer_set();
    write_layers(set, {LayerFormat::shapefile}, folder);
    for (const auto& layer : set.layers) {
        const std::string name = text::slug(layer.table.name());
        const auto archive = folder / "layers" / (name + ".shp.zip");
        const auto file = reread::open(archive);
        REQUIRE(file != nullptr);
        const auto keys = reread::open("/vsizip/" + archive.string() + "/" + name + "_fields.csv");
        REQUIRE(keys != nullptr);
        std::map<std::string, std::string> short_name;
        OGRLayer* key = keys->GetLayer(0);
        while (const std::unique_ptr<OGRFeature> row{key->GetNextFeature()}) {
            short_name[row->GetFieldAsString("name")] = row->GetFieldAsString("short_name");
            CHECK(std::string{row->GetFieldAsString("short_name")}.size() <= 10);
        }
        reread::Promise promise;
        promise.types = false;
        promise.relative = 1e-13; // fifteen decimals
        // One height of the channels is not known: the format has no mark for that.
        promise.heights = name != "channels";
        promise.field_name = [&](const std::string& full) { return short_name[full]; };
        if (name == "channels" || name == "snow_daily")
            continue; // dates: checked below
        reread::check_layer(*file, name, layer, promise);
    }
    const auto file = reread::open(folder / "layers/channels.shp.zip");
    OGRLayer* layer = file->GetLayer(0);
    CHECK(layer->GetFeatureCount() == 3);
    const std::unique_ptr<OGRFeature> first{layer->GetNextFeature()};
    CHECK(std::string{first->GetFieldAsString("stretch")} == sample::hostile);
    CHECK(std::string{first->GetFieldAsString("melt_out")} == "2031/04/05");
    CHECK(std::string{first->GetFieldAsString("first")} == "2031-04-01T05:07:08Z");
    CHECK(std::abs(first->GetGeometryRef()->toPoint()->getX() - 512345.1234) < 1e-9);
    const std::unique_ptr<OGRFeature> second{layer->GetNextFeature()};
    CHECK(second->GetGeometryRef() == nullptr);
    CHECK_FALSE(second->IsFieldSetAndNotNull(second->GetFieldIndex("mean_c")));
    CHECK_FALSE(second->IsFieldSetAndNotNull(second->GetFieldIndex("melt_out")));
    for (const auto& entry : std::filesystem::directory_iterator{folder / "layers"})
        CHECK(entry.path().extension() == ".zip");
}

TEST_CASE("bytes that are no text do not break a file", "[layers][property]") {
    const auto folder = sample::fresh_folder("no_text");
    LayerSet set;
    set.crs = "EPSG:25832";
    set.now = "2031-07-01T12:00:00Z";
    set.title = "broken \xFF title";
    // Cut short, too long a form, half of a surrogate pair, beyond Unicode, and control characters.
    const std::vector<std::string> texts{"a\xC3", "\xC0\xAF", "\xED\xA0\x80", "\xF5\x80\x80\x80",
                                         "bell\a escape\x1B tab\t end"};
    Table table{"channels"};
    table.add_text("label",
                   "la\xFE"
                   "bel",
                   texts);
    const std::vector<double> x(texts.size(), 500000.0), y(texts.size(), 5200000.0);
    set.layers = {point_layer(std::move(table), GeometryKind::point, x, y)};
    write_layers(set,
                 {LayerFormat::gpkg, LayerFormat::geojson, LayerFormat::flatgeobuf,
                  LayerFormat::kml, LayerFormat::gpx, LayerFormat::shapefile},
                 folder);
    CHECK(passes(script("check_gpkg.py") + (folder / "layers.gpkg").string()));
    CHECK(passes(script("check_geojson.py") + (folder / "layers/channels.geojson").string()));
    CHECK(passes("/usr/bin/python3 -c 'import sys, xml.dom.minidom as m; m.parse(sys.argv[1])' " +
                 (folder / "layers.kml").string()));
    const auto file = reread::open(folder / "layers/channels.geojson");
    OGRLayer* layer = file->GetLayer(0);
    const std::string mark = "\xEF\xBF\xBD"; // U+FFFD for every byte that is none
    for (const auto& expected :
         {"a" + mark, mark + mark, mark + mark + mark, mark + mark + mark + mark, texts.back()}) {
        const std::unique_ptr<OGRFeature> row{layer->GetNextFeature()};
        CHECK(std::string{row->GetFieldAsString("label")} == expected);
    }
}

TEST_CASE("a text too long for a shapefile is cut with a warning", "[layers][property]") {
    const auto folder = sample::fresh_folder("shapefile_cut");
    LayerSet set;
    set.crs = "EPSG:25832";
    set.now = "2031-07-01T12:00:00Z";
    std::string text(253, 'a');
    text += "\xC3\xA4\xC3\xA4"; // two letters of two bytes; the first would be cut in half
    Table table{"place"};
    table.add_text("label", "label", {text});
    set.layers = {point_layer(std::move(table), GeometryKind::point, {500000.0}, {5200000.0})};
    const auto written = write_layers(set, {LayerFormat::shapefile}, folder);
    REQUIRE(written.warnings.size() == 1);
    CHECK(written.warnings[0].code == "shapefile-text-cut");
    const auto file = reread::open(folder / "layers/place.shp.zip");
    const std::unique_ptr<OGRFeature> row{file->GetLayer(0)->GetNextFeature()};
    CHECK(std::string{row->GetFieldAsString("label")} == std::string(253, 'a'));
}

TEST_CASE("the same set gives the same bytes", "[layers][property]") {
    const std::vector<LayerFormat> all{
        LayerFormat::gpkg, LayerFormat::geojson,   LayerFormat::flatgeobuf, LayerFormat::kml,
        LayerFormat::gpx,  LayerFormat::shapefile, LayerFormat::csv};
    const auto once = sample::fresh_folder("same_1");
    const auto again = sample::fresh_folder("same_2");
    const auto written = write_layers(sample::layer_set(), all, once);
    write_layers(sample::layer_set(), all, again);
    write_layers(sample::layer_set(), all, again); // over earlier files
    for (const auto& file : written.files) {
        INFO(file);
        CHECK(content(once / file) == content(again / file));
    }
    CHECK(std::is_sorted(written.files.begin(), written.files.end()));
}
