// SPDX-License-Identifier: Apache-2.0
#include "gather_helpers.hpp"

#include "base/text.hpp"

#include <catch2/catch.hpp>

#include <functional>
#include <random>

using namespace rillstrand;
using namespace rillstrand::testing;
using Catch::Matchers::Contains;

namespace {

constexpr double start_s = 22369.0 * 86400.0 + 7200.0; // 2031-03-31T02:00:00Z

/// The small record that every variant below says in another way.
const std::vector<double> distances{0.5, 1.0, 1.5};
const std::vector<std::vector<double>> values{{10.25, 11.5, 12.75}, {10.5, std::nan(""), 13.0}};

struct Variant {
    std::string name;
    std::function<void(const fs::path&)> write;
    std::function<void(campaign::Record&)> say;
};

std::string wide(const std::string& d, const std::string& missing, const std::string& end,
                 const std::function<std::string(double)>& number,
                 const std::vector<std::string>& stamps, const std::string& head = "") {
    std::string text = head + "time";
    for (const double x : distances)
        text += d + number(x);
    text += end;
    for (std::size_t i = 0; i < values.size(); ++i) {
        text += stamps[i];
        for (const double v : values[i])
            text += d + (std::isnan(v) ? missing : number(v));
        text += end;
    }
    return text;
}

std::string plain(double value) {
    return text::number(value);
}
std::string comma(double value) {
    std::string result = text::number(value);
    for (char& c : result)
        if (c == '.')
            c = ',';
    return result;
}
const std::vector<std::string> iso{"2031-03-31T02:00:00Z", "2031-03-31T02:05:00Z"};

std::string tall(std::size_t first, std::size_t second) {
    std::string text = "temperature,distance,time\n";
    for (const std::size_t i : {first, second})
        for (std::size_t j = 0; j < distances.size(); ++j)
            text += (std::isnan(values[i][j]) ? "" : plain(values[i][j])) + "," +
                    plain(distances[j]) + "," + iso[i] + "\n";
    return text;
}

std::string trace(std::size_t i, const std::string& head) {
    std::string text = head + "distance,temperature\n";
    for (std::size_t j = 0; j < distances.size(); ++j)
        text += plain(distances[j]) + "," +
                (std::isnan(values[i][j]) ? "nan" : plain(values[i][j])) + "\n";
    return text;
}

std::vector<Variant> variants() {
    const auto nothing = [](campaign::Record&) {};
    const auto one = [](const std::string& text) {
        return [text](const fs::path& f) { put(f / "a.csv", text); };
    };
    std::vector<Variant> all;
    all.push_back({"wide, as it should be", one(wide(",", "", "\n", plain, iso)), nothing});
    all.push_back({"wide, CRLF and byte-order mark",
                   one("\xEF\xBB\xBF" + wide(",", "NA", "\r\n", plain, iso)), nothing});
    all.push_back(
        {"wide, carriage returns alone", one(wide(",", "NA", "\r", plain, iso)), nothing});
    all.push_back(
        {"wide, semicolon and decimal comma", one(wide(";", "", "\n", comma, iso)), nothing});
    all.push_back({"wide, tab", one(wide("\t", "nan", "\n", plain, iso)), nothing});
    all.push_back({"wide, blanks", one(wide("  ", "-9999", "\n", plain, iso)), nothing});
    all.push_back({"wide, comments and skipped lines",
                   one(wide(",", "", "\n", plain, iso, "some words\n# more words\n\n")),
                   [](campaign::Record& r) { r.text.skip_lines = 1; }});
    all.push_back(
        {"wide, kelvin",
         one(wide(
             ",", "", "\n", [](double v) { return text::fixed(v > 9.0 ? v + 273.15 : v, 2); },
             iso)),
         [](campaign::Record& r) { r.temperature_unit = campaign::TemperatureUnit::kelvin; }});
    all.push_back(
        {"wide, degrees Fahrenheit",
         one(wide(
             ",", "", "\n", [](double v) { return text::fixed(v > 9.0 ? v * 1.8 + 32.0 : v, 3); },
             iso)),
         [](campaign::Record& r) { r.temperature_unit = campaign::TemperatureUnit::degF; }});
    all.push_back(
        {"wide, kilometres",
         one(wide(
             ",", "", "\n",
             [](double v) { return v > 9.0 ? plain(v) : text::fixed(v / 1000.0, 4); }, iso)),
         [](campaign::Record& r) { r.distance_unit = campaign::DistanceUnit::kilometre; }});
    all.push_back({"wide, own stamps in a zone",
                   one(wide(",", "", "\n", plain, {"31.03.2031 04:00:00", "31.03.2031 04:05:00"})),
                   [](campaign::Record& r) {
                       r.time_zone = "Europe/Berlin";
                       r.text.time_format = "%d.%m.%Y %H:%M:%S";
                   }});
    all.push_back({"wide, offsets in the stamps",
                   one(wide(",", "", "\n", plain,
                            {"2031-03-31 04:00:00+02:00", "2031-03-31T03:05:00.0+0100"})),
                   nothing});
    all.push_back(
        {"wide, clock offset and end stamps",
         one(wide(",", "", "\n", plain, {"2031-03-31T02:02:40Z", "2031-03-31T02:07:40Z"})),
         [](campaign::Record& r) {
             r.clock_offset_s = -10.0;
             r.stamp = campaign::Stamp::end;
         }});
    all.push_back({"wide, rows in disorder",
                   [](const fs::path& f) {
                       std::string text = wide(",", "", "\n", plain, iso);
                       const auto first = text.find('\n') + 1;
                       const auto second = text.find('\n', first) + 1;
                       put(f / "a.csv", text.substr(0, first) + text.substr(second) +
                                            text.substr(first, second - first));
                   },
                   nothing});
    all.push_back(
        {"wide, gzip",
         [](const fs::path& f) { put_gzip(f / "a.csv.gz", wide(",", "", "\n", plain, iso)); },
         [](campaign::Record& r) { r.files = {"a.csv.gz"}; }});
    all.push_back({"wide, two files and a trace twice",
                   [](const fs::path& f) {
                       const std::string text = wide(",", "", "\n", plain, iso);
                       put(f / "a.csv", text);
                       put(f / "b.csv", text.substr(0, text.rfind("2031")));
                   },
                   [](campaign::Record& r) { r.files = {"*.csv"}; }});
    all.push_back({"tall, in order", one(tall(0, 1)), nothing});
    all.push_back({"tall, in disorder", one(tall(1, 0)), nothing});
    all.push_back({"single, stamp in a comment",
                   [](const fs::path& f) {
                       put(f / "1.csv", trace(1, "# time: " + iso[1] + "\n"));
                       put(f / "2.csv", trace(0, "# time: " + iso[0] + "\n"));
                   },
                   [](campaign::Record& r) { r.files = {"?.csv"}; }});
    all.push_back({"single, stamp in the name, gzip",
                   [](const fs::path& f) {
                       put_gzip(f / "trace_20310331_020000.csv.gz", trace(0, ""));
                       put_gzip(f / "trace_20310331_020500.csv.gz", trace(1, ""));
                   },
                   [](campaign::Record& r) {
                       r.files = {"trace_*.gz"};
                       r.text.time_from_name = "trace_%Y%m%d_%H%M%S";
                   }});
    all.push_back({"single, stamp after words",
                   [](const fs::path& f) {
                       put(f / "1.csv", trace(0, "acquired: " + iso[0] + "\n"));
                       put(f / "2.csv", trace(1, "acquired: " + iso[1] + "\n"));
                   },
                   [](campaign::Record& r) {
                       r.files = {"[12].csv"};
                       r.text.time_from_header = "acquired: ";
                   }});
    all.push_back({"single, other column names and units in brackets",
                   [](const fs::path& f) {
                       for (std::size_t i = 0; i < 2; ++i)
                           put(f / (std::to_string(i) + ".csv"),
                               "# " + iso[i] + "\nLength [m];Nr;T (degC)\n" + "0,5;1;" +
                                   comma(values[i][0]) + "\n1,0;2;" +
                                   (i == 0 ? comma(values[i][1]) : "x") + "\n1,5;3;" +
                                   comma(values[i][2]) + "\n");
                   },
                   [](campaign::Record& r) {
                       r.files = {"?.csv"};
                       r.text.distance_column = "length";
                       r.text.temperature_column = "t";
                       r.missing = {"x"};
                   }});
    return all;
}

} // namespace

TEST_CASE("one record in all its variants gives one matrix", "[record]") {
    for (const auto& variant : variants()) {
        INFO(variant.name);
        const fs::path folder = fresh_folder("gather_variant");
        variant.write(folder);
        campaign::Record options;
        options.files = {"*.csv"};
        variant.say(options);
        KeepSink sink;
        const auto report = gather(options, folder, sink).first;
        REQUIRE(sink.times_s.size() == 2);
        CHECK(std::abs(sink.times_s[0] - start_s) < 1e-6);
        CHECK(std::abs(sink.times_s[1] - start_s - 300.0) < 1e-6);
        CHECK(report.interval_s == Approx(300.0));
        REQUIRE(sink.head.distance_m.size() == 3);
        for (Eigen::Index j = 0; j < 3; ++j) {
            const auto k = static_cast<std::size_t>(j);
            CHECK(sink.head.distance_m(j) == Approx(distances[k]).margin(1e-9));
            for (std::size_t i = 0; i < 2; ++i) {
                const auto found = static_cast<double>(sink.temperature_degC[i](j));
                if (std::isnan(values[i][k]))
                    CHECK(std::isnan(found));
                else
                    CHECK(found == Approx(values[i][k]).margin(2e-3));
            }
        }
    }
}

TEST_CASE("gaps stay gaps and are told", "[record]") {
    const fs::path folder = fresh_folder("gather_gap");
    put(folder / "a.csv", "time,1,2\n2031-01-01T00:00:00Z,1,1\n2031-01-01T00:05:00Z,1,1\n"
                          "2031-01-01T00:10:00Z,1,1\n2031-01-01T02:10:00Z,1,1\n");
    campaign::Record options;
    options.files = {"a.csv"};
    KeepSink sink;
    const auto report = gather(options, folder, sink).first;
    REQUIRE(report.gaps.size() == 1);
    CHECK(report.gaps[0].to_s - report.gaps[0].from_s == 7200.0);
    REQUIRE(report.warnings.size() == 1);
    CHECK(report.warnings[0].text ==
          "1 gap in time; the longest is 2.00 h from 2031-01-01T00:10:00Z");
}

TEST_CASE("a repeated hour is told by order, a skipped one is refused", "[record]") {
    const fs::path folder = fresh_folder("gather_zone");
    campaign::Record options;
    options.files = {"a.csv"};
    options.time_zone = "Europe/Berlin";
    // 26 October 2031: 03:00 summer time is put back to 02:00 (common practice, no source).
    put(folder / "a.csv", "time,1\n2031-10-26T01:30:00,1\n2031-10-26T02:00:00,1\n"
                          "2031-10-26T02:30:00,1\n2031-10-26T02:00:00,1\n2031-10-26T02:30:00,1\n"
                          "2031-10-26T03:00:00,1\n");
    KeepSink sink;
    gather(options, folder, sink);
    REQUIRE(sink.times_s.size() == 6);
    for (std::size_t i = 1; i < 6; ++i)
        CHECK(sink.times_s[i] - sink.times_s[i - 1] == 1800.0);
    put(folder / "a.csv", "time,1\n2031-10-26T02:00:00,1\n2031-10-26T02:30:00,1\n");
    CHECK_THAT(refusal(folder, options),
               Contains("a.csv:2: time '2031-10-26T02:00:00' stands twice in "
                        "Europe/Berlin"));
    put(folder / "a.csv", "time,1\n2031-03-30T01:30:00,1\n2031-03-30T02:30:00,1\n");
    CHECK_THAT(refusal(folder, options),
               Contains("a.csv:3: time '2031-03-30T02:30:00' does not exist in Europe/Berlin"));
    options.time_zone = "Europe/Berlln";
    CHECK(refusal(folder, options) ==
          "record.time_zone: there is no zone 'Europe/Berlln'; did you mean "
          "'Europe/Berlin'?");
}

TEST_CASE("bad text is refused with file, line and what mends it", "[record]") {
    const fs::path folder = fresh_folder("gather_bad");
    const auto check = [&folder](const std::string& content, const std::string& expected) {
        put(folder / "a.csv", content);
        CHECK(refusal(folder, {}) == expected);
    };
    check("", "a.csv: is empty; it holds no row of numbers");
    check("time,1,2\n", "a.csv:1: holds a header and no row of numbers; give a file with data");
    check(
        std::string("time,1\n\0\0\0", 10),
        "a.csv: holds zero bytes, so it is not text in UTF-8; give a text file, or record.layout = "
        "\"grid\" for NetCDF");
    check("time,1,2\n2031-01-01T00:00:00Z,1\n",
          "a.csv:2: has 2 cells where the header has 3; complete or remove the line");
    check(
        "time,1,2\n2031-01-01T00:00:00Z,1,1O\n",
        "a.csv:2: column 3: '1O' is no temperature; correct it, or add the text to record.missing");
    check("time,1,3,2\n2031-01-01T00:00:00Z,1,1,1\n",
          "a.csv:1: distance 2 m comes after 3 m; the distances of a header must increase, each "
          "once");
    check("time,1\n01/02/2031 00:00,1\n",
          "a.csv:2: time '01/02/2031 00:00' is not ISO 8601 (2031-04-05T06:07:08Z); say "
          "record.text.time_format");
    check("a,b,c\n1,2,3\n",
          "a.csv:1: the layout cannot be told from the columns 'a', 'b', 'c'; say "
          "record.layout and the columns' names in [record.text]");
    check(
        "time,1\n2031-01-01T00:00:00Z,nan\n",
        "record: no trace holds a single temperature; see record.missing, record.valid_range_c and "
        "the columns' names");
    check(
        "time,1,2\n2031-01-01T00:00:00Z,283.1,284.3\n",
        "record: 2 of 2 temperatures lie outside -80 to 120 degC (their mean is 283.7 as written); "
        "they look like kelvin: set record.temperature_unit = \"K\"");
    check("time,1\n2031-01-01T00:00:00Z,1\n2031-01-01T00:00:00Z,2\n",
          "a.csv:3: a trace of 2031-01-01T00:00:00Z stands here and in a.csv:2 with other values; "
          "take "
          "one out, or say record.duplicates = \"first\" or \"mean\"");
}

TEST_CASE("files of other distances are refused unless the campaign says how", "[record]") {
    const fs::path folder = fresh_folder("gather_axes");
    put(folder / "a.csv", "time,1,2,3\n2031-01-01T00:00:00Z,10,20,30\n");
    put(folder / "b.csv", "time,1.1,2.1,3.1\n2031-01-01T00:05:00Z,11,21,31\n");
    CHECK(refusal(folder, {}) ==
          "b.csv: has 3 distances from 1.1 to 3.1 m, but a.csv has 3 distances "
          "from 1 to 3 m, first apart at the 1. (1 and 1.1 m); say record.align = "
          "\"nearest\" or \"linear\" to bring them to the first");
    campaign::Record options;
    options.files = {"*.csv"};
    options.align = campaign::Align::nearest;
    KeepSink nearest;
    gather(options, folder, nearest);
    CHECK(nearest.temperature_degC[1](2) == 31.0F);
    options.align = campaign::Align::linear;
    KeepSink linear;
    gather(options, folder, linear);
    CHECK(std::isnan(linear.temperature_degC[1](0)));
    CHECK(linear.temperature_degC[1](1) == Approx(20.0));
    CHECK(linear.temperature_degC[1](2) == Approx(30.0));
}

TEST_CASE("duplicates are averaged or the first is kept where the campaign says so", "[record]") {
    const fs::path folder = fresh_folder("gather_duplicates");
    put(folder / "a.csv", "time,1\n2031-01-01T00:00:00Z,1\n2031-01-01T00:00:00Z,2\n"
                          "2031-01-01T00:00:00Z,6\n2031-01-01T00:01:00Z,5\n");
    campaign::Record options;
    options.files = {"a.csv"};
    options.duplicates = campaign::Duplicates::mean;
    KeepSink mean;
    CHECK(gather(options, folder, mean).first.duplicates == 2);
    CHECK(mean.temperature_degC[0](0) == Approx(3.0));
    CHECK(mean.temperature_degC[1](0) == 5.0F);
    options.duplicates = campaign::Duplicates::first;
    KeepSink first;
    gather(options, folder, first);
    CHECK(first.temperature_degC[0](0) == 1.0F);
}

TEST_CASE("a gzip stream that is cut short is refused", "[record]") {
    const fs::path folder = fresh_folder("gather_cut");
    std::string text = "time,1\n";
    for (int i = 0; i < 5000; ++i)
        text += "2031-01-01T00:00:00Z," + std::to_string(i * 7919 % 100) + "\n";
    put_gzip(folder / "whole.gz", text);
    std::ifstream in{folder / "whole.gz", std::ios::binary};
    const std::string whole{std::istreambuf_iterator<char>{in}, {}};
    fs::remove(folder / "whole.gz");
    put(folder / "a.csv.gz", whole.substr(0, whole.size() / 2));
    campaign::Record options;
    options.files = {"a.csv.gz"};
    CHECK(refusal(folder, options) ==
          "a.csv.gz: the gzip stream is cut short; copy the file again");
}

TEST_CASE("powers come beside temperatures", "[record]") {
    const fs::path folder = fresh_folder("gather_powers");
    put(folder / "a.csv",
        "time,distance,temperature,st,ast\n2031-01-01T00:00:00Z,1,10,100.5,50.25\n"
        "2031-01-01T00:00:00Z,2,11,99.5,49.25\n");
    campaign::Record options;
    options.files = {"a.csv"};
    options.text.stokes_column = "st";
    options.text.antistokes_column = "ast";
    KeepSink sink;
    gather(options, folder, sink);
    REQUIRE(sink.head.quantities.size() == 3);
    CHECK(sink.head.quantities[2] == record::Quantity::antistokes);
    CHECK(sink.all[0][1](0) == 100.5F);
    CHECK(sink.all[0][2](1) == 49.25F);
}

TEST_CASE("random matrices come back exactly through wide, tall and single", "[record][property]") {
    std::mt19937 random{20310405};
    std::uniform_real_distribution<float> any{-40.0F, 60.0F};
    for (int round = 0; round < 5; ++round) {
        const int n = 1 + static_cast<int>(random() % 7U), m = 2 + static_cast<int>(random() % 9U);
        std::vector<std::vector<float>> matrix;
        std::string wide_text = "time", tall_text = "time,distance,temperature\n";
        const fs::path folder = fresh_folder("gather_random");
        for (int j = 0; j < m; ++j)
            wide_text += "," + text::number(j * 0.25);
        wide_text += "\n";
        for (int i = 0; i < n; ++i) {
            const std::string stamp = text::iso_time(start_s + 60.0 * i);
            std::string single = "# " + stamp + "\ndistance,temperature\n";
            matrix.emplace_back();
            wide_text += stamp;
            for (int j = 0; j < m; ++j) {
                const float v = any(random);
                matrix.back().push_back(v);
                const std::string cell = text::number(static_cast<double>(v));
                wide_text += "," + cell;
                tall_text += stamp + "," + text::number(j * 0.25) + "," + cell + "\n";
                single += text::number(j * 0.25) + "," + cell + "\n";
            }
            wide_text += "\n";
            put(folder / ("single" + std::to_string(i) + ".txt"), single);
        }
        put(folder / "wide.csv", wide_text);
        put(folder / "tall.csv", tall_text);
        for (const char* pattern : {"wide.csv", "tall.csv", "single*.txt"}) {
            campaign::Record options;
            options.files = {pattern};
            KeepSink sink;
            gather(options, folder, sink);
            REQUIRE(sink.temperature_degC.size() == matrix.size());
            for (std::size_t i = 0; i < matrix.size(); ++i)
                for (std::size_t j = 0; j < matrix[i].size(); ++j)
                    CHECK(sink.temperature_degC[i](static_cast<Eigen::Index>(j)) == matrix[i][j]);
        }
    }
}

TEST_CASE("spoilt text gives words and nothing else", "[record][property]") {
    std::mt19937 random{815};
    const fs::path folder = fresh_folder("gather_spoilt");
    const std::vector<std::string> whole{wide(",", "", "\n", plain, iso), tall(0, 1),
                                         trace(0, "# " + iso[0] + "\n")};
    int refused = 0;
    for (int i = 0; i < 900; ++i) {
        std::string spoilt = whole[static_cast<std::size_t>(i) % 3U];
        for (int k = 0; k < 2; ++k)
            spoilt[random() % spoilt.size()] = static_cast<char>(random() % 256U);
        put(folder / "a.csv", spoilt);
        if (refusal(folder, {}) != "(taken)")
            ++refused;
    }
    CHECK(refused > 200);
    CHECK(refused < 900);
}
