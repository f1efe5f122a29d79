#include <hdf5.h>
#include <netcdf.h>

#include "windrow/cf/dataset.h"

namespace windrow::cf {

std::string library_version() {
  const std::lock_guard lock(library_mutex());
  unsigned major = 0, minor = 0, release = 0;
  H5get_libversion(&major, &minor, &release);
  std::string netcdf = nc_inq_libvers();
  netcdf = netcdf.substr(0, netcdf.find(' '));
  return "netCDF " + netcdf + ", HDF5 " + std::to_string(major) + "." + std::to_string(minor) + "." +
         std::to_string(release);
}

}  // namespace windrow::cf
