// SPDX-License-Identifier: Apache-2.0
#include "store/grid_mapping.hpp"

#include <ogr_spatialref.h>

#include <string_view>

namespace rillstrand::store {

GridMapping grid_mapping_of(const std::string& wkt) {
    GridMapping mapping;
    if (wkt.empty())
        return mapping;
    CPLPushErrorHandler(CPLQuietErrorHandler);
    OGRSpatialReference crs;
    const bool read = crs.importFromWkt(wkt.c_str()) == OGRERR_NONE;
    CPLPopErrorHandler();
    if (!read)
        return mapping;
    mapping.projected = crs.IsProjected() != 0;
    const auto number = [&](const char* key, double value) {
        mapping.numbers.emplace_back(key, std::vector<double>{value});
    };
    const auto parameter = [&](const char* key, const char* name) {
        number(key, crs.GetNormProjParm(name, 0.0));
    };
    const char* method = crs.GetAttrValue("PROJECTION");
    const std::string_view projection = method == nullptr ? "" : method;
    if (crs.IsGeographic() != 0) {
        mapping.texts.emplace_back("grid_mapping_name", "latitude_longitude");
    } else if (projection == SRS_PT_TRANSVERSE_MERCATOR) {
        mapping.texts.emplace_back("grid_mapping_name", "transverse_mercator");
        parameter("latitude_of_projection_origin", SRS_PP_LATITUDE_OF_ORIGIN);
        parameter("longitude_of_central_meridian", SRS_PP_CENTRAL_MERIDIAN);
        number("scale_factor_at_central_meridian", crs.GetNormProjParm(SRS_PP_SCALE_FACTOR, 1.0));
        parameter("false_easting", SRS_PP_FALSE_EASTING);
        parameter("false_northing", SRS_PP_FALSE_NORTHING);
    } else if (projection == SRS_PT_LAMBERT_CONFORMAL_CONIC_2SP) {
        mapping.texts.emplace_back("grid_mapping_name", "lambert_conformal_conic");
        mapping.numbers.emplace_back(
            "standard_parallel",
            std::vector<double>{crs.GetNormProjParm(SRS_PP_STANDARD_PARALLEL_1, 0.0),
                                crs.GetNormProjParm(SRS_PP_STANDARD_PARALLEL_2, 0.0)});
        parameter("latitude_of_projection_origin", SRS_PP_LATITUDE_OF_ORIGIN);
        parameter("longitude_of_central_meridian", SRS_PP_CENTRAL_MERIDIAN);
        parameter("false_easting", SRS_PP_FALSE_EASTING);
        parameter("false_northing", SRS_PP_FALSE_NORTHING);
    } else {
        return mapping;
    }
    number("semi_major_axis", crs.GetSemiMajor());
    number("inverse_flattening", crs.GetInvFlattening());
    number("longitude_of_prime_meridian", crs.GetPrimeMeridian());
    return mapping;
}

} // namespace rillstrand::store
