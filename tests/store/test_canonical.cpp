// SPDX-License-Identifier: Apache-2.0
#include "helpers.hpp"
#include "store/metadata.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <tbb/parallel_for.h>

#include <atomic>
#include <bit>
#include <cmath>
#include <limits>

using namespace rillstrand;
using namespace rillstrand::testing;
using Catch::Matchers::Contains;
using record::Quantity;
using store::Packing;

TEST_CASE("every float returns from the canonical record", "[store][property]") {
    std::mt19937_64 random{20310405};
    const fs::path folder = fresh_folder("round_trip");
    struct Shape {
        Eigen::Index rows, columns;
        double interval_s;
    };
    const std::vector<Shape> shapes{{1, 1, 300.0},     {7, 3, 60.0},       {288, 256, 300.0},
                                    {289, 257, 300.0}, {1000, 300, 300.0}, {50, 700, 7.7},
                                    {97, 513, 3600.0}};
    for (const Shape& shape : shapes)
        for (const double step : {0.01, 0.001, 1.0 / 128.0}) {
            CAPTURE(shape.rows, shape.columns, step);
            const Eigen::ArrayXXf values = on_grid(shape.rows, shape.columns, step, random);
            const Packing packing = write_record(folder / "r.nc", values, shape.interval_s);
            const auto source = store::open_canonical(folder / "r.nc");
            CHECK(differing(read_all(*source), values) == 0);
            if (values.size() < 1000)
                continue;
            CHECK(packing == (step == 0.01    ? Packing::hundredths
                              : step == 0.001 ? Packing::thousandths
                                              : Packing::floating));
        }
}

TEST_CASE("any bits of a float return, whatever they mean", "[store][property]") {
    std::mt19937_64 random{7};
    const fs::path folder = fresh_folder("any_bits");
    Eigen::ArrayXXf values(40, 33);
    for (Eigen::Index k = 0; k < values.size(); ++k)
        values.data()[k] = std::bit_cast<float>(static_cast<std::uint32_t>(random()));
    values(0, 0) = -0.0F;
    values(0, 1) = std::numeric_limits<float>::infinity();
    values(0, 2) = std::numeric_limits<float>::denorm_min();
    CHECK(write_record(folder / "r.nc", values, 60.0) == Packing::floating);
    CHECK(differing(read_all(*store::open_canonical(folder / "r.nc")), values) == 0);
}

TEST_CASE("all hundredths of int16 return from their packing", "[store][property]") {
    const fs::path folder = fresh_folder("hundredths");
    Eigen::ArrayXXf values(255, 257);
    for (Eigen::Index k = 0; k < values.size(); ++k)
        values.data()[k] =
            static_cast<float>(static_cast<double>(k - 32767) / 100.0); // as a text is parsed
    CHECK(write_record(folder / "r.nc", values, 600.0) == Packing::hundredths);
    CHECK(differing(read_all(*store::open_canonical(folder / "r.nc")), values) == 0);
}

TEST_CASE("a late value that does not fit widens what was written", "[store][property]") {
    std::mt19937_64 random{11};
    const fs::path folder = fresh_folder("widen");
    const Eigen::Index rows = 900;
    for (const Eigen::Index late : {0, 287, 288, 289, 575, 899}) {
        Eigen::ArrayXXf values = on_grid(rows, 300, 0.01, random);
        values(late, 299) = 12.345F;
        CAPTURE(late);
        CHECK(write_record(folder / "r.nc", values, 300.0) == Packing::thousandths);
        CHECK(differing(read_all(*store::open_canonical(folder / "r.nc")), values) == 0);
        values(rows - 1, 0) = 1.0F / 3.0F;
        CHECK(write_record(folder / "r.nc", values, 300.0) == Packing::floating);
        CHECK(differing(read_all(*store::open_canonical(folder / "r.nc")), values) == 0);
        CHECK_FALSE(fs::exists(folder / "r.nc.wider"));
    }
    Eigen::ArrayXXf warm = on_grid(400, 20, 0.01, random);
    warm(399, 19) = 327.68F; // one beyond int16
    CHECK(write_record(folder / "r.nc", warm, 300.0) == Packing::thousandths);
}

TEST_CASE("powers stand beside temperature as they are", "[store]") {
    std::mt19937_64 random{3};
    const fs::path folder = fresh_folder("powers");
    const Eigen::ArrayXXf t = on_grid(300, 40, 0.01, random);
    const Eigen::ArrayXXf s = on_grid(300, 40, 0.01, random) * 317.3F;
    auto head = head_of(40, 300.0);
    head.quantities = {Quantity::temperature, Quantity::stokes};
    {
        store::CanonicalWriter writer{folder / "r.nc", head};
        for (Eigen::Index i = 0; i < t.rows(); ++i)
            writer.add_row(1.9e9 + 300.0 * static_cast<double>(i),
                           {t.row(i).transpose(), s.row(i).transpose()});
        writer.finish();
        CHECK(writer.packing() == Packing::hundredths);
        CHECK(writer.n_time() == 300);
    }
    const auto source = store::open_canonical(folder / "r.nc");
    CHECK(source->has(Quantity::stokes));
    CHECK_FALSE(source->has(Quantity::antistokes));
    CHECK(differing(read_all(*source), t) == 0);
    CHECK(differing(read_all(*source, Quantity::stokes), s) == 0);
    CHECK(source->axes().interval_s == 300.0);
    CHECK(source->axes().time_s(299) == 1.9e9 + 300.0 * 299);
}

TEST_CASE("tiles of any place and size are those of the whole, from many threads", "[store]") {
    std::mt19937_64 random{5};
    const fs::path folder = fresh_folder("tiles");
    const Eigen::ArrayXXf values = on_grid(700, 600, 0.01, random);
    write_record(folder / "r.nc", values, 300.0);
    const auto source = store::open_canonical(folder / "r.nc");
    CHECK(source->block_rows() == 288);
    CHECK(source->block_columns() == 256);
    std::atomic<Eigen::Index> wrong = 0;
    tbb::parallel_for(0, 200, [&](int k) {
        std::mt19937 mine{static_cast<unsigned>(k)};
        const auto pick = [&](Eigen::Index n) {
            return static_cast<Eigen::Index>(mine() % static_cast<unsigned>(n));
        };
        const Eigen::Index i = pick(700), j = pick(600);
        const Eigen::Index rows = 1 + pick(700 - i), columns = 1 + pick(600 - j);
        Eigen::ArrayXXf larger(rows + 3, columns); // a target whose columns are not packed
        source->read(Quantity::temperature, i, j, larger.topRows(rows));
        wrong += differing(larger.topRows(rows), values.block(i, j, rows, columns));
    });
    CHECK(wrong == 0);
}

TEST_CASE("a row of chunks stays under 8 MiB and divides the day", "[store]") {
    CHECK(store::chunk_rows(300.0, 4000, 2) == 288);
    CHECK(store::chunk_rows(300.0, 40000, 2) == 96);
    CHECK(store::chunk_rows(30.0, 4000, 2) == 960);
    CHECK(store::chunk_rows(86400.0, 10, 4) == 1);
    CHECK(store::chunk_rows(7.7, 100, 2) == 288); // no divisor of a day: that of 5 minutes
    CHECK(store::chunk_rows(60.0, 10'000'000, 4) == 1);
}

TEST_CASE("an unfinished record leaves nothing behind", "[store]") {
    const fs::path folder = fresh_folder("unfinished");
    {
        store::CanonicalWriter writer{folder / "r.nc", head_of(10, 60.0)};
        for (int i = 0; i < 3000; ++i)
            writer.add_row(60.0 * i, {Eigen::ArrayXf::Constant(10, 1.25F)});
    }
    CHECK(fs::is_empty(folder));
    CHECK_THROWS_AS(store::CanonicalWriter(folder / "none" / "r.nc", head_of(10, 60.0)),
                    MachineError);
    auto head = head_of(10, 60.0);
    head.distance_m(5) = head.distance_m(4);
    CHECK_THROWS_WITH(store::CanonicalWriter(folder / "r.nc", head), Contains("must increase"));
    store::CanonicalWriter empty{folder / "r.nc", head_of(10, 60.0)};
    CHECK_THROWS_WITH(empty.finish(), Contains("the record has no trace"));
}

TEST_CASE("a broken canonical record is refused by name", "[store]") {
    std::mt19937_64 random{9};
    const fs::path folder = fresh_folder("broken");
    const Eigen::ArrayXXf values = on_grid(600, 300, 0.01, random);
    write_record(folder / "r.nc", values, 300.0);
    CHECK_THROWS_WITH(store::open_canonical(folder / "none.nc"), Contains("there is no such file"));
    const auto size = fs::file_size(folder / "r.nc");
    for (const double share : {0.1, 0.5, 0.9, 0.999}) {
        fs::copy_file(folder / "r.nc", folder / "cut.nc", fs::copy_options::overwrite_existing);
        fs::resize_file(folder / "cut.nc",
                        static_cast<std::uintmax_t>(static_cast<double>(size) * share));
        CAPTURE(share);
        CHECK_THROWS_WITH(store::open_canonical(folder / "cut.nc"), Contains("cut.nc: "));
    }
    // Bytes turned over inside: refused, or other numbers, but no crash.
    for (int k = 0; k < 60; ++k) {
        fs::copy_file(folder / "r.nc", folder / "bad.nc", fs::copy_options::overwrite_existing);
        {
            std::FILE* file = std::fopen((folder / "bad.nc").c_str(), "r+b");
            std::fseek(file, static_cast<long>(random() % size), SEEK_SET);
            const std::uint64_t noise = random();
            std::fwrite(&noise, 1, 8, file);
            std::fclose(file);
        }
        try {
            read_all(*store::open_canonical(folder / "bad.nc"));
        } catch (const DataError& error) {
            CHECK_THAT(error.what(), Contains("bad.nc: "));
        }
    }
}
