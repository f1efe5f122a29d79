// Where coordinates are read from: the data file, and the file of coordinates where the job names one.
#pragma once
#include <cstddef>
#include <cstdint>
#include <string>
#include <vector>

#include "header.h"

namespace windrow::cf {

/// Error(data) at `place` for a variable that has one dimension twice: no position in it means one thing.
void refuse_repeated_dims(const Header& header, const nc::Var& variable, const std::string& place);

class Inputs {
 public:
  Inputs(const nc::File& file, Header header);

  /// Adds the variables of `other`, which must outlive this. The dimensions of its latitudes and longitudes become
  /// those of `variable` with the same name and length, otherwise (said) the next of the same length. Its variables
  /// replace those of the same name, its latitudes and longitudes all that the data file has. Error(data) when none
  /// fit.
  void borrow(const nc::File& other, nc::Var variable, Remarks& remarks);

  [[nodiscard]] const Header& header() const { return header_; }
  [[nodiscard]] const std::string& place(const nc::Var& variable) const;  ///< the file it is in

  /// coordinate_values of the variable, wherever it is.
  [[nodiscard]] std::vector<double> values(const nc::Var& variable, const nc::Var* parent = nullptr) const;
  /// The same over `dims` (ids, in that order) whatever the order in the file; dimensions of the variable that are not
  /// among them must have length 1 (Error(defect) otherwise). NaN where missing: _FillValue, missing_value, the type's
  /// default fill, not finite. Radians become degrees for latitudes and longitudes (`parent`'s units count for bounds).
  [[nodiscard]] std::vector<double> over(const nc::Var& variable, const std::vector<int>& dims,
                                         const nc::Var* parent = nullptr) const;
  /// Whole numbers, exact up to 63 bits. Error(data) for other types.
  [[nodiscard]] std::vector<std::int64_t> integers(const nc::Var& variable) const;

 private:
  [[nodiscard]] const nc::File& file_of(const nc::Var& variable) const;
  const nc::File& file_;
  const nc::File* other_ = nullptr;
  Header header_;  // own variables first
  std::size_t own_ = 0;
};

}  // namespace windrow::cf
