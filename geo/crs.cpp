// SPDX-License-Identifier: Apache-2.0
#include "crs.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <geodesic.h>
#include <proj.h>
#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <cmath>
#include <limits>

namespace rillstrand::geo {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

struct CloseContext {
    void operator()(PJ_CONTEXT* context) const { proj_context_destroy(context); }
};
struct CloseObject {
    void operator()(PJ* object) const { proj_destroy(object); }
};
using Context = std::unique_ptr<PJ_CONTEXT, CloseContext>;
using Object = std::unique_ptr<PJ, CloseObject>;

/// A context that never asks a network and prints nothing.
Context new_context() {
    Context context{proj_context_create()};
    proj_context_set_enable_network(context.get(), 0);
    proj_log_level(context.get(), PJ_LOG_NONE);
    return context;
}

} // namespace

struct Crs::Data {
    std::string definition;
    Context context = new_context();
    Object object;
};

Crs::Crs(const std::string& definition, const std::string& key) : m_data{std::make_unique<Data>()} {
    m_data->definition = definition;
    m_data->object.reset(proj_create(m_data->context.get(), definition.c_str()));
    if (!m_data->object || proj_is_crs(m_data->object.get()) == 0)
        throw DataError{
            key + ": '" + definition.substr(0, 80) +
            "' is no known coordinate system; write an EPSG code such as EPSG:25832, or "
            "WKT"};
}

Crs::Crs(Crs&&) noexcept = default;
Crs& Crs::operator=(Crs&&) noexcept = default;
Crs::~Crs() = default;

const std::string& Crs::definition() const {
    return m_data->definition;
}

std::string Crs::name() const {
    const char* name = proj_get_name(m_data->object.get());
    return name == nullptr ? m_data->definition : name;
}

std::string Crs::wkt() const {
    const char* wkt =
        proj_as_wkt(m_data->context.get(), m_data->object.get(), PJ_WKT2_2019, nullptr);
    return wkt == nullptr ? m_data->definition : wkt;
}

bool Crs::geographic() const {
    PJ_TYPE type = proj_get_type(m_data->object.get());
    if (type == PJ_TYPE_BOUND_CRS || type == PJ_TYPE_COMPOUND_CRS) {
        const Object inner{
            type == PJ_TYPE_BOUND_CRS
                ? proj_get_source_crs(m_data->context.get(), m_data->object.get())
                : proj_crs_get_sub_crs(m_data->context.get(), m_data->object.get(), 0)};
        if (inner)
            type = proj_get_type(inner.get());
    }
    return type == PJ_TYPE_GEOGRAPHIC_2D_CRS || type == PJ_TYPE_GEOGRAPHIC_3D_CRS;
}

std::optional<std::array<double, 4>> Crs::area_of_use() const {
    std::array<double, 4> box{};
    const char* name = nullptr;
    if (proj_get_area_of_use(m_data->context.get(), m_data->object.get(), box.data(), &box[1],
                             &box[2], &box[3], &name) == 0 ||
        box[0] < -180.0)
        return std::nullopt;
    return box;
}

struct Transformation::Data {
    Context context = new_context();
    Object object;
};

Transformation::Transformation(const Crs& from, const Crs& to) : m_data{std::make_unique<Data>()} {
    PJ_CONTEXT* context = m_data->context.get();
    const Object found{proj_create_crs_to_crs(context, from.definition().c_str(),
                                              to.definition().c_str(), nullptr)};
    if (found)
        m_data->object.reset(proj_normalize_for_visualization(context, found.get()));
    if (!m_data->object)
        throw DataError{"there is no way from " + from.name() + " to " + to.name() +
                        "; choose another coordinate system"};
}

Transformation::Transformation(Transformation&&) noexcept = default;
Transformation& Transformation::operator=(Transformation&&) noexcept = default;
Transformation::~Transformation() = default;

PointsXY Transformation::apply(const PointsXY& points, bool forward) const {
    PointsXY result = points;
    const Eigen::Index n = points.rows();
    const auto work = [&](PJ* object, Eigen::Index first, Eigen::Index count) {
        double* x = result.data() + first;
        double* y = x + n;
        const auto size = static_cast<std::size_t>(count);
        proj_errno_reset(object);
        proj_trans_generic(object, forward ? PJ_FWD : PJ_INV, x, sizeof(double), size, y,
                           sizeof(double), size, nullptr, 0, 0, nullptr, 0, 0);
        for (std::size_t i = 0; i < size; ++i)
            if (!std::isfinite(x[i]) || !std::isfinite(y[i]))
                x[i] = y[i] = nan;
    };
    // The first points go through our own object, which then knows the operation that was used.
    constexpr Eigen::Index share = 50000;
    work(m_data->object.get(), 0, std::min(n, share));
    if (n <= share)
        return result;
    tbb::parallel_for(tbb::blocked_range<Eigen::Index>{share, n, share},
                      [&](const tbb::blocked_range<Eigen::Index>& part) {
                          const Context context = new_context();
                          const Object copy{proj_clone(context.get(), m_data->object.get())};
                          if (!copy)
                              throw MachineError{"PROJ has no memory for another transformation"};
                          work(copy.get(), part.begin(), part.end() - part.begin());
                      });
    return result;
}

PointsXY Transformation::forward(const PointsXY& points) const {
    return apply(points, true);
}
PointsXY Transformation::inverse(const PointsXY& points) const {
    return apply(points, false);
}

std::string Transformation::operation() const {
    const Object used{proj_trans_get_last_used_operation(m_data->object.get())};
    const PJ_PROJ_INFO info = proj_pj_info(used ? used.get() : m_data->object.get());
    return info.description == nullptr ? "" : info.description;
}

double Transformation::accuracy_m() const {
    const Object used{proj_trans_get_last_used_operation(m_data->object.get())};
    const double accuracy = proj_pj_info(used ? used.get() : m_data->object.get()).accuracy;
    return accuracy < 0.0 ? nan : accuracy;
}

double geodesic_m(double lon1, double lat1, double lon2, double lat2) {
    geod_geodesic wgs84{};
    geod_init(&wgs84, 6378137.0, 1.0 / 298.257223563);
    double length_m = 0.0;
    geod_inverse(&wgs84, lat1, lon1, lat2, lon2, &length_m, nullptr, nullptr);
    return length_m;
}

GroundPlane::GroundPlane(const PointsXY& lonlat, double height_m)
    : m_scale{1.0 + (std::isfinite(height_m) ? height_m : 0.0) / 6371000.0} {
    // Middle through unit vectors, so that a site on the antimeridian has its middle there.
    Eigen::Vector3d sum = Eigen::Vector3d::Zero();
    constexpr double degree = 3.14159265358979323846 / 180.0;
    for (Eigen::Index i = 0; i < lonlat.rows(); ++i) {
        if (!std::isfinite(lonlat(i, 0)) || !std::isfinite(lonlat(i, 1)))
            continue;
        const double lon = lonlat(i, 0) * degree, lat = lonlat(i, 1) * degree;
        sum += Eigen::Vector3d{std::cos(lat) * std::cos(lon), std::cos(lat) * std::sin(lon),
                               std::sin(lat)};
    }
    const double lon0 = std::atan2(sum.y(), sum.x()) / degree;
    const double lat0 = std::atan2(sum.z(), std::hypot(sum.x(), sum.y())) / degree;
    const Crs plane{"+proj=tmerc +lat_0=" + text::fixed(lat0, 6) +
                        " +lon_0=" + text::fixed(lon0, 6) + " +k=1 +datum=WGS84 +units=m +type=crs",
                    "plane"};
    m_transformation = std::make_shared<Transformation>(Crs{"EPSG:4326", "plane"}, plane);
}

PointsXY GroundPlane::from_lonlat(const PointsXY& lonlat) const {
    return m_transformation->forward(lonlat) * m_scale;
}

PointsXY GroundPlane::to_lonlat(const PointsXY& plane_m) const {
    return m_transformation->inverse(plane_m / m_scale);
}

} // namespace rillstrand::geo
