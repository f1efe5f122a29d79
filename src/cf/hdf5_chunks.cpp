// Direct chunk writes. HDF5 does not look into a payload, so the filters are compared with what the caller packs.
#include "hdf5_chunks.h"

#include <hdf5.h>

#include <cerrno>
#include <utility>

#include "nc_file.h"
#include "product_define.h"
#include "windrow/base/error.h"

namespace windrow::cf {
namespace {

static_assert(sizeof(hid_t) == sizeof(std::int64_t));

/// Identifiers that live for one call.
class Id {
 public:
  Id(hid_t id, herr_t (*close)(hid_t)) : id_(id), close_(close) {}
  ~Id() {
    if (id_ >= 0) close_(id_);
  }
  Id(const Id&) = delete;
  Id& operator=(const Id&) = delete;
  operator hid_t() const { return id_; }

 private:
  hid_t id_;
  herr_t (*close_)(hid_t);
};

/// A file that a full disk kept from being closed stays on HDF5's list, and its clean-up at exit crashes on it
/// (1.10.8): the exit status would be lost. Every file is closed explicitly, so that clean-up is not needed. This must
/// precede every other call of the library, hence a static object.
[[maybe_unused]] const bool kNoCleanUpAtExit = H5dont_atexit() >= 0;

/// The library to itself, and a clean errno.
struct Call {
  nc::LibraryLock lock;
  Call() { errno = 0; }
};

}  // namespace

void ChunkFile::fail() const {
  throw Error(Failure::output, path_, "cannot be written: " + output_reason(errno, "the HDF5 library failed"));
}

ChunkFile::ChunkFile(const std::string& path) : path_(path) {
  const Call call;
  const Id access(H5Pcreate(H5P_FILE_ACCESS), H5Pclose);
  // The name is this process's own; a file system without locks must not keep it from being written.
  H5Pset_file_locking(access, true, true);
  file_ = H5Fopen(path.c_str(), H5F_ACC_RDWR, access);
  if (file_ < 0) fail();
}

ChunkFile::~ChunkFile() {
  const Call call;
  if (dataset_ >= 0) H5Dclose(dataset_);
  if (file_ >= 0) H5Fclose(file_);
}

void ChunkFile::check_filters(bool deflated) const {
  const Id list(H5Dget_create_plist(dataset_), H5Pclose);
  const int count = H5Pget_nfilters(list);
  bool right = count == (deflated ? 2 : 0);
  const H5Z_filter_t expected[] = {H5Z_FILTER_SHUFFLE, H5Z_FILTER_DEFLATE};
  for (int i = 0; right && i < count; ++i) {
    unsigned flags = 0, config = 0;
    std::size_t values = 0;
    right =
        H5Pget_filter2(list, static_cast<unsigned>(i), &flags, &values, nullptr, 0, nullptr, &config) == expected[i];
  }
  if (!right) throw Error(Failure::defect, path_, "the file's filters are not those the chunks are packed with");
}

void ChunkFile::begin(const std::string& variable, std::span<const std::size_t> lengths, bool deflated) {
  const Call call;
  dataset_ = H5Dopen2(file_, variable.c_str(), H5P_DEFAULT);
  if (dataset_ < 0) fail();
  const std::vector<hsize_t> extent(lengths.begin(), lengths.end());
  if (H5Dset_extent(dataset_, extent.data()) < 0) fail();
  check_filters(deflated);
}

void ChunkFile::write(std::span<const std::size_t> offset, std::span<const std::byte> bytes) {
  const Call call;
  const std::vector<hsize_t> start(offset.begin(), offset.end());
  if (H5Dwrite_chunk(dataset_, H5P_DEFAULT, 0, start.data(), bytes.size(), bytes.data()) < 0) fail();
}

void ChunkFile::end() {
  const Call call;
  if (H5Dclose(std::exchange(dataset_, -1)) < 0) fail();
}

void ChunkFile::close() {
  const Call call;
  if (H5Fclose(std::exchange(file_, -1)) < 0) fail();
}

}  // namespace windrow::cf
