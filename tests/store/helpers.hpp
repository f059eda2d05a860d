// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "store/canonical.hpp"
#include "store/open.hpp"

#include <array>
#include <cstdio>
#include <filesystem>
#include <random>
#include <string>
#include <vector>

namespace rillstrand::testing {

namespace fs = std::filesystem;

inline fs::path fresh_folder(const std::string& name) {
    fs::path folder = fs::path{RILLSTRAND_SCRATCH} / name;
    fs::remove_all(folder);
    fs::create_directories(folder);
    return folder;
}

/// What a command prints on both streams, and its status.
struct Said {
    int status = 0;
    std::string text;
};

inline Said run(const std::string& command) {
    Said said;
    std::FILE* pipe = popen((command + " 2>&1").c_str(), "r"); // NOLINT(cert-env33-c): a test
    std::array<char, 4096> buffer{};
    while (const auto n = std::fread(buffer.data(), 1, buffer.size(), pipe))
        said.text.append(buffer.data(), n);
    said.status = pclose(pipe);
    return said;
}

inline Said python(const std::string& script, const std::string& arguments) {
    return run("/usr/bin/python3 -W ignore " + std::string{RILLSTRAND_TEST_DATA} + "/" + script +
               " " + arguments);
}

inline bool same(float a, float b) {
    return a == b || (a != a && b != b);
}

/// Number of values that differ, NaN being equal to NaN.
inline Eigen::Index differing(const Eigen::ArrayXXf& a, const Eigen::ArrayXXf& b) {
    if (a.rows() != b.rows() || a.cols() != b.cols())
        return a.size() + b.size();
    Eigen::Index n = 0;
    for (Eigen::Index k = 0; k < a.size(); ++k)
        n += same(a.data()[k], b.data()[k]) ? 0 : 1;
    return n;
}

inline Eigen::ArrayXXf read_all(const record::Source& source,
                                record::Quantity quantity = record::Quantity::temperature) {
    Eigen::ArrayXXf all(source.axes().n_time(), source.axes().n_place());
    source.read(quantity, 0, 0, all);
    return all;
}

/// Values on a grid of `step`, with a share of missing ones.
inline Eigen::ArrayXXf on_grid(Eigen::Index rows, Eigen::Index columns, double step,
                               std::mt19937_64& random) {
    std::normal_distribution<double> spread{10.0, 8.0};
    std::uniform_real_distribution<double> chance{0.0, 1.0};
    Eigen::ArrayXXf values(rows, columns);
    for (Eigen::Index k = 0; k < values.size(); ++k)
        values.data()[k] =
            chance(random) < 0.02
                ? std::numeric_limits<float>::quiet_NaN()
                : static_cast<float>(std::round(spread(random) / step) / std::round(1.0 / step));
    return values;
}

inline store::CanonicalHead head_of(Eigen::Index places, double interval_s) {
    store::CanonicalHead head;
    head.distance_m =
        Eigen::ArrayXd::LinSpaced(places, 0.0, 0.25 * static_cast<double>(places - 1));
    head.interval_s = interval_s;
    return head;
}

inline store::Packing write_record(const fs::path& path, const Eigen::ArrayXXf& values,
                                   double interval_s, double begin_s = 1.9e9) {
    store::CanonicalWriter writer{path, head_of(values.cols(), interval_s)};
    for (Eigen::Index i = 0; i < values.rows(); ++i)
        writer.add_row(begin_s + static_cast<double>(i) * interval_s, {values.row(i).transpose()});
    writer.finish();
    return writer.packing();
}

} // namespace rillstrand::testing
