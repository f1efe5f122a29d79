// Tables from files of stations: sites, dates, values as text. Layouts are told apart in station_layout.
#include "windrow/cf/stations.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <set>

#include "roles.h"
#include "signature.h"
#include "station_layout.h"
#include "time_axis.h"
#include "values.h"
#include "windrow/calendar/time_units.h"
#include "windrow/units/units.h"

namespace windrow::cf {
namespace {

using calendar::Calendar;
using calendar::Instant;
using calendar::kDay;

constexpr Instant kNone = std::numeric_limits<Instant>::min();

struct Numbers {
  std::vector<double> value;  // NaN where missing
  bool single = false;        // carries no more than float32
  [[nodiscard]] std::string text(std::size_t at) const {
    if (std::isnan(value[at])) return {};
    return single ? fmt::format("{}", static_cast<float>(value[at])) : fmt::format("{}", value[at]);
  }
};

Numbers read_numbers(const nc::File& file, const Header& header, const nc::Var& variable, Remarks& remarks) {
  const Decoding decoding = read_decoding(header, variable, remarks);
  const std::size_t size = file.size(variable);
  std::vector<std::size_t> start(variable.dims.size(), 0), count;
  for (const int dim : variable.dims) count.push_back(header.dim(dim).length);
  std::vector<std::byte> stored(size * nc::type_size(variable.type));
  if (size > 0) file.raw(variable, start, count, stored.data());
  Gather gather;
  for (std::size_t i = 0; i < size; ++i) {
    gather.source.push_back(i);
    gather.target.push_back(i);
  }
  Numbers out;
  out.value.resize(size);
  out.single = !decoding.double_precision();
  decode(decoding, stored.data(), gather, out.value.data());
  return out;
}

class StationFile {
 public:
  StationFile(const std::string& path, Remarks& remarks)
      : path_(path),
        remarks_(remarks),
        file_(open(path)),
        header_(read_header(file_)),
        layout_(station_layout(file_, header_)),
        ids_(file_.texts(*layout_.id, layout_.stations)) {}

  void add_sites(text::CsvTable& sites, std::set<std::vector<std::string>>& seen) {
    const Numbers longitude = of_stations(need(Role::longitude)), latitude = of_stations(need(Role::latitude));
    const nc::Var* height = elevation();
    Numbers metres;
    if (height != nullptr) {
      metres = of_stations(*height);
      const std::string units = height->text("units");
      const auto affine = units::conversion(units.empty() ? "m" : units, "m", "", path_ + ": " + height->name).affine;
      if (!affine.identity()) metres.single = false;
      for (double& x : metres.value) x = affine(x);
    }
    std::vector<std::string> names(layout_.stations);
    for (const nc::Var& v : header_.vars)
      if (v.text("standard_name") == "platform_name") names = file_.texts(v, layout_.stations);
    for (std::size_t s = 0; s < layout_.stations; ++s) {
      std::vector<std::string> cells{ids_[s], longitude.text(s), latitude.text(s),
                                     height == nullptr ? "" : metres.text(s), names[s]};
      if (seen.insert(cells).second) sites.add(cells, s + 1);
    }
  }

  text::CsvTable values(StationSpan span, const std::vector<std::string>& wanted, bool& hours_known) {
    span_ = span;
    read_times();
    hours_known = bounds_;
    const bool daily = span_ == StationSpan::day;
    std::vector<text::Heading> headings{{"station", ""}};
    if (daily) headings.push_back({"date", ""});
    if (!daily) headings.insert(headings.end(), {{"year", ""}, {"month", ""}});
    const std::size_t before = headings.size();
    std::vector<std::pair<Strides, Numbers>> columns;
    for (const nc::Var& v : header_.vars) {
      if (is_auxiliary(header_, v) || role_of(v) == Role::time || v.find("instance_dimension") != nullptr) continue;
      const auto strides = layout_.strides(header_, v);
      if (!strides) continue;
      headings.push_back({v.name, v.text("units")});
      const bool used = wanted.empty() || std::ranges::find(wanted, v.name) != wanted.end();
      columns.emplace_back(*strides, used ? read_numbers(file_, header_, v, remarks_) : Numbers{});
    }
    text::CsvTable table = text::CsvTable::made(path_, headings, layout_.counted);
    std::vector<std::string> cells(headings.size());
    layout_.each([&](std::size_t station, std::size_t step) {
      const Instant instant = times_[time_strides_.at(station, step)];
      if (instant == kNone) return;
      bool any = false;
      for (std::size_t c = 0; c < columns.size(); ++c) {
        const auto& [strides, numbers] = columns[c];
        cells[before + c] = numbers.value.empty() ? "" : numbers.text(strides.at(station, step));
        any = any || !cells[before + c].empty();
      }
      if (!any) return;
      const calendar::Date date = calendar_.date_of(instant);
      cells[0] = ids_[station];
      cells[1] = daily ? calendar::to_string(date) : std::to_string(date.year);
      if (!daily) cells[2] = std::to_string(date.month);
      refuse_second(station, instant, cells);
      table.add(cells, step + 1);
    });
    return table;
  }

 private:
  static nc::File open(const std::string& path) {
    check_readable(path);
    return nc::File::open(path);
  }

  [[nodiscard]] bool of_each_station(const nc::Var& v) const {
    return is_number(v) && (layout_.station_dim < 0 ? v.dims.empty() : v.dims == std::vector{layout_.station_dim});
  }

  const nc::Var& need(Role role) const {
    for (const nc::Var& v : header_.vars)
      if (of_each_station(v) && role_of(v) == role) return v;
    throw Error(Failure::data, path_,
                fmt::format("no {} of the stations; expected a variable of one value a station with units {}",
                            role_text(role), role == Role::latitude ? "degrees_north" : "degrees_east"));
  }

  /// By standard_name, else by name; `height` stands for a height above the surface.
  const nc::Var* elevation() {
    for (const char* name : {"surface_altitude", "altitude"})
      for (const nc::Var& v : header_.vars)
        if (of_each_station(v) && v.text("standard_name") == name) return &v;
    for (const nc::Var& v : header_.vars) {
      const std::string name = lower(v.name), standard_name = v.text("standard_name");
      const bool named = name == "alt" || name == "altitude" || name == "elevation" || name == "elev";
      if (!of_each_station(v) || !named) continue;
      if (standard_name.empty()) return &v;
      remarks_.push_back(fmt::format("'{}' has the standard name {} and is not taken for the stations' elevation",
                                     v.name, standard_name));
    }
    return nullptr;
  }

  Numbers of_stations(const nc::Var& v) { return read_numbers(file_, header_, v, remarks_); }

  std::vector<Instant> instants(const nc::Var& v, const calendar::TimeUnits& units) {
    const Numbers numbers = read_numbers(file_, header_, v, remarks_);
    std::vector<Instant> out;
    for (const double x : numbers.value) out.push_back(std::isnan(x) ? kNone : snapped(units.decode(x)));
    return out;
  }

  void read_times() {
    const nc::Var& time = *layout_.time;
    const std::string place = fmt::format("{}: {}", path_, time.name);
    calendar_ = Calendar::from_cf(time.text("calendar"), place);
    using Kind = Calendar::Kind;
    const Kind kind = calendar_.kind();
    if (kind != Kind::standard && kind != Kind::proleptic_gregorian && kind != Kind::utc && kind != Kind::tai)
      throw Error(
          Failure::data, place,
          fmt::format("the calendar is {}; observations need standard or proleptic_gregorian", calendar_.cf_name()));
    std::string odd;
    const auto units = calendar::TimeUnits::parse(time.text("units"), calendar_, place, &odd);
    if (!odd.empty()) remarks_.push_back(odd);
    time_strides_ = *layout_.strides(header_, time);
    times_ = instants(time, units);
    const nc::Var* bounds = header_.find(time.text("bounds"));
    if (time.text("bounds").empty() || bounds == nullptr) return;
    if (file_.size(*bounds) != 2 * times_.size())
      throw Error(Failure::data, place,
                  fmt::format("the bounds '{}' have the shape {}; expected two a time", bounds->name,
                              header_.shape_text(*bounds)));
    const std::string own = bounds->text("units");
    take_middles(instants(*bounds, own.empty() ? units : calendar::TimeUnits::parse(own, calendar_, place)), place);
  }

  /// The middle of a value's hours says its day or month; a span of another length is no value of one.
  void take_middles(const std::vector<Instant>& ends, const std::string& place) {
    bounds_ = true;
    const bool daily = span_ == StationSpan::day;
    for (std::size_t i = 0; i < times_.size(); ++i) {
      if (times_[i] == kNone || ends[2 * i] == kNone || ends[2 * i + 1] == kNone) {
        times_[i] = kNone;
        continue;
      }
      const Instant length = std::abs(ends[2 * i + 1] - ends[2 * i]);
      const bool right = daily ? length == kDay : length >= 28 * kDay && length <= 31 * kDay;
      if (!right)
        throw Error(Failure::data, place,
                    fmt::format("the time bounds at position {} span {:.6g} days; expected a {}", i,
                                double(length) / double(kDay), daily ? "day" : "month"));
      times_[i] = std::min(ends[2 * i], ends[2 * i + 1]) + length / 2;
    }
  }

  /// Two times on one day are no daily values; one time twice is for the rules of repeated dates.
  void refuse_second(std::size_t station, Instant instant, const std::vector<std::string>& cells) {
    const bool daily = span_ == StationSpan::day;
    const std::string date = daily ? cells[1] : fmt::format("{}-{:0>2}", cells[1], cells[2]);
    auto& last = last_[station];
    if (last.first == date && last.second != instant)
      throw Error(Failure::data, path_,
                  fmt::format("station '{}' has values of several times of {}; expected one a {}", ids_[station], date,
                              daily ? "day" : "month"));
    last = {date, instant};
  }

  std::string path_;
  StationSpan span_ = StationSpan::day;
  Remarks& remarks_;
  nc::File file_;
  Header header_;
  StationLayout layout_;
  std::vector<std::string> ids_;
  Calendar calendar_;
  std::vector<Instant> times_;
  Strides time_strides_;
  bool bounds_ = false;
  std::map<std::size_t, std::pair<std::string, Instant>> last_;
};

}  // namespace

StationValues read_station_values(const std::string& path, StationSpan span, const std::vector<std::string>& wanted,
                                  Notices& notices) {
  Remarks remarks;
  StationFile file(path, remarks);
  StationValues out{{}, false};
  out.table = file.values(span, wanted, out.hours_known);
  for (const std::string& remark : remarks) notices.add(path, remark);
  return out;
}

text::CsvTable read_station_sites(const std::vector<std::string>& paths, Notices& notices) {
  text::CsvTable sites = text::CsvTable::made(
      paths.empty() ? "" : paths.front(),
      {{"station", ""}, {"longitude", ""}, {"latitude", ""}, {"elevation", "m"}, {"name", ""}}, "station");
  std::set<std::vector<std::string>> seen;
  for (const std::string& path : paths) {
    Remarks remarks;
    StationFile(path, remarks).add_sites(sites, seen);
    for (const std::string& remark : remarks) notices.add(path, remark);
  }
  return sites;
}

bool has_stations(const std::string& path) {
  check_readable(path);
  const nc::File file = nc::File::open(path);
  const Header header = read_header(file);
  return lower(header.text("featureType")) == "timeseries" || timeseries_id(header) != nullptr;
}

}  // namespace windrow::cf
