#include "sim/record/hdf5_trace.hpp"

#include <hdf5.h>

#include <algorithm>

#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

static_assert(sizeof(hid_t) == sizeof(std::int64_t));

// The innermost message of HDF5's error stack names the cause; of a failed system call only its own text is wanted.
herr_t innermost(unsigned, const H5E_error2_t* error, void* text) {
  std::string& why = *static_cast<std::string*>(text);
  why = error->desc != nullptr ? error->desc : "";
  constexpr std::string_view before = "error message = '";
  if (const std::size_t at = why.find(before); at != std::string::npos) {
    why = why.substr(at + before.size());
    why = why.substr(0, why.find('\''));
  }
  return 0;
}

// Closes what it holds.
class Held {
 public:
  Held(hid_t id, herr_t (*close)(hid_t)) : id_(id), close_(close) {}
  ~Held() {
    if (id_ >= 0) close_(id_);
  }
  Held(const Held&) = delete;
  Held& operator=(const Held&) = delete;
  operator hid_t() const { return id_; }

 private:
  hid_t id_;
  herr_t (*close_)(hid_t);
};

hid_t text_type(std::size_t length) {
  const hid_t type = H5Tcopy(H5T_C_S1);
  H5Tset_size(type, std::max<std::size_t>(length, 1));
  H5Tset_cset(type, H5T_CSET_UTF8);
  return type;
}

std::int64_t put_text(hid_t at, const char* name, const std::string& text) {
  const Held type(text_type(text.size()), H5Tclose), space(H5Screate(H5S_SCALAR), H5Sclose);
  const Held attribute(H5Acreate2(at, name, type, space, H5P_DEFAULT, H5P_DEFAULT), H5Aclose);
  return H5Awrite(attribute, type, text.empty() ? "\0" : text.data());
}

template <class Number>
std::int64_t put_number(hid_t at, const char* name, hid_t stored, hid_t held, Number number) {
  const Held space(H5Screate(H5S_SCALAR), H5Sclose);
  const Held attribute(H5Acreate2(at, name, stored, space, H5P_DEFAULT, H5P_DEFAULT), H5Aclose);
  return H5Awrite(attribute, held, &number);
}

// No time of day in the file: the same run gives the same bytes.
hid_t timeless_dataset() {
  const hid_t list = H5Pcreate(H5P_DATASET_CREATE);
  H5Pset_obj_track_times(list, false);
  return list;
}

}  // namespace

Hdf5Trace::Hdf5Trace(const std::string& path, TraceOrigin origin) : file_(path), origin_(std::move(origin)) {
  if (file_.working_path() == path) throw OutsideError("cannot write '" + path + "': HDF5 needs a regular file");
  H5dont_atexit();  // a file that could not be closed (full disk) would crash HDF5's own clean-up at exit
  H5Eset_auto2(H5E_DEFAULT, nullptr, nullptr);  // told in our own words
  const Held list(H5Pcreate(H5P_FILE_CREATE), H5Pclose);
  H5Pset_link_creation_order(list, H5P_CRT_ORDER_TRACKED | H5P_CRT_ORDER_INDEXED);  // columns in contract order
  h5_ = H5Fcreate(file_.working_path().c_str(), H5F_ACC_TRUNC, list, H5P_DEFAULT);
  check(h5_);
  if (failed_) throw OutsideError("cannot write '" + path + "': " + why_);
}

Hdf5Trace::~Hdf5Trace() { close(); }

void Hdf5Trace::check(std::int64_t result) {
  if (result >= 0 || failed_) return;
  failed_ = true;
  H5Ewalk2(H5E_DEFAULT, H5E_WALK_DOWNWARD, innermost, &why_);
  H5Eclear2(H5E_DEFAULT);
}

void Hdf5Trace::write_about(const RunInfo& info) {
  const Held about(H5Gcreate2(h5_, "about", H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT), H5Gclose);
  check(about);
  check(put_number(about, "format", H5T_STD_I64LE, H5T_NATIVE_INT64, std::int64_t{1}));
  check(put_text(about, "slipbench", origin_.version));
  check(put_text(about, "title", info.title));
  check(put_number(about, "seed", H5T_STD_U64LE, H5T_NATIVE_UINT64, origin_.seed));
  check(put_number(about, "noise_run", H5T_STD_U64LE, H5T_NATIVE_UINT64, std::uint64_t{origin_.noise_run}));
  check(put_number(about, "trace_period_s", H5T_IEEE_F64LE, H5T_NATIVE_DOUBLE, info.trace_period_s));
  // Attributes end at 64 KiB; texts of any length are datasets.
  const auto long_text = [&](const char* name, const std::string& text) {
    const Held type(text_type(text.size()), H5Tclose), space(H5Screate(H5S_SCALAR), H5Sclose);
    const Held list(timeless_dataset(), H5Pclose);
    const Held dataset(H5Dcreate2(about, name, type, space, H5P_DEFAULT, list, H5P_DEFAULT), H5Dclose);
    check(H5Dwrite(dataset, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, text.empty() ? "\0" : text.data()));
  };
  long_text("scenario", origin_.scenario);
  long_text("overrides", origin_.overrides);
}

void Hdf5Trace::begin(const RunInfo& info) {
  write_about(info);
  const std::vector<Column> columns = info.columns();
  columns_ = columns.size();
  block_.assign(columns_ * rows_per_block, 0.0);
  const hsize_t none = 0, unlimited_rows = H5S_UNLIMITED, chunk = rows_per_block;
  const Held space(H5Screate_simple(1, &none, &unlimited_rows), H5Sclose);
  const Held list(timeless_dataset(), H5Pclose);
  check(H5Pset_chunk(list, 1, &chunk));
  for (const Column& column : columns) {
    const hid_t dataset = H5Dcreate2(h5_, column.name.c_str(), H5T_IEEE_F64LE, space, H5P_DEFAULT, list, H5P_DEFAULT);
    check(dataset);
    check(put_text(dataset, "unit", column.unit));
    check(put_text(dataset, "meaning", column.meaning));
    datasets_.push_back(dataset);
  }
}

void Hdf5Trace::trace_row(const RowView& view) {
  double* at = block_.data() + in_block_;
  const auto add = [&](std::span<const double> numbers) {
    for (const double number : numbers) *at = number, at += rows_per_block;
  };
  add(*view.plant);
  add(view.measured);
  add(view.estimates);
  ++rows_;
  if (++in_block_ == rows_per_block) write_block();
}

void Hdf5Trace::write_block() {
  if (in_block_ == 0 || failed_) return;
  const hsize_t all = static_cast<hsize_t>(rows_), count = in_block_, first = all - count;
  const Held memory(H5Screate_simple(1, &count, nullptr), H5Sclose);
  for (std::size_t i = 0; i < datasets_.size() && !failed_; ++i) {
    check(H5Dset_extent(datasets_[i], &all));
    const Held space(H5Dget_space(datasets_[i]), H5Sclose);
    check(H5Sselect_hyperslab(space, H5S_SELECT_SET, &first, nullptr, &count, nullptr));
    check(H5Dwrite(datasets_[i], H5T_NATIVE_DOUBLE, memory, space, H5P_DEFAULT, block_.data() + i * rows_per_block));
  }
  in_block_ = 0;
}

void Hdf5Trace::close() {
  for (const Handle dataset : datasets_) check(dataset < 0 ? 0 : H5Dclose(dataset));
  datasets_.clear();
  if (h5_ >= 0) check(H5Fclose(h5_));
  h5_ = -1;
}

void Hdf5Trace::finish() {
  write_block();
  close();
  if (failed_) throw OutsideError("cannot write '" + file_.path() + "': " + why_);
  file_.finish();
}

}  // namespace slipbench
