// SPDX-License-Identifier: Apache-2.0
// Snow interpretation against simulated hillsides, season by season: the table of DEVELOPERS.md.
//   rillstrand_snow_honesty [first seed] [last seed] [air]
#include "snow/judge.hpp"

#include <cmath>
#include <cstdlib>
#include <iomanip>
#include <iostream>
#include <string_view>

using namespace rillstrand;

int main(int argc, char** argv) {
    const auto first = argc > 1 ? std::strtoull(argv[1], nullptr, 10) : 501;
    const auto last = argc > 2 ? std::strtoull(argv[2], nullptr, 10) : first + 7;
    const bool with_air = argc > 3 && std::string_view{argv[3]} == "air";
    const std::pair<hillside::Season, const char*> seasons[] = {
        {hillside::Season::melt_out, "melt-out"},
        {hillside::Season::whole_winter, "winter"},
        {hillside::Season::thin_and_grey, "thin and grey"}};
    std::cout << std::fixed << std::setprecision(4);
    for (const auto& [season, name] : seasons) {
        hillside::Score s;
        for (auto seed = first; seed <= last; ++seed) {
            hillside::Setup setup;
            setup.season = season;
            setup.seed = seed;
            setup.noise_K = 0.05 + 0.02 * static_cast<double>(seed % 6);
            const hillside::Hillside h = make_hillside(setup);
            judge(h, snow::interpret(input_of(h, setup, with_air)), s);
        }
        std::cout << name << ": right " << s.right / s.days << ", Brier " << s.brier / s.days
                  << ", reliability " << s.reliability() << ", melt-out within a day "
                  << s.melts_near / s.melts << ", inside 2 sd " << s.melts_inside / s.melts
                  << ", covered share rms " << std::sqrt(s.cover_square / s.covers)
                  << ", inside 2 sd " << s.cover_inside / s.covers;
        if (s.grey > 0.0)
            std::cout << ", grey week right " << s.grey_right / s.grey;
        std::cout << '\n';
    }
    return 0;
}
