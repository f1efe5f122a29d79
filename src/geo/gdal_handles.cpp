#include "gdal_handles.h"

#include <cpl_conv.h>

#include <algorithm>
#include <filesystem>

namespace windrow::geo {

Quiet::Quiet() {
  CPLErrorReset();
  CPLPushErrorHandler(CPLQuietErrorHandler);
  CPLSetThreadLocalConfigOption("GDAL_DISABLE_READDIR_ON_OPEN", "TRUE");
}

Quiet::~Quiet() {
  CPLSetThreadLocalConfigOption("GDAL_DISABLE_READDIR_ON_OPEN", nullptr);
  CPLPopErrorHandler();
}

std::string reason() {
  std::string text = CPLGetLastErrorMsg();
  std::replace_if(
      text.begin(), text.end(), [](unsigned char c) { return c < 0x20 || c == 0x7F; }, ' ');
  return text.empty() ? "" : " (" + text + ")";
}

std::string subject(const std::string& path, const std::string& place, const char* after) {
  return path == place ? "" : "'" + path + "'" + after;
}

bool is_local_file(const std::string& path) {
  std::error_code ignored;
  return !path.starts_with("/vsi") && std::filesystem::is_regular_file(path, ignored);
}

std::string horizontal_wkt(OGRSpatialReferenceH given) {
  if (given == nullptr) return {};
  const std::unique_ptr<void, void (*)(OGRSpatialReferenceH)> flat(OSRClone(given), OSRDestroySpatialReference);
  OSRStripVertical(flat.get());
  OSRDemoteTo2D(flat.get(), nullptr);
  const char* const options[] = {"FORMAT=WKT2_2019", "MULTILINE=NO", nullptr};
  char* text = nullptr;
  const OGRErr status = OSRExportToWktEx(flat.get(), &text, options);
  std::string out = status == OGRERR_NONE && text ? text : "";
  CPLFree(text);
  return out;
}

}  // namespace windrow::geo
