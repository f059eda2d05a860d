// SPDX-License-Identifier: Apache-2.0
#include "output.hpp"
#include "sha256.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <filesystem>
#include <fstream>
#include <sstream>

namespace fs = std::filesystem;
using namespace rillstrand;
using Catch::Matchers::Contains;

namespace {

fs::path fresh_folder(const std::string& name) {
    const fs::path folder = fs::path{RILLSTRAND_SCRATCH} / name;
    fs::remove_all(folder);
    fs::create_directories(folder.parent_path());
    return folder;
}

void put(const fs::path& path, const std::string& content) {
    fs::create_directories(path.parent_path());
    std::ofstream{path, std::ios::binary} << content;
}

std::string content_of(const fs::path& path) {
    std::ifstream file{path, std::ios::binary};
    std::stringstream text;
    text << file.rdbuf();
    return text.str();
}

std::size_t entries(const fs::path& folder) {
    return static_cast<std::size_t>(
        std::distance(fs::directory_iterator{folder}, fs::directory_iterator{}));
}

} // namespace

TEST_CASE("a committed run replaces its own files and touches nothing else", "[commands]") {
    const fs::path folder = fresh_folder("output_commit");
    put(folder / "findings.json", "old");
    put(folder / "notes.txt", "mine");
    app::Output output{folder};
    output.write("findings.json", "new");
    output.write("tables/inflows.csv", "a\n");
    CHECK(content_of(folder / "findings.json") == "old");
    const auto names = output.commit();
    CHECK(names == std::vector<fs::path>{"findings.json", "tables/inflows.csv"});
    CHECK(content_of(folder / "findings.json") == "new");
    CHECK(content_of(folder / "tables/inflows.csv") == "a\n");
    CHECK(content_of(folder / "notes.txt") == "mine");
    CHECK(entries(folder) == 3);
}

TEST_CASE("a run that ends without commit leaves the folder as it was", "[commands]") {
    const fs::path folder = fresh_folder("output_failed");
    put(folder / "findings.json", "old");
    {
        const app::Output output{folder};
        output.write("findings.json", "new");
    }
    CHECK(content_of(folder / "findings.json") == "old");
    CHECK(entries(folder) == 1);
}

TEST_CASE("a second run on the same folder is refused while the first lasts", "[commands]") {
    const fs::path folder = fresh_folder("output_locked");
    {
        const app::Output first{folder};
        CHECK_THROWS_WITH(app::Output{folder}, Contains("another run is writing into this folder"));
    }
    CHECK_NOTHROW(app::Output{folder});
}

TEST_CASE("what a killed run had begun to put in place is carried out", "[commands]") {
    const fs::path folder = fresh_folder("output_killed");
    put(folder / "findings.json", "new, moved before the kill");
    put(folder / "report.html", "old");
    put(folder / ".rillstrand-staging-abc/report.html", "new");
    put(folder / ".rillstrand-pending", ".rillstrand-staging-abc\nfindings.json\nreport.html\n.\n");
    const app::Output output{folder};
    CHECK(content_of(folder / "report.html") == "new");
    CHECK(content_of(folder / "findings.json") == "new, moved before the kill");
    CHECK_FALSE(fs::exists(folder / ".rillstrand-pending"));
    CHECK_FALSE(fs::exists(folder / ".rillstrand-staging-abc"));
}

TEST_CASE("a list cut short by a kill changes nothing", "[commands]") {
    const fs::path folder = fresh_folder("output_cut");
    put(folder / "report.html", "old");
    put(folder / ".rillstrand-staging-abc/report.html", "new");
    put(folder / ".rillstrand-pending", ".rillstrand-staging-abc\nreport.html\n");
    const app::Output output{folder};
    CHECK(content_of(folder / "report.html") == "old");
}

TEST_CASE("a pending list cannot name places outside the folder", "[commands]") {
    const fs::path folder = fresh_folder("output_outside/out");
    put(folder.parent_path() / "victim.txt", "safe");
    put(folder / ".rillstrand-staging-abc/victim.txt", "changed");
    put(folder / ".rillstrand-pending", ".rillstrand-staging-abc\n../victim.txt\n.\n");
    const app::Output output{folder};
    CHECK(content_of(folder.parent_path() / "victim.txt") == "safe");
}

TEST_CASE("links inside the output folder are not followed", "[commands]") {
    const fs::path folder = fresh_folder("output_links/out");
    const fs::path outside = folder.parent_path() / "outside";
    fs::create_directories(outside);
    put(outside / "report.html", "theirs");
    fs::create_directories(folder);
    fs::create_symlink(outside / "report.html", folder / "report.html");
    fs::create_directory_symlink(outside, folder / "tables");
    {
        app::Output output{folder};
        output.write("report.html", "ours");
        output.commit();
    }
    CHECK(content_of(outside / "report.html") == "theirs");
    CHECK(content_of(folder / "report.html") == "ours");
    app::Output output{folder};
    output.write("tables/inflows.csv", "a\n");
    CHECK_THROWS_WITH(output.commit(), Contains("is a symbolic link"));
    CHECK_FALSE(fs::exists(outside / "inflows.csv"));
}

TEST_CASE("an output folder that cannot be is named with what mends it", "[commands]") {
    const fs::path file = fresh_folder("output_file");
    put(file, "");
    CHECK_THROWS_WITH(app::Output{file},
                      Contains("is not a folder; name a folder in campaign.output"));
}

// FIPS 180-4 example computations, SHA-256 of "abc" (from memory; every implementation prints it).
TEST_CASE("digests match the published example", "[commands][published]") {
    const fs::path file = fresh_folder("sha/abc.txt");
    put(file, "abc");
    CHECK(app::sha256_of(file) ==
          "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
}
