// What rasters and vectors share of GDAL: silence, handles, local files only, the CRS as WKT. No format is named here.
#pragma once
#include <cpl_error.h>
#include <gdal.h>
#include <ogr_srs_api.h>

#include <memory>
#include <string>

namespace windrow::geo {

/// GDAL's messages are kept from the terminal and neighbours of the file are not listed, for the life of the object.
class Quiet {
 public:
  Quiet();
  ~Quiet();
  Quiet(const Quiet&) = delete;
  Quiet& operator=(const Quiet&) = delete;
};

struct CloseDataset {
  void operator()(void* d) const { GDALClose(d); }
};
using DatasetHandle = std::unique_ptr<void, CloseDataset>;

/// The library's last words on one line, " (...)", or nothing.
std::string reason();
/// "'PATH'" and `after` to begin a message with; nothing where the place of the message is the path itself.
std::string subject(const std::string& path, const std::string& place, const char* after = " ");
/// A regular file, and no path that GDAL would take for an address or an archive.
bool is_local_file(const std::string& path);
/// The horizontal part of a CRS as one line of WKT2:2019; empty for none.
std::string horizontal_wkt(OGRSpatialReferenceH given);

}  // namespace windrow::geo
