// SPDX-License-Identifier: Apache-2.0
#include "stream/solve.hpp"

#include <algorithm>
#include <cmath>

namespace rillstrand::stream {

namespace {

/// Median standard deviation of a step, from some forty places.
double usual_step_sd(const Frame& frame, const Reading& reading) {
    const Whitener whitener = reading.whitener(frame);
    const Eigen::Index n = frame.n_place();
    std::vector<double> sds;
    const Eigen::Index apart = std::max<Eigen::Index>(1, n / 40);
    Eigen::ArrayXd shape = Eigen::ArrayXd::Ones(n);
    Eigen::VectorXd white(n);
    for (Eigen::Index j = apart; j + apart < n; j += apart) {
        const Eigen::Index length = n - j;
        whitener.apply_from(j, shape.head(length), white.head(length));
        sds.push_back(1.0 / white.head(length).norm());
    }
    return median(std::move(sds));
}

bool same(const std::vector<Piece>& a, const std::vector<Piece>& b) {
    return std::equal(a.begin(), a.end(), b.begin(), b.end(), [](const Piece& x, const Piece& y) {
        return x.type == y.type && std::abs(x.at_m - y.at_m) <= 0.3;
    });
}

/// The sharpest readings, and those that judge: without constants, of nights.
void keep_useful(std::vector<Reading>& sorted) {
    const std::size_t most = 4;
    std::vector<Reading> kept;
    bool no_constants = false, nights = false;
    for (Reading& r : sorted) {
        const bool out = shuts_constants_out(r.weighting);
        if (kept.size() < most || (out && !no_constants) || (r.weighting.nights && !nights)) {
            no_constants = no_constants || out;
            nights = nights || r.weighting.nights;
            kept.push_back(std::move(r));
        }
    }
    sorted = std::move(kept);
}

} // namespace

bool shuts_constants_out(const Weighting& weighting) {
    return std::abs(weighting.total) < 1e-5 * weighting.weight.abs().sum();
}

Reading read(const Frame& frame, const Weighting& weighting, const std::vector<Piece>& pieces,
             const Roughness* start) {
    Reading reading;
    reading.weighting = weighting;
    reading.profile = make_profile(frame, weighting);
    const Eigen::MatrixXd columns = make_columns(pieces, frame.place_m, frame.response_sd_m);
    reading.rough = estimate_roughness(frame.place_m, reading.profile.value,
                                       reading.profile.white_variance, columns, stiff_m, start);
    reading.usual_sd = usual_step_sd(frame, reading);
    return reading;
}

Solution solve(const Frame& frame, const std::vector<Weighting>& weightings,
               const std::vector<Piece>& declared, double family, double inflow_sd_K) {
    Solution solution;
    solution.levels = make_levels(frame.place_m, frame.response_sd_m, family);
    std::vector<Piece> pieces = declared;
    const auto error = [&](const Reading& r) {
        return std::hypot(r.usual_sd, 0.05 * r.weighting.total * inflow_sd_K);
    };
    const auto less = [&](const Reading& a, const Reading& b) { return error(a) < error(b); };
    for (const Weighting& w : weightings)
        solution.readings.push_back(read(frame, w, pieces));
    std::sort(solution.readings.begin(), solution.readings.end(), less);
    keep_useful(solution.readings);
    solution.reading = solution.readings.front();
    for (int round = 0; round < 4; ++round) {
        std::vector<Piece> now = find_pieces(
            frame.place_m, solution.reading.profile.value, solution.reading.variance(),
            solution.reading.rough.roughness2, frame.response_sd_m, solution.levels, declared);
        const bool done = round > 0 && same(now, pieces);
        pieces = std::move(now);
        // the pieces belong to the weighting in which they were found: it changes only in the
        // first rounds, while they are few
        if (round < 2) {
            for (Reading& r : solution.readings)
                r = read(frame, r.weighting, pieces, &r.rough);
            const Reading& next =
                *std::min_element(solution.readings.begin(), solution.readings.end(), less);
            const bool stays = next.weighting.name == solution.reading.weighting.name;
            solution.reading = next;
            if (stays && done)
                break;
            continue;
        }
        solution.reading = read(frame, solution.reading.weighting, pieces, &solution.reading.rough);
        if (done)
            break;
    }
    for (Reading& r : solution.readings)
        r = read(frame, r.weighting, pieces, &r.rough);
    solution.pieces = std::move(pieces);
    return solution;
}

} // namespace rillstrand::stream
