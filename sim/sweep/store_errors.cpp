// What a store says when it is refused, or cannot be read or written.
#include <sqlite3.h>
#include <unistd.h>

#include <cerrno>
#include <cstring>
#include <filesystem>
#include <sstream>

#include "sim/scenario/input_error.hpp"
#include "sim/sweep/store.hpp"

namespace slipbench {

namespace {

std::string folder_of(const std::string& path) {
  const std::string folder = std::filesystem::path(path).parent_path().string();
  return folder.empty() ? "." : folder;
}

// The first line in which two texts differ, for the eye.
std::string first_difference(const std::string& was, const std::string& is) {
  std::istringstream a(was), b(is);
  std::string x, y;
  for (int line = 1;; ++line) {
    const bool more_x = static_cast<bool>(std::getline(a, x)), more_y = static_cast<bool>(std::getline(b, y));
    if (!more_x && !more_y) return "";
    if (x == y && more_x == more_y) continue;
    const auto shown = [](bool more, const std::string& text) {
      return more ? "'" + text.substr(0, 80) + "'" : "nothing";
    };
    return "line " + std::to_string(line) + " was " + shown(more_x, x) + ", is " + shown(more_y, y);
  }
}

// What a person calls an item of the origin.
std::string shown(const std::string& item) {
  return item == "machines"    ? "machine file"
         : item == "overrides" ? "--set"
         : item == "seed"      ? "--seed"
         : item == "slipbench" ? "version of slipbench"
         : item == "cases"     ? "number of cases"
         : item == "runs"      ? "number of runs"
                               : item;
}

}  // namespace

void Store::demand_same(const Origin& wanted) const {
  const auto content = [](const Origin& origin, const std::string& item) -> const std::string* {
    for (const auto& [name, text] : origin) {
      if (name == item) return &text;
    }
    return nullptr;
  };
  for (const auto& [item, is] : wanted) {
    const std::string* was = content(origin_, item);
    if (was != nullptr && *was == is) continue;
    throw InputError(path_, item,
                     "the store was made from another " + shown(item) + " (" +
                         first_difference(was == nullptr ? "" : *was, is) +
                         "); go on with what it was made from, or name another --store",
                     "store");
  }
}

bool Store::beside_is_writable() const { return ::access(folder_of(path_).c_str(), W_OK) == 0; }

bool Store::unfinished() const {
  std::error_code none;
  const auto size = std::filesystem::file_size(path_ + "-wal", none);
  return !none && size > 0;
}

void Store::cannot_open(int system) const {
  std::error_code none;
  const std::string folder = folder_of(path_);
  std::string why = system != 0 ? std::strerror(system) : "SQLite cannot open it";
  if (!std::filesystem::is_directory(folder, none))
    why = "there is no folder '" + folder + "'";
  else if (std::filesystem::is_directory(path_, none))
    why = "it is a folder";
  else if (std::filesystem::exists(path_, none) && ::access(path_.c_str(), R_OK) != 0)
    why = "it cannot be read (" + std::string(std::strerror(errno)) + ")";
  else if (::access(folder.c_str(), W_OK) != 0)
    why = "the folder '" + folder + "' cannot be written to (" + std::strerror(errno) + ")";
  else if (std::filesystem::exists(path_, none) && ::access(path_.c_str(), W_OK) != 0)
    why = "it cannot be written to (" + std::string(std::strerror(errno)) + ")";
  throw OutsideError("cannot open the store '" + path_ + "': " + why);
}

// SQLite may have rolled back by itself; a second time is then an error that must not hide the first.
void Store::undo_and_fail() const {
  try {
    fail(sqlite3_extended_errcode(db_));
  } catch (...) {
    sqlite3_exec(db_, "ROLLBACK", nullptr, nullptr, nullptr);
    throw;
  }
}

void Store::fail(int code) const {
  const int last = errno;  // of a failed COMMIT SQLite 3.40 keeps none
  if ((code & 0xff) == SQLITE_NOTADB)
    throw InputError(path_, "", "this is no store of a sweep (no SQLite file); name another --store", "store");
  if ((code & 0xff) == SQLITE_BUSY)
    throw OutsideError("the store '" + path_ + "' is in use by another process; wait for it, or name another --store");
  const int kind = code & 0xff;
  const bool of_system = kind == SQLITE_IOERR || kind == SQLITE_FULL || kind == SQLITE_CANTOPEN;
  const int kept = sqlite3_system_errno(db_), system = !of_system ? 0 : kept != 0 ? kept : last;
  const std::string why = system == EFBIG    ? "it may not grow further (the limit of a file's size, ulimit -f)"
                          : system == EDQUOT ? "the disk quota is used up"
                          : kind == SQLITE_FULL || system == ENOSPC ? "the disk is full"
                                                                    : "";
  if (kind == SQLITE_CANTOPEN || kind == SQLITE_READONLY) cannot_open(system);
  if (!why.empty())
    throw OutsideError("cannot write to the store '" + path_ + "': " + why +
                       "; make room, and the same command goes on where it stopped");
  throw OutsideError("cannot write to the store '" + path_ +
                     "': " + (system != 0 ? std::strerror(system) : sqlite3_errmsg(db_)));
}

}  // namespace slipbench
