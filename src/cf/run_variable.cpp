// A variable of one run: opens its files, compares them, joins them, and reads windows of values.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <memory>
#include <optional>
#include <set>

#include "blocks.h"
#include "grid.h"
#include "join.h"
#include "same_grid.h"
#include "signature.h"
#include "time_axis.h"
#include "values.h"
#include "windrow/cf/dataset.h"
#include "windrow/text/words.h"

namespace windrow::cf {

namespace {

/// Bound on the buffer of one read; a larger single chunk needs its own size.
constexpr std::size_t kBlockBytes = std::size_t{64} << 20;

/// What is needed to read the variable from one file again.
struct Source {
  std::string path;
  nc::Var variable;
  Storage storage;
  Decoding decoding;
  std::shared_ptr<const Places> places;  ///< files of a run share it where they agree
};

/// All that is learnt from one file.
struct Opened {
  Source source;
  Grid grid;
  FileTime time;  ///< no steps when fixed
  VariableInfo info;
  Remarks remarks;
};

std::vector<std::string> data_names(const Header& header) {
  std::vector<std::string> names;
  for (const nc::Var& var : header.vars)
    if (!is_auxiliary(header, var)) names.push_back(var.name);
  return names;
}

[[noreturn]] void refuse_missing_variable(const Header& header, const std::string& name) {
  const std::vector<std::string> names = data_names(header);
  const std::string near = text::nearest_word(name, names);
  std::string held;
  for (const std::string& held_name : names) held += (held.empty() ? "" : ", ") + held_name;
  throw Error(Failure::data, header.path,
              fmt::format("no variable '{}'{} (data variables in the file: {})", name,
                          near.empty() ? "" : fmt::format("; did you mean '{}'?", near), held.empty() ? "none" : held));
}

std::ptrdiff_t position(const nc::Var& variable, const std::vector<int>& dims, std::size_t which) {
  if (which >= dims.size()) return -1;
  return std::ranges::find(variable.dims, dims[which]) - variable.dims.begin();
}

/// Header and grid; coordinates come from the file that the hints name, where they do.
Opened open_file(const std::string& path, const std::string& name, const GridHints& hints) {
  check_readable(path);
  const nc::File file = nc::File::open(path);
  Inputs inputs(file, read_header(file));
  if (inputs.header().find(name) == nullptr) refuse_missing_variable(inputs.header(), name);
  const nc::Var variable = *inputs.header().find(name);

  Opened opened;
  std::optional<nc::File> coordinates;
  if (!hints.coordinates.empty()) {
    check_readable(hints.coordinates);
    coordinates = nc::File::open(hints.coordinates);
    inputs.borrow(*coordinates, variable, opened.remarks);
  }
  const Header& header = inputs.header();
  const Mapping mapping = mapping_of(header, variable, opened.remarks);
  const Context context{inputs,  variable,
                        hints,   opened.remarks,
                        mapping, axes_of(inputs, variable, variable.dims, mapping, hints, opened.remarks)};
  FileGrid grid = recognise_grid(context);
  const TimeAxis time = time_axis_of(context, grid.dims);
  opened.grid = std::move(grid.grid);
  Source& source = opened.source;
  source.path = path;
  source.variable = variable;
  source.places = std::make_shared<const Places>(std::move(grid.places));
  source.decoding = read_decoding(header, variable, opened.remarks);
  Storage& storage = source.storage;
  storage.time = time.position;
  storage.y = position(variable, grid.dims, 0);
  storage.x = position(variable, grid.dims, 1);
  for (const Axis& axis : context.axes) storage.lengths.push_back(axis.dim->length);
  storage.chunks = file.chunking(variable);
  storage.value_bytes = nc::type_size(variable.type);
  if (time.values != nullptr) opened.time = read_time(file, header, *time.values, opened.remarks);

  VariableInfo& info = opened.info;
  info.name = name;
  info.standard_name = variable.text("standard_name");
  info.long_name = variable.text("long_name");
  info.units = variable.text("units");
  info.cell_methods = variable.text("cell_methods");
  for (const nc::Att& att : variable.attributes) info.attributes.push_back(nc::to_record(att));
  for (const nc::Att& att : header.global) info.global_attributes.push_back(nc::to_record(att));
  return opened;
}

void compare(const Opened& first, const Opened& other) {
  const auto differs = [&](const std::string& text) {
    throw Error(Failure::data, other.source.path, fmt::format("{} than in {}", text, first.source.path));
  };
  if (const std::string text = grid_difference(first.grid, other.grid); !text.empty()) differs(text);
  if (!(first.time.calendar == other.time.calendar))
    differs(fmt::format("the calendar is another ({} against {})", other.time.calendar.cf_name(),
                        first.time.calendar.cf_name()));
  if (first.info.units != other.info.units)
    differs(fmt::format("variable '{}' has other units ('{}' against '{}')", other.info.name, other.info.units,
                        first.info.units));
}

class JoinedVariable final : public RunVariable {
 public:
  JoinedVariable(std::vector<Opened> opened, const std::vector<std::string>& paths, Notices& notices) {
    info_ = opened[0].info;
    grid_ = opened[0].grid;
    calendar_ = opened[0].time.calendar;
    report(opened, notices);
    if (opened[0].time.steps.empty()) {
      time_.resize(1);
      spans_ = {{0, 0, 0, 1}};
    } else {
      join_time(opened, paths, notices);
    }
    for (const Span& span : spans_) files_.push_back({paths[span.file], span.first, span.count});
    info_ = opened[spans_[0].file].info;
    for (Opened& file : opened) sources_.push_back(std::move(file.source));
  }

  const VariableInfo& info() const override { return info_; }
  const Grid& grid() const override { return grid_; }
  const calendar::Calendar& calendar() const override { return calendar_; }
  Frequency frequency() const override { return frequency_; }
  const std::vector<TimeStep>& time() const override { return time_; }
  const std::vector<FileSpan>& files() const override { return files_; }
  bool double_precision() const override {
    return std::ranges::any_of(sources_, [](const Source& s) { return s.decoding.double_precision(); });
  }
  void read(std::size_t t0, std::size_t t1, const std::vector<std::uint32_t>& cells, double* out) const override {
    read_any(t0, t1, cells, out);
  }
  void read(std::size_t t0, std::size_t t1, const std::vector<std::uint32_t>& cells, float* out) const override {
    read_any(t0, t1, cells, out);
  }

 private:
  /// A remark that holds for several files becomes one notice, at the first of them.
  static void report(const std::vector<Opened>& opened, Notices& notices) {
    std::map<std::string, std::size_t> count;
    for (const Opened& file : opened)
      for (const std::string& remark : std::set(file.remarks.begin(), file.remarks.end())) ++count[remark];
    for (const Opened& file : opened) {
      for (const std::string& remark : file.remarks) {
        const std::size_t times = std::exchange(count[remark], 0);
        if (times == 1) notices.add(file.source.path, remark);
        if (times > 1)
          notices.add(file.source.path,
                      fmt::format("{} (and so in {} more file{})", remark, times - 1, times > 2 ? "s" : ""));
      }
    }
  }

  void join_time(const std::vector<Opened>& opened, const std::vector<std::string>& paths, Notices& notices) {
    std::vector<FileTime> times;
    for (const Opened& file : opened) times.push_back(file.time);
    const bool bounds = std::ranges::all_of(times, &FileTime::bounds);
    JoinedTime joined = join(paths, times, notices);
    time_ = std::move(joined.steps);
    spans_ = std::move(joined.spans);
    frequency_ = frequency_of(calendar_, time_, bounds);
    const std::string& place = paths[spans_[0].file];
    if (!bounds) {
      infer_cells(calendar_, frequency_, time_);
      notices.add(place, fmt::format("time has no bounds{}; each value is taken for {}",
                                     std::ranges::any_of(times, &FileTime::bounds) ? " in some files" : "",
                                     frequency_ == Frequency::daily     ? "the day that contains its time"
                                     : frequency_ == Frequency::monthly ? "the calendar month that contains its time"
                                                                        : "the time half-way to its neighbours"));
    }
    for (const std::string& remark : gap_remarks(calendar_, frequency_, time_)) notices.add(place, remark);
  }

  template <class Out>
  void read_any(std::size_t t0, std::size_t t1, const std::vector<std::uint32_t>& cells, Out* out) const {
    if (t1 > time_.size() || t0 > t1)
      throw Error(Failure::defect, info_.name, fmt::format("steps {} .. {} asked of {}", t0, t1, time_.size()));
    if (cells.empty()) return;
    for (const Span& span : spans_) {
      const std::size_t first = std::max(t0, span.first), last = std::min(t1, span.first + span.count);
      if (first >= last) continue;
      read_source(sources_[span.file], first - span.first + span.file_first, last - span.first + span.file_first, cells,
                  out + (first - t0) * cells.size());
    }
  }

  template <class Out>
  void read_source(const Source& source, std::size_t t0, std::size_t t1, const std::vector<std::uint32_t>& cells,
                   Out* out) const {
    std::vector<ArrayCell> places;
    places.reserve(cells.size());
    for (const std::uint32_t cell : cells) {
      if (cell >= source.places->size())
        throw Error(Failure::defect, info_.name, fmt::format("cell {} is not on the grid", cell));
      places.push_back({source.places->y(cell), source.places->x(cell), places.size()});
    }
    const Blocks blocks = cut(source.storage, places, t0, t1, kBlockBytes);
    const nc::File file = nc::File::open(source.path);
    std::vector<std::byte> buffer;
    for (const Block& block : blocks.blocks) {
      const Window& window = blocks.windows[block.window];
      const std::vector<std::size_t> strides = load(file, source, window, block, buffer);
      const auto stride = [&](std::ptrdiff_t dim) { return dim >= 0 ? strides[dim] : 0; };
      Gather gather;
      for (const ArrayCell& cell : window.cells) {
        gather.source.push_back((cell.y - window.y0) * stride(source.storage.y) +
                                (cell.x - window.x0) * stride(source.storage.x));
        gather.target.push_back(cell.target);
      }
      const std::size_t step = stride(source.storage.time);
      for (std::size_t t = block.t0; t < block.t1; ++t)
        decode(source.decoding, buffer.data() + (t - block.t0) * step * source.storage.value_bytes, gather,
               out + (t - t0) * cells.size());
    }
  }

  /// Reads one hyperslab into `buffer`; returns the stride of each dimension there, in values.
  static std::vector<std::size_t> load(const nc::File& file, const Source& source, const Window& window,
                                       const Block& block, std::vector<std::byte>& buffer) {
    const Storage& storage = source.storage;
    const std::size_t rank = storage.lengths.size();
    std::vector<std::size_t> start(rank, 0), count(rank, 1), strides(rank, 1);
    const auto take = [&](std::ptrdiff_t dim, std::size_t first, std::size_t last) {
      if (dim < 0) return;
      start[dim] = first;
      count[dim] = last - first;
    };
    take(storage.time, block.t0, block.t1);
    take(storage.y, window.y0, window.y1);
    take(storage.x, window.x0, window.x1);
    std::size_t values = 1;
    for (std::size_t i = rank; i-- > 0;) {
      strides[i] = values;
      values *= count[i];
    }
    buffer.resize(values * storage.value_bytes);
    file.raw(source.variable, start, count, buffer.data());
    return strides;
  }

  VariableInfo info_;
  Grid grid_;
  calendar::Calendar calendar_;
  Frequency frequency_ = Frequency::fixed;
  std::vector<TimeStep> time_;
  std::vector<FileSpan> files_;
  std::vector<Span> spans_;
  std::vector<Source> sources_;
};

}  // namespace

std::unique_ptr<RunVariable> open_run(const std::vector<std::string>& paths, const std::string& variable,
                                      Notices& notices, const GridHints& hints) {
  if (paths.empty()) throw Error(Failure::missing, variable, "no files were given");
  std::vector<Opened> opened;
  for (const std::string& path : paths) {
    opened.push_back(open_file(path, variable, hints));
    if (opened.back().time.steps.empty() && paths.size() > 1)
      throw Error(Failure::data, path,
                  fmt::format("variable '{}' has no time axis, so it cannot be one of {} files of a run", variable,
                              paths.size()));
    if (opened.size() == 1) continue;
    compare(opened.front(), opened.back());
    opened.back().grid = {};  // a long run must not hold its grid once a file
    Source& source = opened.back().source;
    if (*source.places == *opened.front().source.places) source.places = opened.front().source.places;
  }
  return std::make_unique<JoinedVariable>(std::move(opened), paths, notices);
}

std::vector<std::string> data_variables(const std::string& path) {
  check_readable(path);
  return data_names(read_header(nc::File::open(path)));
}

}  // namespace windrow::cf
