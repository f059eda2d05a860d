// SPDX-License-Identifier: Apache-2.0
#include "store/gdal_grid.hpp"

#include "base/error.hpp"
#include "base/text.hpp"
#include "store/library.hpp"

#include <algorithm>
#include <charconv>
#include <cmath>
#include <numeric>

namespace rillstrand::store {

namespace {

/// Keeps GDAL from printing while this lives.
class Quiet {
public:
    Quiet() { CPLPushErrorHandler(CPLQuietErrorHandler); }
    Quiet(const Quiet&) = delete;
    Quiet& operator=(const Quiet&) = delete;
    Quiet(Quiet&&) = delete;
    Quiet& operator=(Quiet&&) = delete;
    ~Quiet() { CPLPopErrorHandler(); }
};

std::string gdal_reason() {
    std::string reason = CPLGetLastErrorMsg();
    std::replace(reason.begin(), reason.end(), '\n', ' ');
    return reason.empty() ? "the library gives no reason" : reason;
}

/// Bytes of a file, or of all files in a folder.
double bytes_of(const std::filesystem::path& path) {
    std::error_code ignored;
    if (!std::filesystem::is_directory(path))
        return static_cast<double>(std::filesystem::file_size(path, ignored));
    double bytes = 0.0;
    for (const auto& entry : std::filesystem::recursive_directory_iterator{path})
        if (entry.is_regular_file(ignored))
            bytes += static_cast<double>(entry.file_size(ignored));
    return bytes;
}

std::optional<double> number_of(const Array& array, const char* name) {
    const auto attribute = array->GetAttribute(name);
    if (!attribute || attribute->GetDataType().GetClass() != GEDTC_NUMERIC)
        return {};
    if (attribute->GetTotalElementsCount() != 1)
        return {};
    const double value = attribute->ReadAsDouble();
    if (attribute->GetDataType().GetNumericDataType() != GDT_Float32)
        return value;
    // A scale written as float32 means the decimal that it is the nearest float of.
    std::array<char, 32> digits{};
    const auto end =
        std::to_chars(digits.data(), digits.data() + digits.size(), static_cast<float>(value)).ptr;
    return text::parse_number({digits.data(), static_cast<std::size_t>(end - digits.data())})
        .value_or(value);
}

class General final : public Tiles {
public:
    General(std::shared_ptr<const GdalGrid> grid, Array array)
        : m_grid{std::move(grid)}, m_array{std::move(array)} {
        const auto sizes = m_array->GetBlockSize();
        const auto& dimensions = m_array->GetDimensions();
        for (std::size_t k = 0; k < 2; ++k) {
            const auto whole = static_cast<std::size_t>(dimensions[k]->GetSize());
            m_block[k] = sizes.size() == 2 && sizes[k] > 0
                             ? std::min(whole, static_cast<std::size_t>(sizes[k]))
                             : std::min<std::size_t>(whole, 256);
        }
    }
    General(const General&) = delete;
    General& operator=(const General&) = delete;
    General(General&&) = delete;
    General& operator=(General&&) = delete;
    ~General() override {
        const LibraryLock lock;
        m_array.reset();
        m_grid.reset();
    }

    std::array<std::size_t, 2> block_size() const override { return m_block; }
    void read(const Block& block, const Decoding& decoding, Target<float> to) const override {
        read_as(block, decoding, to);
    }
    void read(const Block& block, const Decoding& decoding, Target<double> to) const override {
        read_as(block, decoding, to);
    }

private:
    template <typename Value>
    void read_as(const Block& block, const Decoding& decoding, Target<Value> to) const {
        if (block.n_a == 0 || block.n_b == 0)
            return;
        std::vector<double> stored(block.n_a * block.n_b);
        const std::array<GUInt64, 2> begin{block.a, block.b};
        const std::array<std::size_t, 2> count{block.n_a, block.n_b};
        {
            const LibraryLock lock;
            const Quiet quiet;
            CPLErrorReset();
            if (!m_array->Read(begin.data(), count.data(), nullptr, nullptr,
                               GDALExtendedDataType::Create(GDT_Float64), stored.data()) ||
                CPLGetLastErrorType() == CE_Failure)
                m_grid->refuse("the block that begins at row " + std::to_string(block.a) +
                               ", column " + std::to_string(block.b) + " cannot be read (" +
                               gdal_reason() + "); copy the file again from where it came from");
        }
        std::vector<Value> values(stored.size());
        decoding(stored.data(), stored.size(), values.data());
        scatter<Value>(values.data(), block.n_b, block.n_a, block.n_b, to);
    }

    std::shared_ptr<const GdalGrid> m_grid;
    Array m_array;
    std::array<std::size_t, 2> m_block{};
};

} // namespace

GdalGrid::GdalGrid(std::filesystem::path file) : m_file{std::move(file)} {
    std::error_code ignored;
    const std::string name = m_file.string();
    if (name.rfind("/vsi", 0) == 0 || !std::filesystem::exists(m_file, ignored))
        refuse("there is no such local file or folder");
    const bool folder = std::filesystem::is_directory(m_file, ignored);
    if (folder && !std::filesystem::exists(m_file / ".zgroup", ignored) &&
        !std::filesystem::exists(m_file / ".zarray", ignored))
        refuse("is a folder without .zgroup or .zarray, so not a whole Zarr store; copy it again "
               "with its hidden files");
    if (!folder && is_hdf5(m_file))
        refuse_other_files(m_file);
    open();
    check_claims();
}

GdalGrid::~GdalGrid() {
    const LibraryLock lock;
    m_root.reset();
    m_dataset.reset();
}

void GdalGrid::refuse(const std::string& what) const {
    throw DataError{m_file.string() + ": " + what};
}

void GdalGrid::open() {
    GDALAllRegister();
    const Quiet quiet;
    CPLErrorReset();
    const std::array<const char*, 3> drivers{"netCDF", "Zarr", nullptr};
    const std::string path = std::filesystem::absolute(m_file).string();
    m_dataset.reset(GDALDataset::Open(path.c_str(), GDAL_OF_MULTIDIM_RASTER | GDAL_OF_READONLY,
                                      drivers.data(), nullptr, nullptr));
    if (m_dataset)
        m_root = m_dataset->GetRootGroup();
    if (!m_root)
        refuse("is no NetCDF or Zarr file that can be opened (" + gdal_reason() +
               "); it is of another kind, cut short or broken");
}

/// A classic file holds each number in its bytes; deflate packs at most about 1,030 times, so that
/// 2,000 times is a claim that no honest file makes.
void GdalGrid::check_claims() const {
    constexpr double most_packed = 2000.0;
    constexpr double always_allowed = 64.0 * 1024.0 * 1024.0;
    double claimed = 0.0;
    for (const auto& name : names()) {
        const Array array = find(name);
        if (!array)
            continue;
        double size = static_cast<double>(array->GetDataType().GetSize());
        for (const auto& dimension : array->GetDimensions())
            size *= static_cast<double>(dimension->GetSize());
        claimed += size;
    }
    const double bytes = bytes_of(m_file);
    const bool packs = std::filesystem::is_directory(m_file) || is_hdf5(m_file);
    if (!packs && claimed > bytes)
        refuse("is cut short: its variables take " + text::number(claimed) +
               " bytes and the file has " + text::number(bytes) + "; copy it again");
    if (packs && claimed > most_packed * bytes + always_allowed)
        refuse("claims " + text::number(claimed) + " bytes of numbers in " + text::number(bytes) +
               " bytes of file, more than " + text::number(most_packed) +
               " times as many; it is broken or was never written to its end");
}

std::vector<std::string> GdalGrid::names() const {
    const Quiet quiet;
    return m_root->GetMDArrayNames();
}

Array GdalGrid::find(const std::string& name) const {
    const Quiet quiet;
    if (name.find('/') != std::string::npos)
        return m_root->OpenMDArrayFromFullname(name.front() == '/' ? name : "/" + name);
    return m_root->OpenMDArray(name);
}

Eigen::ArrayXd GdalGrid::read_all(const Array& array) const {
    const Quiet quiet;
    CPLErrorReset();
    const auto n = static_cast<std::size_t>(array->GetDimensions().front()->GetSize());
    Eigen::ArrayXd values(static_cast<Eigen::Index>(n));
    const GUInt64 begin = 0;
    if (n > 0 && (!array->Read(&begin, &n, nullptr, nullptr,
                               GDALExtendedDataType::Create(GDT_Float64), values.data()) ||
                  CPLGetLastErrorType() == CE_Failure))
        refuse("the variable \"" + array->GetName() + "\" cannot be read (" + gdal_reason() + ")");
    return values;
}

std::string text_of(const Array& array, const char* attribute) {
    const Quiet quiet;
    const auto found = array->GetAttribute(attribute);
    if (!found || found->GetDataType().GetClass() != GEDTC_STRING)
        return {};
    const char* value = found->ReadAsString();
    return value == nullptr ? "" : value;
}

std::string unit_of(const Array& array) {
    const std::string unit = array->GetUnit();
    return unit.empty() ? text_of(array, "units") : unit;
}

bool is_numeric(const Array& array) {
    return array->GetDataType().GetClass() == GEDTC_NUMERIC &&
           GDALDataTypeIsComplex(array->GetDataType().GetNumericDataType()) == 0;
}

Decoding decoding_of(const Array& array) {
    const Quiet quiet;
    Decoding decoding;
    bool has = false;
    decoding.scale = array->GetScale(&has);
    if (!has)
        decoding.scale = 1.0;
    decoding.offset = array->GetOffset(&has);
    if (!has)
        decoding.offset = 0.0;
    decoding.scale = number_of(array, "scale_factor").value_or(decoding.scale);
    decoding.offset = number_of(array, "add_offset").value_or(decoding.offset);
    const auto plain = [&](const char* name) -> std::optional<double> {
        const auto attribute = array->GetAttribute(name);
        if (!attribute || attribute->GetDataType().GetClass() != GEDTC_NUMERIC)
            return {};
        return attribute->ReadAsDouble();
    };
    const double nodata = array->GetNoDataValueAsDouble(&has);
    constexpr double nan = std::numeric_limits<double>::quiet_NaN();
    decoding.fills[0] = plain("_FillValue").value_or(has ? nodata : nan);
    decoding.fills[1] = plain("missing_value").value_or(nan);
    const GDALDataType type = array->GetDataType().GetNumericDataType();
    if (type == GDT_Float32)
        decoding.fills[2] = static_cast<double>(9.9692099683868690e36F);
    if (type == GDT_Float64)
        decoding.fills[2] = 9.9692099683868690e36;
    if (const auto low = plain("valid_min"))
        decoding.low = *low;
    if (const auto high = plain("valid_max"))
        decoding.high = *high;
    if (const auto range = array->GetAttribute("valid_range");
        range && range->GetTotalElementsCount() == 2) {
        const auto ends = range->ReadAsDoubleArray();
        if (ends.size() == 2) {
            decoding.low = ends[0];
            decoding.high = ends[1];
        }
    }
    return decoding;
}

bool zero_is_fill(const Array& array) {
    const Quiet quiet;
    bool has = false;
    const double nodata = array->GetNoDataValueAsDouble(&has);
    return has && nodata == 0.0 && !array->GetAttribute("_FillValue");
}

std::unique_ptr<Tiles> open_general(std::shared_ptr<const GdalGrid> grid, Array array) {
    return std::make_unique<General>(std::move(grid), std::move(array));
}

} // namespace rillstrand::store
